package engine

import (
	"testing"

	"rimlight/runner/plan"
	"rimlight/runner/program"
	"rimlight/runner/worker"
)

// TestWorkMemory holds that work which is done elsewhere says how much memory
// it needs, also when nobody has set it.
func TestWorkMemory(t *testing.T) {
	e := &Engine{outcome: &Outcome{Inputs: []Input{{Computation: Computation{Results: []Value{{Size: 300 << 20}}}}}}}
	spec := &plan.Step{Step: program.Step{Name: "Fit"}, Each: 1, Args: []plan.Arg{{Source: plan.FromInput}, {Source: plan.FromElement}}}
	w, err := e.work(spec, []Value{{Size: 1 << 20}, {Size: 50 << 20}}, 0)
	if err != nil {
		t.Fatal(err)
	}
	if want := (worker.Options{}).For(350 << 20).Memory; w.Limits.Memory != want || want < worker.DefaultMemory {
		t.Errorf("%d bytes of memory, expected %d", w.Limits.Memory, want)
	}
}
