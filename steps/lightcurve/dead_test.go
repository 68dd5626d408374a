package lightcurve

import (
	"math"
	"testing"
)

func TestMaskDead(t *testing.T) {
	flat := func(level float64) func(int) float64 { return func(int) float64 { return level } }
	negativesFlagged := noisy(300, 1, 3, flat(0))
	for i, f := range negativesFlagged.Flux[0] {
		if f < 0 {
			negativesFlagged.Mask[0][i] = Negative
		}
	}
	missing := noisy(300, 1, 3, flat(math.NaN()))
	gaps := noisy(300, 0.01, 4, flat(1))
	for i := range gaps.Flux[0] {
		if i%2 == 0 {
			gaps.Mask[0][i] = Missing
			gaps.Flux[0][i] = math.NaN()
		}
	}
	for _, c := range []struct {
		name string
		cube Cube
		dead bool
	}{
		{"starlight", noisy(300, 0.01, 1, flat(1)), false},
		{"faint starlight", noisy(300, 0.2, 1, flat(1)), false},
		{"noise about zero", noisy(300, 1, 2, flat(0)), true},
		{"noise about zero, negative samples flagged", negativesFlagged, true},
		{"noise on a weak pedestal", noisy(300, 1, 2, flat(0.5)), true},
		{"negative", noisy(300, 0.1, 2, flat(-5)), true},
		{"stuck", noisy(300, 0, 2, flat(7)), true},
		{"zero", noisy(300, 0, 2, flat(0)), true},
		{"all missing", missing, true},
		{"every second sample missing", gaps, false},
		{"empty", noisy(0, 0, 1, flat(1)), true},
	} {
		out, err := MaskDead(c.cube)
		if err != nil {
			t.Fatal(err)
		}
		for i, f := range out.Mask[0] {
			if got := f&Excluded != 0; got != c.dead {
				t.Errorf("%s: sample %d excluded: %v, want %v", c.name, i, got, c.dead)
				break
			}
		}
	}
}
