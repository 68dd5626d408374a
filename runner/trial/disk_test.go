package trial

import (
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// asRoot skips a test that only root can do, or fails it where everything is to
// be done.
func asRoot(t testing.TB) {
	t.Helper()
	if os.Getuid() == 0 {
		return
	}
	if os.Getenv("RIMLIGHT_REQUIRE") != "" {
		t.Fatal("only root can do this, and RIMLIGHT_REQUIRE asks for everything")
	}
	t.Skip("only root can do this")
}

// mount mounts something on a folder, until the test ends.
func mount(t testing.TB, dir string, args ...string) {
	t.Helper()
	asRoot(t)
	if err := os.MkdirAll(dir, 0o777); err != nil {
		t.Fatal(err)
	}
	if out, err := exec.Command("mount", append(args, dir)...).CombinedOutput(); err != nil {
		if os.Getenv("RIMLIGHT_REQUIRE") != "" {
			t.Fatalf("nothing can be mounted here: %v %s", err, out)
		}
		t.Skipf("nothing can be mounted here: %v %s", err, out)
	}
	t.Cleanup(func() {
		if out, err := exec.Command("umount", dir).CombinedOutput(); err != nil {
			t.Errorf("umount: %v %s", err, out)
		}
	})
}

func remount(t testing.TB, dir, options string) {
	t.Helper()
	if out, err := exec.Command("mount", "-o", "remount,"+options, dir).CombinedOutput(); err != nil {
		t.Fatalf("remount: %v %s", err, out)
	}
}

// TestFullDisk lets a run fill the disk of its store. It says so, keeps what it
// finished, and is taken up when there is room.
func TestFullDisk(t *testing.T) {
	b := newBench(t)
	mount(t, b.store, "-t", "tmpfs", "-o", "size=1200k", "tmpfs")
	said := b.run(1, "--reserve", "0")
	says(t, said, "the result store "+b.store+" is full: make room on its disk, or choose another folder with --store")
	b.verify(0)
	if left := filesBelow(t, filepath.Join(b.store, "tmp")); len(left) > 0 {
		t.Errorf("unfinished files take up room: %v", left)
	}
	before := b.finished()
	if n := before["step Fit"]; n == 0 || n == elements {
		t.Errorf("%d of %d elements were kept", n, elements)
	}
	remount(t, b.store, "size=640m")
	b.holdReuse(before, b.events(0))
	treeOf(b).equal(t, undisturbed(t))
}

// TestReserve has a store that is not to fill its disk, or to grow beyond a
// size.
func TestReserve(t *testing.T) {
	b := newBench(t)
	mount(t, b.store, "-t", "tmpfs", "-o", "size=64m", "tmpfs")
	says(t, b.run(1, "--reserve", "66MB"), "the result store "+b.store+" is full: its disk has 66.0 MB free, of which 66.0 MB are to stay so (--reserve)")
	if n := b.finished()["step Fit"]; n == 0 || n == elements {
		t.Errorf("%d of %d elements were kept", n, elements)
	}
	says(t, b.run(1, "--reserve", "0", "--store-size", "150kB"), "may have 150.0 kB (--store-size)", "trim it, or allow it more")
	b.verify(0)
	b.run(0, "--reserve", "0")
	b.run(0, "--reserve", "0", "--store-size", "1kB") // everything is known
}

// TestFullDiskOfReport lets the report fill its disk: the results are kept.
func TestFullDiskOfReport(t *testing.T) {
	b := newBench(t)
	mount(t, b.out, "-t", "tmpfs", "-o", "size=64k", "tmpfs")
	says(t, b.run(1), filepath.Join("r.out", "report.html")+" cannot be written; all results are kept, and will be used again", "no space left on device")
	if left := filesBelow(t, b.out); len(left) > 0 {
		t.Errorf("left are %v", left)
	}
	remount(t, b.out, "size=64m")
	b.holdReuse(b.finished(), b.events(0))
	treeOf(b).equal(t, undisturbed(t))
}

// TestReadOnlyDisk has the store on a disk that may not be written to. What is
// known is used; what is not, or is damaged, is said.
func TestReadOnlyDisk(t *testing.T) {
	b := newBench(t)
	b.run(0)
	want := treeOf(b)
	spectrum := b.read("spectrum.csv")
	mount(t, b.store, "--bind", b.store)
	remount(t, b.store, "bind,ro")
	says(t, b.run(0), "may be trimmed while it goes on")
	if b.read("spectrum.csv") != spectrum {
		t.Error("from a read-only store, the spectrum is another one")
	}
	b.refused(b.run(1, "--set", "work=6000"))

	remount(t, b.store, "bind,rw")
	object := filesBelow(t, filepath.Join(b.store, "objects"))[7]
	flip(t, object)
	remount(t, b.store, "bind,ro")
	says(t, b.run(1), object+" is damaged", "it could not be set aside")
	says(t, b.verify(1), object, "1 damaged")
	remount(t, b.store, "bind,rw")
	says(t, b.run(0), object+" is damaged", "it was set aside")
	treeOf(b).equal(t, want)
}

// flip flips a bit in the middle of a file.
func flip(t testing.TB, file string) {
	t.Helper()
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	data[len(data)/2] ^= 4
	os.Chmod(file, 0o644)
	if err := os.WriteFile(file, data, 0o644); err != nil {
		t.Fatal(err)
	}
}

// read gives a file beside the report.
func (b *bench) read(name string) string {
	b.t.Helper()
	text, err := os.ReadFile(filepath.Join(b.out, name))
	if err != nil {
		b.t.Fatal(err)
	}
	return string(text)
}

// refused demands that a run said that the store may not be written to.
func (b *bench) refused(said string) {
	b.t.Helper()
	says(b.t, said, "the result store "+b.store+" cannot be written to: choose another folder with --store")
}

// nobody makes what a command does the doing of an ordinary user, who may write
// into the folder of the report only.
func nobody(b *bench) func(c *exec.Cmd) *exec.Cmd {
	b.t.Helper()
	asRoot(b.t)
	const uid = 65534
	from, err := os.Open(b.exe)
	if err != nil {
		b.t.Fatal(err)
	}
	defer from.Close()
	os.Remove(b.exe)
	to, err := os.OpenFile(b.exe, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o755)
	if err != nil {
		b.t.Fatal(err)
	}
	if _, err := io.Copy(to, from); err != nil {
		b.t.Fatal(err)
	}
	if err := to.Close(); err != nil {
		b.t.Fatal(err)
	}
	if err := os.MkdirAll(b.out, 0o755); err != nil {
		b.t.Fatal(err)
	}
	for _, path := range append(filesBelow(b.t, b.out), b.out, b.tmp()) {
		if err := os.Chown(path, uid, uid); err != nil {
			b.t.Fatal(err)
		}
	}
	return func(c *exec.Cmd) *exec.Cmd {
		c.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: uid, Gid: uid}}
		return c
	}
}

