package explore

import (
	"omen/cmd/omen/internal/job"
)

// Prepare makes the folder of a run that needs no chain, and keeps the resolved run
// file there.
func Prepare(j *job.Job, dir string) error {
	if err := vacate(dir, false); err != nil {
		return err
	}
	lock, err := occupy(dir)
	if err != nil {
		return err
	}
	defer lock.Release()
	text, err := j.Run.Resolved(dir)
	if err != nil {
		return err
	}
	if err := keep(dir, text); err != nil {
		return err
	}
	return settle(j, dir, text)
}
