package command

import (
	"os"
	"testing"

	"rimlight/runner/worker"
)

// TestMain lets this test binary serve as the worker that it starts.
func TestMain(m *testing.M) {
	if worker.Requested() {
		os.Exit(worker.Main())
	}
	os.Exit(m.Run())
}
