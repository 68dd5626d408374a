package fit

import (
	"flag"
	"math"
	"testing"
	"time"

	"rimlight/steps/spectrum"
)

var study = flag.Bool("study", false, "run the long study of how honest the errors of a spectrum are")

// TestStudy prints, for full-size simulated data, mean and rms of (depth -
// truth)/error under several treatments of orbit and limb darkening. It judges
// nothing.
func TestStudy(t *testing.T) {
	if !*study {
		t.Skip("only with -study")
	}
	truePriors := Priors{uniform("midTransitOffset", -0.03, 0.03), uniform("radiusRatio", 0.02, 0.3),
		uniform("u1", -1, 2), uniform("u2", -1, 2), uniform("settlingTime", 0.001, 0.1)}
	settlingFree := Prior{Name: "settlingTime", Kind: LogUniform, A: 0.001, B: 0.1}
	treatments := []struct {
		name    string
		orbit   bool // held at the truth
		channel Priors
		policy  string
	}{
		{"orbit fitted, u free", false, channelPriors("u1", "u2", -1, 2), PolicyFree},
		{"orbit fitted, u and settling free", false, append(channelPriors("u1", "u2", -1, 2), settlingFree), PolicyFree},
		{"orbit fitted, q free", false, channelPriors("q1", "q2", 0, 1), PolicyFree},
		{"orbit fitted, u fixed at truth", false, channelPriors("u1", "u2", -1, 2), PolicyFixed},
		{"orbit true, u free", true, channelPriors("u1", "u2", -1, 2), PolicyFree},
		{"orbit true, q free", true, channelPriors("q1", "q2", 0, 1), PolicyFree},
		{"orbit true, u and settling free", true, append(channelPriors("u1", "u2", -1, 2), settlingFree), PolicyFree},
		{"orbit true, u prior 0.02", true, channelPriors("u1", "u2", -1, 2), PolicyPrior},
	}
	for _, size := range []struct{ n, m int }{{3000, 80}, {6000, 120}} {
		for _, treat := range treatments {
			var points []spectrum.Point
			for seed := uint64(1); seed <= 5; seed++ {
				s := simulate(t, 1000*seed+uint64(size.m), size.n, size.m)
				setup := s.setup()
				setup.LimbPolicy, setup.Limb = treat.policy, s.truthTable(0)
				white := whitePriors()
				if treat.orbit {
					setup.AxisRatio, setup.Inclination = s.orbit.AxisRatio, s.orbit.Inclination/degree
					white = truePriors
				}
				start := time.Now()
				var posterior Posterior
				posterior, points = s.reduce(t, setup, white, treat.channel)
				shared := SharedCovariance(points, posterior)
				mean, rms := s.pulls(points, nil)
				mean2, rms2 := s.pulls(points, shared)
				var ratio, depthErr float64
				for i, p := range points {
					ratio += math.Sqrt(shared[i][i]) / p.DepthErr / float64(len(points))
					depthErr += p.DepthErr / float64(len(points))
				}
				t.Logf("%d×%d %-33s seed %d: own errors: mean %+.2f rms %.2f; with shared: mean %+.2f rms %.2f; shared/own %.2f, own %.1f ppm; %.1f s, %s %v",
					size.n, size.m, treat.name, seed, mean, rms, mean2, rms2, ratio, depthErr*1e6, time.Since(start).Seconds(), posterior.Status, posterior.Warnings)
			}
		}
	}
}
