//go:build amd64 || arm64

package confine

import (
	"bytes"
	"context"
	"crypto/rand"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"golang.org/x/sys/unix"
)

// probe is the name under which this test binary confines itself and tries
// what its argument says.
const probe = "confine-probe"

func TestMain(m *testing.M) {
	if os.Args[0] == probe {
		os.Exit(try(os.Args[1], os.Args[2]))
	}
	os.Exit(m.Run())
}

var limits = Limits{Memory: 512 << 20, Stack: 64 << 20, CPU: 20 * time.Second, Threads: 40, Keep: 1}

// raw makes a system call and gives its error.
func raw(call uintptr, args ...uintptr) error {
	var a [6]uintptr
	copy(a[:], args)
	if _, _, e := unix.Syscall6(call, a[0], a[1], a[2], a[3], a[4], a[5]); e != 0 {
		return e
	}
	return nil
}

func open(path string, flags int) error {
	fd, err := unix.Open(path, flags, 0o600)
	if err == nil {
		unix.Close(fd)
	}
	return err
}

// attempts are what must not succeed; each gets the parent's process number and
// the name of a file in a folder that all may write to. Those marked deadly end
// the process.
var attempts = []struct {
	name   string
	deadly bool
	do     func(parent int, path string) error
}{
	{"read a file", false, func(int, string) error { return open("/etc/passwd", unix.O_RDONLY) }},
	{"list a folder", false, func(int, string) error { return open("/", unix.O_RDONLY|unix.O_DIRECTORY) }},
	{"list own threads", false, func(int, string) error { return open("/proc/self/task", unix.O_RDONLY|unix.O_DIRECTORY) }},
	{"make a file", false, func(_ int, path string) error { return open(path, unix.O_WRONLY|unix.O_CREAT) }},
	{"make a folder", false, func(_ int, path string) error { return unix.Mkdir(path, 0o700) }},
	{"remove a file", false, func(_ int, path string) error { return unix.Unlink(filepath.Join(filepath.Dir(path), "victim")) }},
	{"change a file's name", false, func(_ int, path string) error {
		return unix.Rename(filepath.Join(filepath.Dir(path), "victim"), path)
	}},
	{"look for a file", false, func(int, string) error { return unix.Stat("/etc/passwd", new(unix.Stat_t)) }},
	{"change the working directory", false, func(int, string) error { return unix.Chdir("/") }},
	{"write own memory through /proc", false, func(int, string) error { return open("/proc/self/mem", unix.O_RDWR) }},
	{"read the parent's environment", false, func(parent int, _ string) error {
		return open(fmt.Sprintf("/proc/%d/environ", parent), unix.O_RDONLY)
	}},
	{"read an inherited descriptor", false, func(int, string) error {
		_, err := unix.Read(4, make([]byte, 8))
		return err
	}},
	{"write to the file handed over", false, func(int, string) error {
		_, err := unix.Write(3, []byte("x"))
		return err
	}},
	{"signal the parent", false, func(parent int, _ string) error { return unix.Kill(parent, unix.SIGCONT) }},
	{"signal a thread of the parent", false, func(parent int, _ string) error { return unix.Tgkill(parent, parent, unix.SIGCONT) }},
	{"signal everybody", false, func(int, string) error { return unix.Kill(-1, unix.SIGCONT) }},
	{"have the parent signalled", false, func(parent int, _ string) error {
		_, err := unix.FcntlInt(0, unix.F_SETOWN, parent)
		return err
	}},
	{"double a descriptor", false, func(int, string) error {
		_, err := unix.FcntlInt(0, unix.F_DUPFD, 5)
		return err
	}},
	{"raise a limit", false, func(int, string) error {
		return unix.Setrlimit(unix.RLIMIT_DATA, &unix.Rlimit{Cur: 1 << 40, Max: 1 << 40})
	}},
	{"raise a limit of the parent", false, func(parent int, _ string) error {
		return unix.Prlimit(parent, unix.RLIMIT_NOFILE, nil, new(unix.Rlimit))
	}},
	{"become the superuser", false, func(int, string) error { return raw(unix.SYS_SETUID, 0) }},
	{"let itself be traced", false, func(int, string) error { return unix.Prctl(unix.PR_SET_DUMPABLE, 1, 0, 0, 0) }},
	{"make memory executable", false, func(int, string) error {
		_, err := unix.Mmap(-1, 0, 4096, unix.PROT_READ|unix.PROT_EXEC, unix.MAP_ANON|unix.MAP_PRIVATE)
		return err
	}},
	{"make mapped memory executable", false, func(int, string) error {
		b, err := unix.Mmap(-1, 0, 4096, unix.PROT_READ|unix.PROT_WRITE, unix.MAP_ANON|unix.MAP_PRIVATE)
		if err != nil {
			return nil
		}
		return unix.Mprotect(b, unix.PROT_READ|unix.PROT_EXEC)
	}},
	{"fork", false, func(int, string) error { return raw(unix.SYS_CLONE, uintptr(unix.SIGCHLD)) }},
	{"fork in a way that hides the flags", false, func(int, string) error { return raw(unix.SYS_CLONE3, 0, 0) }},
	{"execute a program", true, func(int, string) error { return syscall.Exec("/bin/true", []string{"true"}, nil) }},
	{"start a program", false, func(int, string) error { return exec.Command("/bin/true").Run() }},
	{"trace the parent", true, func(parent int, _ string) error { return unix.PtraceAttach(parent) }},
	{"read the parent's memory", true, func(parent int, _ string) error {
		b := make([]byte, 8)
		_, err := unix.ProcessVMReadv(parent, []unix.Iovec{{Base: &b[0], Len: 8}}, []unix.RemoteIovec{{Base: 4096, Len: 8}}, 0)
		return err
	}},
	{"open a socket", true, func(int, string) error { return raw(unix.SYS_SOCKET, unix.AF_INET, unix.SOCK_STREAM, 0) }},
	{"open a local socket", true, func(int, string) error { return raw(unix.SYS_SOCKET, unix.AF_UNIX, unix.SOCK_DGRAM, 0) }},
	{"connect", true, func(int, string) error { return raw(unix.SYS_CONNECT, 0, 0, 0) }},
	{"make a user namespace", true, func(int, string) error { return unix.Unshare(unix.CLONE_NEWUSER) }},
	{"make a namespace with clone", true, func(int, string) error {
		return raw(unix.SYS_CLONE, uintptr(unix.CLONE_NEWUSER|unix.SIGCHLD))
	}},
	{"mount", true, func(int, string) error { return unix.Mount("none", "/", "tmpfs", 0, "") }},
	{"load a kernel program", true, func(int, string) error { return raw(unix.SYS_BPF, 0, 0, 0) }},
	{"open a ring", true, func(int, string) error { return raw(unix.SYS_IO_URING_SETUP, 1, 0) }},
	{"handle own page faults", true, func(int, string) error { return raw(unix.SYS_USERFAULTFD, 0) }},
	{"read kernel keys", true, func(int, string) error { return raw(unix.SYS_KEYCTL, 0, 0, 0) }},
}