// TestOthersStore has an ordinary user run a recipe with a store of somebody
// else's: one to read, one that may not even be looked into, and one of their
// own that was made read-only.
func TestOthersStore(t *testing.T) {
	b := newBench(t)
	b.run(0)
	want := treeOf(b)
	spectrum := b.read("spectrum.csv")
	as := nobody(b)
	says(t, demand(t, as(b.command()), 0), "may be trimmed while it goes on")
	if b.read("spectrum.csv") != spectrum {
		t.Error("from somebody else's store, the spectrum is another one")
	}
	b.refused(demand(t, as(b.command("--set", "work=6000")), 1))
	says(t, demand(t, as(b.program("store", "trim", b.store, "--remove")), 2), "cannot be written to")
	says(t, demand(t, as(b.program("store", "verify", b.store)), 0), "0 damaged")
	treeOf(b).equal(t, want)

	if err := os.Chmod(b.store, 0o700); err != nil {
		t.Fatal(err)
	}
	says(t, demand(t, as(b.command()), 2), "the result store "+b.store+" cannot be opened", "permission denied")

	for _, dir := range []string{b.store, filepath.Join(b.store, "tmp"), filepath.Join(b.store, "objects"), filepath.Join(b.store, "records")} {
		if err := os.Chown(dir, 65534, 65534); err != nil {
			t.Fatal(err)
		}
		if err := os.Chmod(dir, 0o555); err != nil {
			t.Fatal(err)
		}
	}
	demand(t, as(b.command()), 0)
	b.refused(demand(t, as(b.command("--set", "work=6000")), 1))

	b.store = filepath.Join(b.dir, "new.store")
	says(t, demand(t, as(b.command("--store", b.store)), 2), "no result store can be made in "+b.store, "permission denied")
}

// TestOthersReport has the folder of the report be somebody else's: that is
// said before anything is computed.
func TestOthersReport(t *testing.T) {
	b := newBench(t)
	as := nobody(b)
	if err := os.Chown(b.out, 0, 0); err != nil {
		t.Fatal(err)
	}
	b.store = filepath.Join(b.tmp(), "store")
	said := demand(t, as(b.command("--store", b.store)), 2)
	says(t, said, "the report cannot be written into r.out; choose another folder with --out", "permission denied")
	if strings.Contains(said, "computed") {
		t.Errorf("it computed first: %s", said)
	}
	says(t, demand(t, as(b.command("--store", b.store, "--out", "/proc/report")), 2), "no folder for the report can be made; choose another one with --out")
}
