package fit

import (
	"fmt"
	"math"
	"math/rand/v2"
	"syscall"
	"testing"

	"rimlight/steps/lightcurve"
)

// BenchmarkChannels is the posteriors of all channels of one visit, 4000 effective draws
// each, with the model of the shipped recipe: a parabola, a settling time of each
// channel's own, two columns of pointing, and errors that are those of the photons. It
// states the processor time of a call beside the time that passes, which on a busy
// machine means little.
func BenchmarkChannels(b *testing.B) {
	for _, size := range [][2]int{{120, 6000}, {400, 20_000}, {2048, 20_000}} {
		b.Run(fmt.Sprintf("%dx%d", size[0], size[1]), func(b *testing.B) {
			if size[0] > 120 && testing.Short() {
				b.Skip("takes minutes")
			}
			s := newScene(b, 9, size[1], size[0])
			rng := rand.New(rand.NewPCG(1, 1))
			for j := range s.cube.Err {
				for i := range s.cube.Err[j] {
					s.cube.Err[j][i] *= math.Sqrt(s.cube.Flux[j][i]/s.cube.Flux[j][0]) * (1 + 1e-3*rng.NormFloat64())
				}
			}
			model := s.model()
			model.Trend.Polynomial = 2
			model.Exposure = 8
			model.Channel = samplingPriors()
			white := Posterior{Names: []string{"midTransit", "axisRatio", "inclination", "radiusRatio"},
				Value: []float64{s.orbit.MidTransit, 9.4, 87.3, 0.111}, Err: []float64{1e-5, 0.02, 0.03, 1e-4}}
			curves := lightcurve.Curves(s.cube)
			var before, after syscall.Rusage
			_ = syscall.Getrusage(syscall.RUSAGE_SELF, &before)
			calls := 0
			for b.Loop() {
				calls++
				_, posteriors, err := Channels(curves, white, model, Sampling{})
				if err != nil {
					b.Fatal(err)
				}
				walked := 0
				for _, p := range posteriors {
					if p.Effective < 4000 {
						b.Errorf("channel %d: %g effective draws", p.Channel.Index, p.Effective)
					}
					if !math.IsNaN(p.RHat) {
						walked++
					}
				}
				b.ReportMetric(float64(walked), "walked")
			}
			_ = syscall.Getrusage(syscall.RUSAGE_SELF, &after)
			cpu := float64(after.Utime.Nano()+after.Stime.Nano()-before.Utime.Nano()-before.Stime.Nano()) / 1e9 / float64(calls)
			b.ReportMetric(cpu, "cpu-s/op")
			b.ReportMetric(1000*cpu/float64(size[0]), "cpu-ms/channel")
		})
	}
}
