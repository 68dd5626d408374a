package lightcurve

import (
	"math"
	"slices"
	"testing"
)

func TestExclude(t *testing.T) {
	cube := noisy(10, 0.1, 1, func(int) float64 { return 1 }) // times 0, 1e-4, … d
	out, err := Exclude(cube, 2e-4, 4.5e-4)
	if err != nil {
		t.Fatal(err)
	}
	if got := flagged(out.Mask[0]); !slices.Equal(got, []int{2, 3, 4}) {
		t.Errorf("excluded %v", got)
	}
	if len(flagged(cube.Mask[0])) != 0 {
		t.Error("the input was modified")
	}
	for _, r := range [][2]float64{{1, 2}, {4e-4, 2e-4}, {math.NaN(), 1}} {
		if _, err := Exclude(cube, r[0], r[1]); err == nil {
			t.Errorf("range %v was accepted", r)
		}
	}
}

func TestSkipStart(t *testing.T) {
	cube := noisy(10, 0.1, 1, func(int) float64 { return 1 })
	out, err := SkipStart(cube, 2.5e-4*minutesPerDay)
	if err != nil {
		t.Fatal(err)
	}
	if got := flagged(out.Mask[0]); !slices.Equal(got, []int{0, 1, 2}) {
		t.Errorf("skipped %v", got)
	}
	if out, err = SkipStart(cube, 0); err != nil || len(flagged(out.Mask[0])) != 0 {
		t.Error("skipping nothing changed the mask")
	}
	for _, minutes := range []float64{-1, math.NaN(), math.Inf(1), 60} {
		if _, err := SkipStart(cube, minutes); err == nil {
			t.Errorf("%g minutes were accepted", minutes)
		}
	}
}
