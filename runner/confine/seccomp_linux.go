//go:build amd64 || arm64

package confine

import (
	"errors"
	"fmt"
	"os"
	"runtime"
	"unsafe"

	"golang.org/x/sys/unix"
)

// allowed are the system calls that the Go runtime needs, and reading and
// writing of pipes, and with cgo the threads of the C library.
var allowed = []uint32{
	unix.SYS_READ, unix.SYS_PREAD64, unix.SYS_WRITE, unix.SYS_CLOSE, unix.SYS_FSTAT,
	unix.SYS_BRK, unix.SYS_MADVISE, unix.SYS_MREMAP, unix.SYS_MUNMAP,
	unix.SYS_FUTEX, unix.SYS_GETTID, unix.SYS_GETPID, unix.SYS_SCHED_GETAFFINITY, unix.SYS_SCHED_YIELD,
	unix.SYS_SET_ROBUST_LIST, unix.SYS_RSEQ, unix.SYS_RESTART_SYSCALL,
	unix.SYS_RT_SIGACTION, unix.SYS_RT_SIGPROCMASK, unix.SYS_RT_SIGRETURN, unix.SYS_SIGALTSTACK,
	unix.SYS_CLOCK_GETTIME, unix.SYS_CLOCK_NANOSLEEP, unix.SYS_GETTIMEOFDAY, unix.SYS_NANOSLEEP,
	unix.SYS_EPOLL_CREATE1, unix.SYS_EPOLL_CTL, unix.SYS_EPOLL_PWAIT, unix.SYS_EVENTFD2,
	unix.SYS_EXIT, unix.SYS_EXIT_GROUP, unix.SYS_GETRANDOM,
}

// deadly are system calls that nothing makes by mistake: who makes one is
// killed.
var deadly = append([]uint32{
	unix.SYS_EXECVE, unix.SYS_EXECVEAT,
	unix.SYS_PTRACE, unix.SYS_PROCESS_VM_READV, unix.SYS_PROCESS_VM_WRITEV, unix.SYS_PROCESS_MADVISE,
	unix.SYS_PIDFD_OPEN, unix.SYS_PIDFD_GETFD, unix.SYS_PIDFD_SEND_SIGNAL, unix.SYS_KCMP, unix.SYS_PERF_EVENT_OPEN,
	unix.SYS_SOCKET, unix.SYS_SOCKETPAIR, unix.SYS_CONNECT, unix.SYS_BIND, unix.SYS_LISTEN, unix.SYS_ACCEPT, unix.SYS_ACCEPT4,
	unix.SYS_SENDTO, unix.SYS_SENDMSG, unix.SYS_SENDMMSG, unix.SYS_RECVFROM, unix.SYS_RECVMSG, unix.SYS_RECVMMSG,
	unix.SYS_BPF, unix.SYS_IO_URING_SETUP, unix.SYS_IO_URING_ENTER, unix.SYS_IO_URING_REGISTER, unix.SYS_USERFAULTFD,
	unix.SYS_MEMFD_CREATE, unix.SYS_MEMFD_SECRET,
	unix.SYS_UNSHARE, unix.SYS_SETNS, unix.SYS_CHROOT, unix.SYS_PIVOT_ROOT, unix.SYS_MOUNT, unix.SYS_UMOUNT2,
	unix.SYS_MOVE_MOUNT, unix.SYS_MOUNT_SETATTR, unix.SYS_OPEN_TREE, unix.SYS_FSOPEN, unix.SYS_FSCONFIG, unix.SYS_FSMOUNT, unix.SYS_FSPICK,
	unix.SYS_KEYCTL, unix.SYS_ADD_KEY, unix.SYS_REQUEST_KEY, unix.SYS_OPEN_BY_HANDLE_AT, unix.SYS_NAME_TO_HANDLE_AT,
	unix.SYS_INIT_MODULE, unix.SYS_FINIT_MODULE, unix.SYS_DELETE_MODULE, unix.SYS_KEXEC_LOAD, unix.SYS_KEXEC_FILE_LOAD,
	unix.SYS_REBOOT, unix.SYS_SWAPON, unix.SYS_SWAPOFF, unix.SYS_ACCT, unix.SYS_QUOTACTL,
}, deadlyHere...)

// newNamespaces are the flags of clone that ask for namespaces.
const newNamespaces = unix.CLONE_NEWNS | unix.CLONE_NEWCGROUP | unix.CLONE_NEWUTS | unix.CLONE_NEWIPC |
	unix.CLONE_NEWUSER | unix.CLONE_NEWPID | unix.CLONE_NEWNET

// What the filter can decide.
const (
	kill   = unix.SECCOMP_RET_KILL_PROCESS
	allow  = unix.SECCOMP_RET_ALLOW
	refuse = unix.SECCOMP_RET_ERRNO | uint32(unix.EPERM)
	absent = unix.SECCOMP_RET_ERRNO | uint32(unix.ENOSYS)
)

// Offsets into what the filter sees of a system call, struct seccomp_data:
// its number, the architecture, and the low and high half of each argument.
const (
	offNumber = 0
	offArch   = 4
)

func offLow(argument uint32) uint32  { return 16 + 8*argument }
func offHigh(argument uint32) uint32 { return 16 + 8*argument + 4 }

// A program is a filter in the making. The accumulator holds the number of the
// system call at the beginning of every rule.
type program []unix.SockFilter

