package store

import (
	"os"
	"os/exec"
	"path/filepath"
	"testing"
)

// makeReadOnly takes away the right to write in a folder: by its mode, or, for
// root, whom modes do not stop, by mounting it so.
func makeReadOnly(t *testing.T, dir string) {
	t.Helper()
	if os.Getuid() == 0 {
		mount(t, "--bind", dir, dir)
		if out, err := exec.Command("mount", "-o", "remount,bind,ro", dir).CombinedOutput(); err != nil {
			t.Skipf("no folder can be made read-only here: %v %s", err, out)
		}
		return
	}
	var dirs []string
	err := filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err == nil && d.IsDir() {
			dirs = append(dirs, path)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range dirs {
		if err := os.Chmod(d, 0o555); err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() { _ = os.Chmod(d, 0o755) }) // else the folder cannot be removed
	}
}

// mount mounts a folder until the test ends, and skips the test where that is
// not allowed.
func mount(t *testing.T, args ...string) {
	t.Helper()
	if out, err := exec.Command("mount", args...).CombinedOutput(); err != nil {
		t.Skipf("nothing can be mounted here: %v %s", err, out)
	}
	t.Cleanup(func() {
		if out, err := exec.Command("umount", args[len(args)-1]).CombinedOutput(); err != nil {
			t.Errorf("umount: %v %s", err, out)
		}
	})
}
