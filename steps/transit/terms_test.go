package transit

import (
	"math"
	"testing"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
)

// TestCurveTerms builds light curves from their terms.
func TestCurveTerms(t *testing.T) {
	times := make([]float64, 301)
	for i := range times {
		times[i] = 0.3 * (float64(i)/300 - 0.5)
	}
	for _, law := range []limb.Law{
		{Name: limb.Uniform},
		{Name: limb.Quadratic, Coefficients: []float64{0.4, 0.2}},
		{Name: limb.SquareRoot, Coefficients: []float64{0.2, 0.5}},
		{Name: limb.Logarithmic, Coefficients: []float64{0.6, 0.3}},
		{Name: limb.Power2, Coefficients: []float64{0.6, 0.7}},
	} {
		for _, exposure := range []float64{0, 900} {
			p := Params{
				Orbit:       orbit.Orbit{Period: 3, AxisRatio: 9, Inclination: 1.53, Eccentricity: 0.3, Periastron: 1},
				RadiusRatio: 0.12, Law: law, Exposure: exposure,
			}
			want, err := Curve(times, p)
			if err != nil {
				t.Fatal(err)
			}
			terms, err := CurveTerms(times, p)
			if err != nil {
				t.Fatal(err)
			}
			prof, err := p.profile()
			if err != nil {
				t.Fatal(err)
			}
			for i := range times {
				var d [5]float64
				for k, term := range terms {
					d[k] = term[i]
				}
				if got := 1 - prof.weigh(&d); math.Abs(got-want[i]) > 1e-14 {
					t.Fatalf("%s, exposure %g, time %d: %.15g, want %.15g", law.Name, exposure, i, got, want[i])
				}
			}
		}
	}
	if _, err := CurveTerms(times, Params{Orbit: orbit.Orbit{Period: 3, AxisRatio: 9, Inclination: 1.53}, RadiusRatio: 0.1, Law: limb.Law{Name: limb.Uniform}, Companion: 1}); err == nil {
		t.Error("terms beside a companion were not refused")
	}
}
