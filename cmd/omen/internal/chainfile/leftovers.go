package chainfile

import (
	"os"
	"path/filepath"
	"slices"
)

// Leftovers lists what a run that was killed before [Create] was done left in
// dir: files of this package that hold no step yet, and the names in also. ok
// is false if dir holds anything else, a chain above all. A folder that does
// not exist holds nothing.
func Leftovers(dir string, also ...string) (names []string, ok bool, err error) {
	entries, err := os.ReadDir(dir)
	if os.IsNotExist(err) {
		return nil, true, nil
	}
	if err != nil {
		return nil, false, err
	}
	for _, e := range entries {
		size := int64(0)
		if info, err := e.Info(); err == nil {
			size = info.Size()
		}
		if !leftover(e.Name(), size, also) {
			return nil, false, nil
		}
		if e.Name() != LockName {
			names = append(names, filepath.Join(dir, e.Name()))
		}
	}
	return names, true, nil
}

// headerSize is more than a header and less than a step.
const headerSize = 1 << 12

func leftover(name string, size int64, also []string) bool {
	switch name {
	case ChainName:
		return size < headerSize
	case SumsName:
		return size <= recordLen
	case StateName + temporary, LockName:
		return true
	}
	return slices.ContainsFunc(also, func(n string) bool { return name == n || name == n+temporary })
}
