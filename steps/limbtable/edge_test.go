package limbtable

import (
	"math"
	"testing"

	"rimlight/steps/limb"
)

// TestEdge stretches a law over 0.99 of the disc, with a faint rim outside, as
// spherical models have it.
func TestEdge(t *testing.T) {
	law := limb.Law{Name: limb.Quadratic, Coefficients: []float64{0.3, 0.25}}
	const edge = 0.99
	var p Profile
	for i := 1; i <= 400; i++ {
		mu := float64(i) / 400
		value := 1e-3 * mu
		if r := radius(mu) / edge; r <= 1 {
			value = law.Intensity(radius(r))
		}
		if i == 400 {
			value = 1
		}
		p.Mu, p.Intensity = append(p.Mu, mu), append(p.Intensity, value)
	}
	found, err := SteepestEdge(p)
	if err != nil || math.Abs(found-edge) > 5e-4 {
		t.Errorf("edge at %g, error %v", found, err)
	}
	f, err := FitLaw(p, Choice{Edge: edge})
	if err != nil || math.Abs(f.Law.Coefficients[0]-0.3) > 1e-10 || math.Abs(f.Law.Coefficients[1]-0.25) > 1e-10 {
		t.Errorf("%+v, error %v", f.Law, err)
	}
	if f, err = FitLaw(p, Choice{}); err != nil || f.RMS < 0.01 {
		t.Errorf("to the top of the atmosphere: %+v, RMS %g, error %v", f.Law, f.RMS, err)
	}
	for _, edge := range []float64{-1, 1.1, math.NaN()} {
		if _, err := FitLaw(p, Choice{Edge: edge}); err == nil {
			t.Errorf("no error for an edge at %g", edge)
		}
	}
	if f, err := FitLaw(p, Choice{Edge: 1e-3}); err == nil {
		t.Errorf("no error for an edge inside of all places: %+v", f)
	}
	if _, err := SteepestEdge(Profile{}); err == nil {
		t.Error("no error for an empty profile")
	}
}
