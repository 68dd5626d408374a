package transit_test

import (
	"math"
	"testing"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
	"rimlight/steps/simulate"
	"rimlight/steps/transit"
)

// TestAgreesWithSimulation holds the closed form against the simulator, which
// integrates over the stellar disc with an orbit of its own: a whole visit with
// hardly any noise and no systematics.
func TestAgreesWithSimulation(t *testing.T) {
	for name, change := range map[string]func(s *simulate.Scenario){
		"circular":      func(*simulate.Scenario) {},
		"eccentric":     func(s *simulate.Scenario) { s.Eccentricity, s.Periastron = 0.35, 130 },
		"grazing":       func(s *simulate.Scenario) { s.Inclination = 84.1 },
		"long exposure": func(s *simulate.Scenario) { s.Integrations, s.Cadence, s.Exposure = 60, 410, 400 },
		"years later":   func(s *simulate.Scenario) { s.MidTransit -= 400 * s.Period },
	} {
		s := simulate.Continuous(5)
		s.Integrations, s.Cadence, s.Channels = 600, 41, 6
		s.Electrons, s.ReadNoise, s.ExcessNoise = 1e15, 0, 0
		s.Settling, s.Drift, s.Leak, s.OutlierShare, s.MissingShare, s.ZeroShare, s.DeadChannels = 0, 0, 0, 0, 0, 0, 0
		change(&s)
		cube, truth, err := simulate.Make(s)
		if err != nil {
			t.Fatal(err)
		}
		deg := math.Pi / 180
		for k := range cube.Channels {
			flux, err := transit.Curve(cube.Time, transit.Params{
				Orbit: orbit.Orbit{
					Period: s.Period, MidTransit: s.MidTransit, AxisRatio: s.AxisRatio, Inclination: s.Inclination * deg,
					Eccentricity: s.Eccentricity, Periastron: s.Periastron * deg,
				},
				RadiusRatio: math.Sqrt(truth.Depth[k]), Law: limb.Law{Name: limb.Quadratic, Coefficients: []float64{truth.U1[k], truth.U2[k]}}, Exposure: s.Exposure,
			})
			if err != nil {
				t.Fatal(err)
			}
			level, n, deepest := 0.0, 0.0, 1.0
			for i, f := range flux {
				if f == 1 {
					level += cube.Flux[k][i]
					n++
				}
				deepest = min(deepest, f)
			}
			level /= n
			if n < 10 || deepest > 0.9995 {
				t.Fatalf("%s: %g integrations out of transit, smallest flux %g", name, n, deepest)
			}
			for i, f := range flux {
				got := cube.Flux[k][i] / level
				// Five and more standard deviations of the photon noise, and the
				// simulator's average over exposures.
				if limit := 6*cube.Err[k][i]/level + 3e-7; math.Abs(got-f) > limit {
					t.Fatalf("%s, channel %d, integration %d: simulated %.10g, computed %.10g", name, k, i, got, f)
				}
			}
		}
	}
}
