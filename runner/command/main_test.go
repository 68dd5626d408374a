package command

import (
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"rimlight/runner/worker"
)

// TestMain lets this test binary serve as the program and as the worker that
// tests start.
func TestMain(m *testing.M) {
	if worker.Requested() || filepath.Base(os.Args[0]) == "rimlight" {
		Main()
	}
	os.Exit(m.Run())
}

// rimlight is the program as a process of its own.
func rimlight(t testing.TB, args ...string) *exec.Cmd {
	t.Helper()
	exe, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(exe)
	c.Args = append([]string{"rimlight"}, args...)
	return c
}
