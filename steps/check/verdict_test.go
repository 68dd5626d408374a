package check

import (
	"math"
	"testing"
)

func TestVerdicts(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, tc := range []struct {
		check  Check
		passed bool
		limit  string
	}{
		{Between("x", 1, 0.8, 1.3, "", ""), true, "between 0.8 and 1.3"},
		{Between("x", 0.8, 0.8, 1.3, "", ""), true, "between 0.8 and 1.3"},
		{Between("x", 1.30001, 0.8, 1.3, "", ""), false, "between 0.8 and 1.3"},
		{Between("x", nan, 0.8, 1.3, "", ""), false, "between 0.8 and 1.3"},
		{AtMost("x", 5, 5, "min", ""), true, "at most 5"},
		{AtMost("x", inf, 5, "", ""), false, "at most 5"},
		{AtMost("x", nan, 5, "", ""), false, "at most 5"},
		{AtLeast("x", 0.1, 0.25, "", ""), false, "at least 0.25"},
		{AtLeast("x", 0.3, 0.25, "", ""), true, "at least 0.25"},
		{AtLeast("x", nan, 0.25, "", ""), false, "at least 0.25"},
	} {
		if tc.check.Passed != tc.passed || tc.check.Limit != tc.limit {
			t.Errorf("%+v: want passed %v, limit %q", tc.check, tc.passed, tc.limit)
		}
	}
	none := NotComputed("beta", "no bins", "it matters")
	if none.Passed || !math.IsNaN(none.Value) || none.Limit != "could not be computed: no bins" {
		t.Errorf("%+v", none)
	}
}

func TestFailed(t *testing.T) {
	all := []Check{{Name: "a"}, {Name: "b", Passed: true}, {Name: "c"}}
	got := Failed(all)
	if len(got) != 2 || got[0].Name != "a" || got[1].Name != "c" {
		t.Errorf("failed: %v", got)
	}
	if Failed(all[1:2]) != nil {
		t.Error("a passed check was returned as failed")
	}
}
