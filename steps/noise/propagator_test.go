package noise

import (
	"math"
	"testing"
)

// An interval is the same as its two halves one after another, to the last digits
// of what it adds, however short it is. Short intervals and the ends of series are
// among those tried.
func TestHalves(t *testing.T) {
	kinds := map[string]timescale{
		"exponential": timescaleOf(Exponential, []float64{1}),
		"matern32":    timescaleOf(Matern32, []float64{math.Sqrt(3)}),
	}
	for name, q := range map[string]float64{"Q=1000": 1000, "Q=3": 3, "Q=0.7": 0.7, "just above 1/2": 0.5 + 1e-9, "just below 1/2": 0.5 - 1e-9, "Q=0.2": 0.2, "Q=0.01": 0.01} {
		kinds[name] = timescaleOf(Oscillator, []float64{2 * math.Pi, q})
	}
	for name, s := range kinds {
		for x := 1e-9; x < 1e3; x *= 1.37 {
			var whole, half propagator
			s.propagate(&whole, x)
			s.propagate(&half, x/2)
			h := half.spread
			left := sandwich(&half.phi, &[4]float64{h[0], h[1], h[1], h[2]}, &half.phi)
			kept := 1e-12
			if s.damping > 1 && s.damping*x >= small/4 {
				kept = 3e-9 // where the closed form takes over, at a spread of 1e-8 or more
			}
			near(t, name+", spread 00", whole.spread[0], left[0]+h[0], 0, kept)
			near(t, name+", spread 01", whole.spread[1], left[1]+h[1], 1e-3*math.Sqrt(whole.spread[0]*whole.spread[2]), 1e-10)
			near(t, name+", spread 11", whole.spread[2], left[3]+h[2], 0, 1e-11)
			both := product(&half.phi, &half.phi)
			for e := range both {
				near(t, name+", transition", whole.phi[e], both[e], 1, 1e-13)
			}
		}
	}
}

// The derivatives of the transition matrix are its differences.
func TestPropagatorDerivatives(t *testing.T) {
	const step = 1e-4
	for _, q := range []float64{1000, 3, 0.7, 0.5001, 0.5, 0.4999, 0.2, 0.02} {
		for x := 1e-4; x < 100; x *= 2.3 {
			at := func(rate, damping float64) (propagator, timescale) {
				s := timescaleOf(Oscillator, []float64{2 * math.Pi * math.Exp(-rate), q * math.Exp(-damping)})
				var p propagator
				s.propagate(&p, x)
				return p, s
			}
			p, s := at(0, 0)
			byRate, byDamping := p.byRate(&s, x), p.byDamping(&s, x)
			// Fourth-order differences.
			for e := range p.phi {
				f := func(r, d float64) float64 { p, _ := at(r, d); return p.phi[e] }
				r := (8*(f(step, 0)-f(-step, 0)) - f(2*step, 0) + f(-2*step, 0)) / (12 * step)
				d := (8*(f(0, step)-f(0, -step)) - f(0, 2*step) + f(0, -2*step)) / (12 * step)
				near(t, "by rate", byRate[e], r, 1, 1e-8)
				near(t, "by damping", byDamping[e], d, 1, 1e-8)
			}
		}
	}
}
