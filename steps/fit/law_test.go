package fit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
	"rimlight/steps/limbtable"
	"rimlight/steps/transit"
)

// TestLaws fits curves made with each law of two coefficients, in both of their
// parameterisations and with coefficients from a table.
func TestLaws(t *testing.T) {
	s := newScene(t, 1, 60, 1)
	for i, truth := range []limb.Law{
		{Name: LawQuadratic, Coefficients: []float64{0.4, 0.2}}, {Name: LawSquareRoot, Coefficients: []float64{0.1, 0.5}},
		{Name: LawLogarithmic, Coefficients: []float64{0.6, 0.2}}, {Name: LawPower2, Coefficients: []float64{0.6, 0.8}},
	} {
		times := make([]float64, 300)
		for k := range times {
			times[k] = s.orbit.MidTransit + 0.0007*float64(k-150)
		}
		flux, err := transit.Curve(times, transit.Params{Orbit: s.orbit, RadiusRatio: 0.11, Law: truth})
		if err != nil {
			t.Fatal(err)
		}
		rng := rand.New(rand.NewPCG(3, uint64(i)))
		curve := lightcurve.Curve{Time: times, Flux: flux, Err: make([]float64, len(times)), Mask: make([]lightcurve.Flag, len(times)), Channel: lightcurve.Channel{Lo: 1, Hi: 2}}
		for k := range flux {
			flux[k] += 1e-4 * rng.NormFloat64()
			curve.Err[k] = 1e-4
		}
		model := s.model()
		model.LimbLaw, model.MidTransit = truth.Name, s.orbit.MidTransit
		model.Trend.Settling, model.Trend.Regressors = false, nil
		for _, limbs := range []Priors{{uniform("u1", -1, 2), uniform("u2", 0.1, 3)}, {uniform("q1", 0, 1), uniform("q2", 0, 1)}, {}} {
			priors := append(Priors{uniform("radiusRatio", 0.02, 0.3), uniform("axisRatio", 3, 30), uniform("impact", 0, 1)}, limbs...)
			model.LimbPolicy, model.Limb = PolicyFree, limbtable.Table{}
			if len(limbs) == 0 {
				model.LimbPolicy = PolicyFixed
				model.Limb = limbtable.Table{Law: truth.Name, Channels: []lightcurve.Channel{{Lo: 0.5, Hi: 3}}, U1: truth.Coefficients[:1], U2: truth.Coefficients[1:]}
			}
			if len(limbs) > 0 && limbs[0].Name == "u1" && truth.Name != LawPower2 {
				priors[len(priors)-1] = uniform("u2", -2, 3)
			}
			posterior, _, err := White(curve, withWhite(model, priors))
			if err != nil {
				t.Fatalf("%s, %v: %v", truth.Name, limbs, err)
			}
			if off := posterior.Chi2 - float64(len(times)); math.Abs(off) > 5*math.Sqrt(2*float64(len(times))) {
				t.Errorf("%s, %v: chi-square %g of %d samples", truth.Name, limbs, posterior.Chi2, len(times))
			}
			k := slices.Index(posterior.Names, "radiusRatio")
			radius := posterior.Value[k]
			if sd := posterior.Err[k]; math.Abs(radius-0.11) > 5*sd || !(sd < 0.01) {
				t.Errorf("%s, %v: radius ratio %g ± %g", truth.Name, limbs, radius, sd)
			}
			if len(limbs) == 0 {
				continue
			}
			// The same curve as a channel, on the white fit's orbit.
			point, _, err := Channel(curve, posterior, withChannel(model, append(Priors{uniform("radiusRatio", 0.02, 0.3)}, priors[3:]...)))
			if err != nil || math.Abs(point.Depth-radius*radius) > 0.02*point.DepthErr {
				t.Errorf("%s, %v: depth %g ± %g, error %v, expected %g", truth.Name, limbs, point.Depth, point.DepthErr, err, radius*radius)
			}
		}
	}
}