// try confines this process and makes an attempt. What came of it goes to the
// standard output.
func try(what, path string) int {
	parent := os.Getppid()
	switch what {
	case "Landlock alone":
		if l := restrictAccess(); !l.Active {
			fmt.Print(l.Detail)
			return 0
		}
		for _, err := range []error{open("/etc/passwd", unix.O_RDONLY), open(path, unix.O_WRONLY|unix.O_CREAT), open("/proc/self/mem", unix.O_RDWR)} {
			if !errors.Is(err, unix.EACCES) {
				fmt.Print("a file could be opened: ", err)
				return 0
			}
		}
		fmt.Print("holds")
		return 0
	case "seccomp alone":
		noNewPrivileges()
		if err := filterCalls(); err != nil {
			fmt.Print(err)
			return 0
		}
		for _, err := range []error{open("/etc/passwd", unix.O_RDONLY), open(path, unix.O_WRONLY|unix.O_CREAT), unix.Kill(parent, unix.SIGCONT)} {
			if !errors.Is(err, unix.EPERM) {
				fmt.Print("not forbidden: ", err)
				return 0
			}
		}
		fmt.Print("holds")
		return 0
	}
	if call, ok := lacking[what]; ok {
		if err := withhold(call); err != nil {
			fmt.Print(err)
			return 0
		}
		report, err := Enter(limits)
		for _, l := range report.Missing() {
			fmt.Print(l.Name, " ")
		}
		fmt.Print(err)
		return 0
	}
	l := limits
	if what == "processor time" {
		l.CPU = time.Second
	}
	report, err := Enter(l)
	if err != nil || len(report.Missing()) > 0 {
		fmt.Printf("not confined: %v %v", report.Missing(), err)
		return 0
	}
	switch what {
	case "work":
		fmt.Print(work())
		return 0
	case "memory":
		for n := 1 << 20; ; n *= 2 {
			hold = append(hold, bytes.Repeat([]byte{1}, n))
		}
	case "stack":
		fmt.Print(deep(1))
		return 0
	case "processor time":
		for {
			hold = nil
		}
	case "threads":
		for range 100 {
			go func() { runtime.LockOSThread(); unix.Nanosleep(&unix.Timespec{Sec: 10}, nil) }()
		}
		time.Sleep(10 * time.Second)
		return 0
	}
	for _, a := range attempts {
		if a.name == what {
			if err := a.do(parent, path); err != nil {
				fmt.Print("refused: ", err)
			} else {
				fmt.Print("succeeded")
			}
			return 0
		}
	}
	fmt.Print("unknown attempt")
	return 0
}

