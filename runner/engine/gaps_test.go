package engine

import (
	"errors"
	"testing"

	"rimlight/runner/plan"
	"rimlight/runner/worker"
)

func TestNumbers(t *testing.T) {
	for want, list := range map[string][]int{
		"": {}, "1": {0}, "1, 2": {0, 1}, "1 to 3": {0, 1, 2}, "2, 5 to 9, 12": {1, 4, 5, 6, 7, 8, 11},
		"1, 3, 5, 7, 9, 11, 13, 15, 17, 19, 21, 23 and 2 more": {0, 2, 4, 6, 8, 10, 12, 14, 16, 18, 20, 22, 24, 26},
	} {
		if got := numbers(list); got != want {
			t.Errorf("%v is %q, expected %q", list, got, want)
		}
	}
}

// TestPatience holds that a fan-out is given up soon when nothing comes of it,
// and late when few of many elements cost their worker its life.
func TestPatience(t *testing.T) {
	for _, c := range []struct {
		total, good, deaths int
		out                 bool
	}{
		{2048, 0, 3, false}, {2048, 0, 4, true}, {2048, 1, 127, false}, {2048, 1, 128, true}, {12, 6, 3, false}, {12, 6, 4, true}, {3, 0, 3, false},
	} {
		p := patience{c.total, c.good, c.deaths}
		if p.out() != c.out {
			t.Errorf("%+v: %v", p, p.out())
		}
	}
}

// TestCarry holds that mending a step does not try again what failed, unless
// what it is computed from has changed.
func TestCarry(t *testing.T) {
	el := func(state State, text plan.KeyText) Computation { return Computation{State: state, Text: text} }
	before := []Computation{el(Computed, "a"), el(Failed, "b"), el(Failed, "c"), el(Computed, "d")}
	comps := []Computation{el(Reused, "a"), el(NotReached, "b"), el(NotReached, "c2"), el(NotReached, "d")}
	todo := carry(before, comps, []int{1, 2, 3})
	if len(todo) != 2 || todo[0] != 2 || todo[1] != 3 || comps[1].State != Failed || comps[2].State != NotReached {
		t.Errorf("left to do is %v, the elements are %+v", todo, comps)
	}
}

// TestOwn holds that only what an element did itself leaves a gap.
func TestOwn(t *testing.T) {
	for _, c := range []struct {
		err error
		own bool
	}{
		{&worker.Failure{Text: "no"}, true}, {&worker.TimeLimitError{}, true}, {&worker.LostError{Cause: worker.OutOfMemory}, true},
		{errors.New("no space left on device"), false},
	} {
		if own(c.err) != c.own {
			t.Errorf("%v: %v", c.err, own(c.err))
		}
	}
}
