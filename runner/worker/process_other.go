//go:build !linux

package worker

import (
	"os"
	"syscall"
)

// forbiddenSignal would end a process that makes a forbidden system call.
const forbiddenSignal = syscall.Signal(-1)

func peakMemory(*os.ProcessState) int64 { return 0 }

func widen(any) {}

func machineMemory() int64 { return 0 }

func executable() (string, error) { return os.Executable() }

func attributes() *syscall.SysProcAttr { return nil }

func killGroup(p *os.Process) error { return p.Kill() }
