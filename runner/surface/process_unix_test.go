//go:build unix

package surface

import (
	"runtime"
	"syscall"
	"time"
)

// limitData bounds the memory of this process; what goes beyond ends it.
func limitData(n uint64) {
	must(syscall.Setrlimit(syscall.RLIMIT_DATA, &syscall.Rlimit{Cur: n, Max: n}))
}

// processorTime is what this process has used so far.
func processorTime() time.Duration {
	var u syscall.Rusage
	must(syscall.Getrusage(syscall.RUSAGE_SELF, &u))
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}

func stackOfAll(buffer []byte) int { return runtime.Stack(buffer, true) }
