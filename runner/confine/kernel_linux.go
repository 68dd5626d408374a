package confine

import (
	"errors"
	"fmt"
	"os"
	"os/signal"
	"strconv"
	"unsafe"

	"github.com/landlock-lsm/go-landlock/landlock"
	ll "github.com/landlock-lsm/go-landlock/landlock/syscall"
	"golang.org/x/sys/unix"
	"kernel.org/pub/linux/libs/security/libcap/psx"
)

// kernel puts on the kernel's layers. The order matters: each needs calls that
// a later one forbids.
func kernel(l Limits) Report {
	return Report{
		layer("closed descriptors", "none inherited but those handed over", closeInherited(l.Keep)),
		layer("resource limits", "memory, processor time, open files; no writing to files, no core dumps", setLimits(l)),
		layer("no tracing", "other processes of the same user cannot look inside", unix.Prctl(unix.PR_SET_DUMPABLE, 0, 0, 0, 0)),
		layer("no new privileges", "for all threads", noNewPrivileges()),
		layer("no capabilities", "not those of the superuser either", dropCapabilities()),
		restrictAccess(),
		layer("seccomp", "system calls for computing and for pipes only", filterCalls()),
	}
}

// closeInherited closes the descriptors from 3+keep on that came from the
// parent. Those that the Go runtime opened for itself are told apart by their
// close-on-exec flag, which no inherited descriptor can have.
func closeInherited(keep int) error {
	open, err := os.ReadDir("/proc/self/fd")
	if err != nil {
		return err
	}
	for _, e := range open {
		fd, err := strconv.Atoi(e.Name())
		if err != nil || fd < 3+keep {
			continue
		}
		flags, err := unix.FcntlInt(uintptr(fd), unix.F_GETFD, 0)
		if err != nil || flags&unix.FD_CLOEXEC != 0 {
			continue // the listing's own descriptor, closed by now, or the runtime's
		}
		if err := unix.Close(fd); err != nil {
			return fmt.Errorf("descriptor %d: %w", fd, err)
		}
	}
	return nil
}

// setLimits sets resource limits, hard ones. Processor time has a soft limit
// below the hard one, to leave time for a last message.
func setLimits(l Limits) error {
	over := make(chan os.Signal, 1)
	signal.Notify(over, unix.SIGXCPU)
	go func() {
		<-over
		os.Stderr.WriteString(CPUMessage + "\n")
		os.Exit(2)
	}()
	cpu := uint64((l.CPU + 999999999) / 1000000000)
	for _, r := range []struct {
		name      string
		which     int
		soft, max uint64
	}{
		{"core size", unix.RLIMIT_CORE, 0, 0},
		{"file size", unix.RLIMIT_FSIZE, 0, 0},
		{"open files", unix.RLIMIT_NOFILE, uint64(16 + l.Keep), uint64(16 + l.Keep)},
		{"memory", unix.RLIMIT_DATA, uint64(l.Memory), uint64(l.Memory)},
		{"processor time", unix.RLIMIT_CPU, cpu, cpu + 2},
	} {
		var old unix.Rlimit
		err := unix.Getrlimit(r.which, &old)
		if err == nil { // a limit that is stricter already stays
			err = unix.Setrlimit(r.which, &unix.Rlimit{Cur: min(r.soft, old.Max), Max: min(r.max, old.Max)})
		}
		if err != nil {
			return fmt.Errorf("%s: %w", r.name, err)
		}
	}
	return nil
}

func noNewPrivileges() error {
	if err := ll.AllThreadsPrctl(unix.PR_SET_NO_NEW_PRIVS, 1, 0, 0, 0); err != nil {
		return err
	}
	if set, err := unix.PrctlRetInt(unix.PR_GET_NO_NEW_PRIVS, 0, 0, 0, 0); err != nil || set != 1 {
		return fmt.Errorf("not in force (%d, %v)", set, err)
	}
	return nil
}

// dropCapabilities gives up all capabilities in all threads. A process without
// any has nothing to give up, and that works too.
func dropCapabilities() error {
	head := unix.CapUserHeader{Version: unix.LINUX_CAPABILITY_VERSION_3}
	var none [2]unix.CapUserData
	if _, _, e := psx.Syscall3(unix.SYS_CAPSET, uintptr(unsafe.Pointer(&head)), uintptr(unsafe.Pointer(&none)), 0); e != 0 {
		return e
	}
	return nil
}

// restrictAccess forbids files, network and signals with Landlock, as far as
// the kernel knows how, and tries whether it holds.
func restrictAccess() Layer {
	const name = "Landlock"
	version, err := ll.LandlockGetABIVersion()
	if err != nil || version < 1 {
		return Layer{name, false, "the kernel has none, or it is not switched on"}
	}
	if err := landlock.V11.BestEffort().Restrict(); err != nil {
		return Layer{name, false, err.Error()}
	}
	fd, err := unix.Open("/", unix.O_RDONLY|unix.O_DIRECTORY|unix.O_CLOEXEC, 0)
	if err == nil {
		unix.Close(fd)
	}
	if !errors.Is(err, unix.EACCES) {
		return Layer{name, false, "not in force although the kernel accepted it"}
	}
	detail := "no files"
	if version >= 4 {
		detail += ", no TCP"
	}
	if version >= 6 {
		detail += ", no signals to other processes"
	}
	return Layer{name, true, fmt.Sprintf("%s (interface %d)", detail, version)}
}
