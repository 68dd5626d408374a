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
	if worker.Requested() {
		os.Exit(worker.Main())
	}
	if filepath.Base(os.Args[0]) == "rimlight" {
		os.Exit(Run(os.Args[1:], os.Stdout, os.Stderr))
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
