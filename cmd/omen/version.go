package main

import "runtime/debug"

// release is the version of this source; the chain and summary formats have
// versions of their own.
const release = "0.1.0"

// version is the release and, in a build from a checkout, its revision.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return release
	}
	for _, s := range info.Settings {
		if s.Key == "vcs.revision" && len(s.Value) >= 12 {
			return release + " (" + s.Value[:12] + ")"
		}
	}
	return release
}