// lacking are the system calls that a kernel without a layer does not have.
var lacking = map[string]uint32{
	"Landlock": unix.SYS_LANDLOCK_CREATE_RULESET,
	"seccomp":  unix.SYS_SECCOMP,
}

// withhold makes the kernel pretend, for all threads of this process, that it
// has no such system call.
func withhold(call uint32) error {
	noNewPrivileges()
	var p program
	p.load(offNumber)
	p.on(call, absent)
	p.decide(allow)
	return p.install()
}

// TestLackingKernel holds that a layer that the kernel does not have is
// reported, and is the only one that is missing.
func TestLackingKernel(t *testing.T) {
	needAll(t)
	for what := range lacking {
		if said, errs := run(t, -1, what); said != what+" <nil>" {
			t.Errorf("missing: %s, expected %s; %s", said, what, errs)
		}
	}
}

var hold [][]byte

func deep(n int) int {
	if n < 0 {
		return 0
	}
	var room [1024]byte
	room[n%1024] = 1
	return deep(n+1) + int(room[n%7])
}

// work does what a worker does: compute in several threads, collect garbage,
// wait, read the file handed over. It returns "works" or what failed.
func work() string {
	var wg sync.WaitGroup
	for range 16 {
		wg.Go(func() {
			runtime.LockOSThread()
			defer runtime.UnlockOSThread()
			for range 4 {
				b := make([]byte, 4<<20)
				rand.Read(b[:32])
				time.Sleep(time.Millisecond)
			}
		})
	}
	wg.Wait()
	runtime.GC()
	f := os.NewFile(3, "handed over")
	b := make([]byte, 5)
	if _, err := io.ReadFull(io.NewSectionReader(f, 0, 5), b); err != nil || string(b) != "hello" {
		return fmt.Sprintf("reading the file handed over: %q, %v", b, err)
	}
	if err := f.Close(); err != nil {
		return err.Error()
	}
	ctx, cancel := context.WithTimeout(context.Background(), 5*time.Millisecond)
	defer cancel()
	<-ctx.Done()
	return "works"
}

