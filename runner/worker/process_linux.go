package worker

import (
	"os"
	"syscall"

	"golang.org/x/sys/unix"
)

// forbiddenSignal ends a process that makes a forbidden system call.
const forbiddenSignal = syscall.SIGSYS

// peakMemory is the most memory, in bytes, that a process that has ended was
// resident with.
func peakMemory(state *os.ProcessState) int64 {
	if u, ok := state.SysUsage().(*syscall.Rusage); ok {
		return u.Maxrss << 10
	}
	return 0
}

// machineMemory is the memory of the machine in bytes.
func machineMemory() int64 {
	var info syscall.Sysinfo_t
	if err := syscall.Sysinfo(&info); err != nil {
		return 0
	}
	return int64(info.Totalram) * int64(info.Unit)
}

// pipeSize is the room in a pipe, in bytes. More than the usual 64 KiB spares
// the processes turns when mass data cross.
const pipeSize = 1 << 20

// widen gives a pipe more room, if it is to be had.
func widen(pipe any) {
	c, ok := pipe.(syscall.Conn)
	if !ok {
		return
	}
	if raw, err := c.SyscallConn(); err == nil {
		raw.Control(func(fd uintptr) { unix.FcntlInt(fd, unix.F_SETPIPE_SZ, pipeSize) })
	}
}

// executable is the running program, even when its file was replaced since.
func executable() (string, error) { return "/proc/self/exe", nil }

// attributes puts a worker into a process group of its own, so that a signal
// typed at the terminal reaches only the parent, and has the kernel kill it
// when the parent dies.
func attributes() *syscall.SysProcAttr {
	return &syscall.SysProcAttr{Setpgid: true, Pdeathsig: syscall.SIGKILL}
}

func killGroup(p *os.Process) error { return syscall.Kill(-p.Pid, syscall.SIGKILL) }