func (p *program) add(code uint16, jt, jf uint8, k uint32) {
	*p = append(*p, unix.SockFilter{Code: code, Jt: jt, Jf: jf, K: k})
}

func (p *program) load(offset uint32) { p.add(unix.BPF_LD|unix.BPF_W|unix.BPF_ABS, 0, 0, offset) }

func (p *program) decide(what uint32) { p.add(unix.BPF_RET|unix.BPF_K, 0, 0, what) }

// on decides about a system call whatever its arguments.
func (p *program) on(number, what uint32) {
	p.add(unix.BPF_JMP|unix.BPF_JEQ|unix.BPF_K, 0, 1, number)
	p.decide(what)
}

// when decides about a system call if the tests of its arguments all hold.
func (p *program) when(number, what uint32, tests ...program) {
	var body program
	for _, t := range tests {
		body = append(body, t...)
	}
	body.decide(what)
	// A failed test jumps behind the decision, to where the number is loaded
	// again for the next rule.
	for i := range body {
		if in := &body[i]; in.Code&7 == unix.BPF_JMP {
			miss := uint8(len(body) - 1 - i)
			if in.Jt == next {
				in.Jt = miss
			}
			if in.Jf == next {
				in.Jf = miss
			}
		}
	}
	p.add(unix.BPF_JMP|unix.BPF_JEQ|unix.BPF_K, 0, uint8(len(body)+1), number)
	*p = append(*p, body...)
	p.load(offNumber)
}

// next stands for a jump to the next rule.
const next = 255

// equal tests whether an argument has a value of at most 32 bits.
func equal(argument, value uint32) program {
	var p program
	p.load(offHigh(argument))
	p.add(unix.BPF_JMP|unix.BPF_JEQ|unix.BPF_K, 0, next, 0)
	p.load(offLow(argument))
	p.add(unix.BPF_JMP|unix.BPF_JEQ|unix.BPF_K, 0, next, value)
	return p
}

// anyOf tests whether at least one of the bits is set in an argument.
func anyOf(argument, bits uint32) program {
	var p program
	p.load(offLow(argument))
	p.add(unix.BPF_JMP|unix.BPF_JSET|unix.BPF_K, 0, next, bits)
	return p
}

// noneOf tests whether none of the bits is set in an argument.
func noneOf(argument, bits uint32) program {
	var p program
	p.load(offLow(argument))
	p.add(unix.BPF_JMP|unix.BPF_JSET|unix.BPF_K, next, 0, bits)
	return p
}

// filter is the filter for the process with the given number: what is deadly,
// then what is allowed, and a refusal for all else.
func filter(pid int) program {
	var p program
	p.load(offArch)
	p.add(unix.BPF_JMP|unix.BPF_JEQ|unix.BPF_K, 1, 0, auditArch)
	p.decide(kill) // a call in the manner of another architecture
	p.load(offNumber)
	if x32Bit != 0 {
		p.add(unix.BPF_JMP|unix.BPF_JSET|unix.BPF_K, 0, 1, x32Bit)
		p.decide(kill)
	}
	for _, n := range deadly {
		p.on(n, kill)
	}
	p.when(unix.SYS_CLONE, kill, anyOf(0, newNamespaces))
	for _, n := range allowed {
		p.on(n, allow)
	}
	// Threads, but no processes. The C library falls back to clone, whose flags
	// can be seen, when it is told that there is no clone3.
	p.when(unix.SYS_CLONE, allow, anyOf(0, unix.CLONE_THREAD))
	p.on(unix.SYS_CLONE3, absent)
	// Signals to own threads only.
	p.when(unix.SYS_TGKILL, allow, equal(0, uint32(pid)))
	// Memory, but none that holds new machine code.
	p.when(unix.SYS_MMAP, allow, noneOf(2, unix.PROT_EXEC))
	p.when(unix.SYS_MPROTECT, allow, noneOf(2, unix.PROT_EXEC))
	// Flags of descriptors and own limits may be looked at, not set.
	p.when(unix.SYS_FCNTL, allow, equal(1, unix.F_GETFL))
	p.when(unix.SYS_FCNTL, allow, equal(1, unix.F_GETFD))
	p.when(unix.SYS_PRLIMIT64, allow, equal(0, 0), equal(2, 0))
	p.decide(refuse)
	return p
}

// install puts the filter on all threads.
func (p program) install() error {
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	prog := unix.SockFprog{Len: uint16(len(p)), Filter: &p[0]}
	thread, _, e := unix.Syscall(unix.SYS_SECCOMP, unix.SECCOMP_SET_MODE_FILTER, unix.SECCOMP_FILTER_FLAG_TSYNC, uintptr(unsafe.Pointer(&prog)))
	if e != 0 {
		return fmt.Errorf("the kernel refused the filter: %w", e)
	}
	if thread != 0 {
		return fmt.Errorf("thread %d could not be given the filter", thread)
	}
	return nil
}

// filterCalls puts the filter in force and tries whether it holds.
func filterCalls() error {
	if err := filter(os.Getpid()).install(); err != nil {
		return err
	}
	if _, _, e := unix.RawSyscall(unix.SYS_GETPPID, 0, 0, 0); e != unix.EPERM {
		return errors.New("not in force although the kernel accepted it")
	}
	return nil
}