// run starts a probe, as another user when uid is not negative, and returns
// what it said, with how it ended when that was not of its own accord.
func run(t *testing.T, uid int, what string) (said, errs string) {
	t.Helper()
	dir := t.TempDir()
	os.Chmod(dir, 0o777)
	for d := dir; d != os.TempDir() && d != "/"; d = filepath.Dir(d) {
		os.Chmod(d, 0o777)
	}
	for name, data := range map[string]string{"handed": "hello", "other": "secret", "victim": "victim"} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(data), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	handed, err := os.Open(filepath.Join(dir, "handed"))
	if err != nil {
		t.Fatal(err)
	}
	defer handed.Close()
	other, err := os.Open(filepath.Join(dir, "other"))
	if err != nil {
		t.Fatal(err)
	}
	defer other.Close()
	ctx, cancel := context.WithTimeout(context.Background(), 30*time.Second)
	defer cancel()
	c := exec.CommandContext(ctx, "/proc/self/exe")
	c.Args = []string{probe, what, filepath.Join(dir, "new")}
	c.Env = []string{}
	c.ExtraFiles = []*os.File{handed, other}
	c.SysProcAttr = &syscall.SysProcAttr{Setpgid: true}
	if uid >= 0 {
		c.SysProcAttr.Credential = &syscall.Credential{Uid: uint32(uid), Gid: uint32(uid)}
	}
	var out, stderr bytes.Buffer
	c.Stdin = strings.NewReader("")
	c.Stdout, c.Stderr = &out, &stderr
	err = c.Run()
	if _, e := os.Stat(filepath.Join(dir, "new")); e == nil {
		t.Errorf("%s: something was made", what)
	}
	if _, e := os.Stat(filepath.Join(dir, "victim")); e != nil {
		t.Errorf("%s: a file is gone", what)
	}
	said = out.String()
	if err != nil {
		said += "[" + err.Error() + "]"
	}
	return said, stderr.String()
}

// users are the users to try as: this one, and an ordinary one when this one is
// the superuser.
func users() map[string]int {
	u := map[string]int{"uid " + strconv.Itoa(os.Getuid()): -1}
	if os.Getuid() == 0 {
		u["uid 65534"] = 65534
	}
	return u
}

// needAll skips a test where the kernel lacks a layer, unless everything is
// required.
func needAll(t *testing.T) {
	t.Helper()
	if said, _ := run(t, -1, "work"); strings.HasPrefix(said, "not confined") && os.Getenv("RIMLIGHT_REQUIRE") == "" {
		t.Skip(said)
	}
}

func TestConfinedProcessWorks(t *testing.T) {
	needAll(t)
	for name, uid := range users() {
		if said, errs := run(t, uid, "work"); said != "works" {
			t.Errorf("%s: %s %s", name, said, errs)
		}
	}
}

func TestNothingGetsOut(t *testing.T) {
	needAll(t)
	for name, uid := range users() {
		for _, a := range attempts {
			t.Run(name+"/"+a.name, func(t *testing.T) {
				t.Parallel()
				said, errs := run(t, uid, a.name)
				want := "refused: "
				if a.deadly {
					want = "[signal: bad system call"
				}
				if !strings.HasPrefix(said, want) {
					t.Errorf("got %q, expected %q; %.1000s", said, want, errs)
				}
			})
		}
	}
}

// TestLayersAlone holds that Landlock and seccomp each hold without the other.
func TestLayersAlone(t *testing.T) {
	needAll(t)
	for name, uid := range users() {
		for _, what := range []string{"Landlock alone", "seccomp alone"} {
			if said, errs := run(t, uid, what); said != "holds" {
				t.Errorf("%s, %s: %s %s", name, what, said, errs)
			}
		}
	}
}

func TestLimitsEnd(t *testing.T) {
	needAll(t)
	for name, uid := range users() {
		for what, want := range map[string]string{
			"memory":         "out of memory",
			"stack":          "stack exceeds",
			"processor time": CPUMessage,
			"threads":        "thread limit",
		} {
			t.Run(name+"/"+what, func(t *testing.T) {
				t.Parallel()
				said, errs := run(t, uid, what)
				// With cgo, memory may run out where a thread wants its stack.
				ended := strings.Contains(errs, want) || what == "memory" && strings.Contains(errs, "pthread_create failed")
				if !ended || said == "" {
					t.Errorf("it said %q and %.1000q, expected %q", said, errs, want)
				}
			})
		}
	}
}

func TestEnterRefusesSenselessLimits(t *testing.T) {
	for _, l := range []Limits{{}, {Memory: 1 << 20, Stack: 64 << 20, CPU: time.Second, Threads: 40}, {Memory: 1 << 30, Stack: 64 << 20, Threads: 40}} {
		if r, err := Enter(l); err == nil {
			t.Errorf("%+v was accepted: %v", l, r)
		}
	}
}
