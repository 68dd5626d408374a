package limbtable

import (
	"math"
	"testing"

	"rimlight/steps/lightcurve"
)

func TestAt(t *testing.T) {
	table := Table{
		Channels: []lightcurve.Channel{{Index: 0, Lo: 1, Hi: 2}, {Index: 1, Lo: 2, Hi: 3}, {Index: 2, Lo: 4, Hi: 5}},
		U1:       []float64{0.1, 0.3, 0.5},
		U2:       []float64{0.2, 0.2, 0.4},
		U1Err:    []float64{0.01, 0.03, 0.05},
	}
	for _, c := range []struct {
		lo, hi, u1, u2, e1 float64
		ok                 bool
	}{
		{1, 2, 0.1, 0.2, 0.01, true},
		{1.25, 1.5, 0.1, 0.2, 0.01, true},
		{1.5, 2.5, 0.2, 0.2, 0.02, true},
		{1.75, 2.75, 0.25, 0.2, 0.025, true},
		{1, 5, 0.3, 0.8 / 3, 0.03, true}, // over a gap
		{2.5, 3.5, 0.3, 0.2, 0.03, true}, // half of it covered
		{2.6, 3.6, 0, 0, 0, false},
		{3, 4, 0, 0, 0, false},
		{5, 6, 0, 0, 0, false},
		{2, 2, 0, 0, 0, false},
		{math.NaN(), 2, 0, 0, 0, false},
	} {
		u1, u2, e1, e2, ok := table.At(c.lo, c.hi)
		near := func(a, b float64) bool { return math.Abs(a-b) < 1e-15 }
		if !near(u1, c.u1) || !near(u2, c.u2) || !near(e1, c.e1) || e2 != 0 || ok != c.ok {
			t.Errorf("At(%g, %g) = %g, %g, %g, %g, %v; expected %+v", c.lo, c.hi, u1, u2, e1, e2, ok, c)
		}
	}
	// Channels on top of each other must not count twice as coverage.
	double := Table{Channels: []lightcurve.Channel{{Lo: 1, Hi: 1.3}, {Lo: 1, Hi: 1.3}}, U1: []float64{1, 3}, U2: []float64{0, 0}}
	if _, _, _, _, ok := double.At(1, 2); ok {
		t.Error("30 % of an interval, twice, counts as covering it")
	}
	if u1, _, _, _, ok := double.At(1, 1.5); !ok || u1 != 2 {
		t.Errorf("mean of two channels on top of each other: %g, %v", u1, ok)
	}
	if _, _, _, _, ok := (Table{Channels: double.Channels, U1: []float64{1}, U2: []float64{1, 2}}).At(1, 2); ok {
		t.Error("columns of different length were averaged")
	}
}
