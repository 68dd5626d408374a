package transit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// TestExposureContacts holds averages over exposures in and about the contacts,
// and their derivatives by all parameters, against a rule for singular ends
// between the contacts.
func TestExposureContacts(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 6))
	worst, worstBy := 0.0, 0.0
	for range draws(t, 400) {
		p := randomParams(random)
		k := p.Orbit.Path().Contacts(p.RadiusRatio)
		if !k.Transit {
			continue
		}
		contacts := []float64{k.First, k.Closest, k.Fourth}
		if k.Full {
			contacts = []float64{k.First, k.Second, k.Closest, k.Third, k.Fourth}
		}
		length := (k.Fourth - k.First) * math.Exp(5*random.Float64()-4.5)
		length = min(length, 0.4*p.Orbit.Period)
		middle := contacts[random.IntN(len(contacts))] + length*(random.Float64()-0.5)
		long := p
		long.Exposure = length * secondsPerDay
		at := p.Orbit.MidTransit + middle
		// The exposure that this time, rounded, has.
		middle = at - p.Orbit.MidTransit
		flux, grad, err := CurveGradient([]float64{at}, long)
		if err != nil {
			t.Fatal(err)
		}
		want, wantBy := 1.0, make([]float64, len(grad))
		cuts := []float64{middle - length/2, middle + length/2}
		for _, c := range contacts {
			if c > cuts[0] && c < cuts[1] {
				cuts = append(cuts, c)
			}
		}
		slices.Sort(cuts)
		for i := 1; i < len(cuts); i++ {
			half, centre := (cuts[i]-cuts[i-1])/2, (cuts[i]+cuts[i-1])/2
			for n, x := range ends.nodes {
				f, g, err := CurveGradient([]float64{p.Orbit.MidTransit + (centre + half*x)}, p)
				if err != nil {
					t.Fatal(err)
				}
				weight := half * ends.weights[n] / length
				want -= weight * (1 - f[0])
				for a := range g {
					wantBy[a] += weight * g[a][0]
				}
			}
		}
		worst = max(worst, math.Abs(flux[0]-want))
		if math.Abs(flux[0]-want) > 1e-8 {
			t.Errorf("%+v, %g d from mid-transit: mean flux off by %.1e", long, middle, flux[0]-want)
		}
		for a := range grad {
			// Next to the size of the derivative by time, which others are made of.
			off := math.Abs(grad[a][0]-wantBy[a]) / max(1, math.Abs(wantBy[a]))
			worstBy = max(worstBy, off)
			if off > 1e-5 {
				t.Errorf("%+v, %g d from mid-transit: derivative by %s is %.10g, want %.10g", long, middle, p.Arguments()[a], grad[a][0], wantBy[a])
			}
		}
	}
	t.Logf("largest error %.1e, of derivatives %.1e", worst, worstBy)
}
