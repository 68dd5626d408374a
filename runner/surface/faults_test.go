package surface

import (
	"errors"
	"os"
	"reflect"
	"strings"
	"testing"
	"time"

	"rimlight/steps/vector"
)

// sink keeps what a faulty function allocates from being optimised away, and
// gives it a memory from call to call.
var sink [][]byte

// faults are functions that do each thing that a call must not do.
var faults = []target{
	newTarget("fault.panic", reflect.ValueOf(func(x []float64) float64 { return x[len(x)] })),
	newTarget("fault.time", reflect.ValueOf(func() {
		for start := time.Now(); time.Since(start) < time.Hour; {
		}
	})),
	newTarget("fault.memory", reflect.ValueOf(func() {
		for range 300 {
			sink = [][]byte{make([]byte, 1<<20)}
		}
	})),
	newTarget("fault.died", reflect.ValueOf(func() {
		sink = [][]byte{make([]byte, 2*workerLimit)}
	})),
	newTarget("fault.stack", reflect.ValueOf(deep)),
	newTarget("fault.argument", reflect.ValueOf(func(v vector.V) {
		for i := range v.X {
			v.X[i] += 1 + v.X[i]
		}
		_ = append(v.X[:0], 0.5, 0.25)
	})),
	newTarget("fault.result", reflect.ValueOf(func() string { return "\xff" })),
	newTarget("fault.again", reflect.ValueOf(func() int { sink = append(sink, nil); return len(sink) })),
	newTarget("fault.error", reflect.ValueOf(func() error { return errors.New(strings.Repeat("x", errorLimit+1)) })),
}

// deep recurses without end.
func deep(n int) int {
	if n < 0 { // never
		return 0
	}
	return deep(n+1) + n
}

// TestFaults checks that each of them is found, and that what comes behind it is
// still called.
func TestFaults(t *testing.T) {
	var jobs []job
	for _, f := range faults {
		for seed := range uint64(3) { // a vector may be empty
			jobs = append(jobs, job{f.Name, 16 * (seed + 1)})
			if f.Name == "fault.time" || f.Name == "fault.died" || f.Name == "fault.stack" {
				break
			}
		}
	}
	found := map[string]string{}
	counts := map[string]*count{}
	run(t, jobs, counts, func(f finding) { found[f.Job.Target] += f.Kind + ": " + f.Text + "\n" })
	for _, f := range faults {
		kind := strings.TrimPrefix(f.Name, "fault.")
		if kind == "stack" {
			kind = "died"
		}
		if !strings.Contains(found[f.Name], kind+": ") {
			t.Errorf("%s: found %q", f.Name, found[f.Name])
		}
	}
}

// TestTargets checks that the list holds functions and methods of every package
// of the library.
func TestTargets(t *testing.T) {
	all := targets()
	packages := map[string]bool{}
	for i, target := range all {
		name, _, _ := strings.Cut(target.Name, ".")
		packages[name] = true
		if i > 0 && all[i-1].Name >= target.Name {
			t.Errorf("%s comes after %s", target.Name, all[i-1].Name)
		}
	}
	steps, err := os.ReadDir("../../steps")
	if err != nil {
		t.Fatal(err)
	}
	// compress, fits, sheet and nearest are for the library itself.
	hidden := map[string]bool{"compress": true, "fits": true, "sheet": true, "nearest": true}
	for _, s := range steps {
		if s.IsDir() && !hidden[s.Name()] && !packages[s.Name()] {
			t.Errorf("nothing of package %s is called", s.Name())
		}
	}
}
