//go:build !linux

package confine

import (
	"errors"
	"runtime"
)

// kernel reports that the kernel's layers are Linux's.
func kernel(Limits) Report {
	err := errors.New("not available on " + runtime.GOOS)
	var r Report
	for _, name := range []string{"closed descriptors", "resource limits", "no tracing", "no new privileges", "no capabilities", "Landlock", "seccomp"} {
		r = append(r, layer(name, "", err))
	}
	return r
}
