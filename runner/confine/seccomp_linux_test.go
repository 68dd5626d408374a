//go:build amd64 || arm64

package confine

import (
	"encoding/binary"
	"testing"

	"golang.org/x/sys/unix"
)

// decide runs the filter, as the kernel would, on one system call.
func decide(t *testing.T, f program, audit, number uint32, args ...uint64) uint32 {
	t.Helper()
	var data [64]byte
	binary.LittleEndian.PutUint32(data[offNumber:], number)
	binary.LittleEndian.PutUint32(data[offArch:], audit)
	for i, a := range args {
		binary.LittleEndian.PutUint64(data[16+8*i:], a)
	}
	acc := uint32(0)
	for pc := 0; pc < len(f); pc++ {
		in := f[pc]
		jump := func(yes bool) {
			if yes {
				pc += int(in.Jt)
			} else {
				pc += int(in.Jf)
			}
		}
		switch in.Code {
		case unix.BPF_LD | unix.BPF_W | unix.BPF_ABS:
			acc = binary.LittleEndian.Uint32(data[in.K:])
		case unix.BPF_JMP | unix.BPF_JEQ | unix.BPF_K:
			jump(acc == in.K)
		case unix.BPF_JMP | unix.BPF_JSET | unix.BPF_K:
			jump(acc&in.K != 0)
		case unix.BPF_RET | unix.BPF_K:
			return in.K
		default:
			t.Fatalf("unknown instruction %+v", in)
		}
	}
	t.Fatal("the filter ends without a decision")
	return 0
}

func TestFilter(t *testing.T) {
	const pid = 4321
	f := filter(pid)
	for _, c := range []struct {
		name   string
		number uint32
		args   []uint64
		want   uint32
	}{
		{"read", unix.SYS_READ, nil, allow},
		{"openat", unix.SYS_OPENAT, nil, refuse},
		{"execve", unix.SYS_EXECVE, nil, kill},
		{"thread", unix.SYS_CLONE, []uint64{0x3d0f00}, allow},
		{"process", unix.SYS_CLONE, []uint64{uint64(unix.SIGCHLD)}, refuse},
		// As numbers of system calls, these flags would be allowed ones.
		{"process with flags like a number", unix.SYS_CLONE, []uint64{unix.SYS_WRITE}, refuse},
		{"thread in a new network", unix.SYS_CLONE, []uint64{0x50f00 | unix.CLONE_NEWNET}, kill},
		{"clone3", unix.SYS_CLONE3, nil, absent},
		{"own thread", unix.SYS_TGKILL, []uint64{pid, 1}, allow},
		{"other's thread", unix.SYS_TGKILL, []uint64{pid + 1, 1}, refuse},
		{"other's thread, high bits", unix.SYS_TGKILL, []uint64{1<<32 | pid, 1}, refuse},
		{"signal number like an own thread", unix.SYS_KILL, []uint64{pid, pid}, refuse},
		{"memory", unix.SYS_MMAP, []uint64{0, 4096, unix.PROT_READ | unix.PROT_WRITE}, allow},
		{"code", unix.SYS_MMAP, []uint64{0, 4096, unix.PROT_READ | unix.PROT_EXEC}, refuse},
		{"memory to code", unix.SYS_MPROTECT, []uint64{0, 4096, unix.PROT_EXEC}, refuse},
		{"flags", unix.SYS_FCNTL, []uint64{0, unix.F_GETFL}, allow},
		{"close-on-exec", unix.SYS_FCNTL, []uint64{0, unix.F_GETFD}, allow},
		{"double", unix.SYS_FCNTL, []uint64{0, unix.F_DUPFD}, refuse},
		{"see own limit", unix.SYS_PRLIMIT64, []uint64{0, unix.RLIMIT_STACK, 0, 1}, allow},
		{"set own limit", unix.SYS_PRLIMIT64, []uint64{0, unix.RLIMIT_STACK, 1 << 40, 0}, refuse},
		{"see other's limit", unix.SYS_PRLIMIT64, []uint64{7, unix.RLIMIT_STACK, 0, 1}, refuse},
		{"unknown", 9999, nil, refuse},
	} {
		if got := decide(t, f, auditArch, c.number, c.args...); got != c.want {
			t.Errorf("%s: %#x, expected %#x", c.name, got, c.want)
		}
	}
	if got := decide(t, f, auditArch^1, unix.SYS_READ); got != kill {
		t.Errorf("another architecture: %#x, expected %#x", got, kill)
	}
	if x32Bit != 0 {
		if got := decide(t, f, auditArch, x32Bit|unix.SYS_READ); got != kill {
			t.Errorf("the x32 interface: %#x, expected %#x", got, kill)
		}
	}
}

// TestFilterListsAreDisjoint holds that no system call is both deadly and
// allowed, or on a list twice.
func TestFilterListsAreDisjoint(t *testing.T) {
	seen := map[uint32]bool{}
	for _, n := range append(append([]uint32{}, deadly...), allowed...) {
		if seen[n] {
			t.Errorf("system call %d is listed twice", n)
		}
		seen[n] = true
	}
}
