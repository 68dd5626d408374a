package fit

import (
	"math"
	"testing"

	"rimlight/steps/lightcurve"
)

// TestTrialOffsets checks that any prior on the mid-transit time gives a few times
// to try.
func TestTrialOffsets(t *testing.T) {
	s := newScene(t, 9, 200, 1)
	curve := lightcurve.Curves(s.cube)[0]
	for name, prior := range map[string]Prior{
		"wide":          {Kind: Uniform, A: -1e300, B: 1e300},
		"narrow":        {Kind: Normal, A: 0.01, B: 1e-300},
		"far and tight": {Kind: TruncatedNormal, A: 5, B: 1e-3, Lo: 1, Hi: 2},
		"far":           {Kind: Normal, A: 1e300, B: 1},
	} {
		prior.Name = "midTransitOffset"
		model := s.model()
		space := newSpace(model)
		if _, err := space.apply(Priors{prior}, true); err != nil {
			t.Fatal(err)
		}
		m, err := newObjective(curve, model, space, nil)
		if err != nil {
			t.Fatal(err)
		}
		offsets := m.trialOffsets()
		if len(offsets) == 0 || len(offsets) > mostScan+1 {
			t.Errorf("%s: %d offsets", name, len(offsets))
		}
		for _, x := range offsets {
			if math.IsNaN(x) || math.IsInf(x, 0) {
				t.Errorf("%s: an offset of %g", name, x)
				break
			}
		}
	}
}
