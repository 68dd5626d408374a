package fit

import (
	"math"
	"testing"

	"rimlight/steps/systematics"
)

// TestDensityGradient compares the derivatives of the posterior density with
// differences, in every direction, for models that have every kind of parameter.
func TestDensityGradient(t *testing.T) {
	s := newScene(t, 41, 300, 1)
	base := s.model()
	base.Exposure = 60
	added := base
	added.Trend = systematics.Trend{Polynomial: 2, Regressors: []string{"X"}, Added: []string{"Y"}}
	four := base
	four.LimbLaw = LawFourParameter
	normal := func(name string, a, b float64) Prior { return Prior{Name: name, Kind: Normal, A: a, B: b} }
	for name, model := range map[string]Model{
		"plain": withWhite(base, append(whitePriors(), uniform("jitter", 0, 1e-3))),
		"impact": withWhite(base, Priors{normal("midTransit", 2460100.4, 0.01), uniform("impact", 0, 1), uniform("stellarDensity", 300, 3000),
			{Name: "radiusRatio", Kind: LogUniform, A: 0.01, B: 0.3}, uniform("q1", 0, 1), uniform("q2", 0, 1),
			{Name: "settlingTime", Kind: LogUniform, A: 0.001, B: 0.1}, {Name: "errorScale", Kind: LogUniform, A: 0.5, B: 2}}),
		"added": withWhite(added, Priors{{Name: "duration", Kind: Uniform, A: 1, B: 5, Unit: "h"}, normal("ecosw", 0, 0.02), normal("esinw", 0, 0.02), uniform("radiusRatio", 0.02, 0.3),
			normal("u1", 0.4, 0.1), normal("u2", 0.2, 0.1), normal("companion", 0.05, 0.01), normal("trend.time", 0, 1e-3),
			uniform("errorScale", 0.5, 2), uniform("jitter", 0, 1e-3)}),
		"four": withWhite(four, Priors{normal("u1", 0.5, 0.1), normal("u2", 0.1, 0.1), normal("u3", 0.1, 0.1), normal("u4", -0.1, 0.1),
			uniform("radiusRatio", 0.02, 0.3), uniform("secosw", -0.5, 0.5), uniform("sesinw", -0.5, 0.5), uniform("inclination", 80, 90)}),
	} {
		m, _ := posed(t, s, model)
		target := newTarget(m)
		y := make([]float64, len(target.at))
		for k, d := range target.at {
			lo, hi := d.lo, d.hi
			if d.prior.normal() {
				lo, hi = max(lo, d.prior.A-d.prior.B), min(hi, d.prior.A+d.prior.B)
				if d.slot == slotMid {
					lo, hi = -0.003, 0.004
				}
			}
			y[k] = lo + 0.43*(hi-lo)
			switch d.name {
			case "axisRatio":
				y[k] = 9.3
			case "stellarDensity":
				y[k] = 1600
			case "midTransitOffset":
				y[k] = 1e-3
			case "duration":
				y[k] = 2.5
			}
		}
		gradient, scratch := make([]float64, len(y)), make([]float64, len(y))
		if f := target.density(y, gradient); f-f != 0 {
			t.Fatalf("%s: density %g", name, f)
		}
		for k, d := range target.at {
			at := append([]float64(nil), y...)
			h := 1e-6 * max(math.Abs(y[k]), 0.05)
			if d.slot == slotMid {
				h = 3e-6 // times have a resolution of 5e-10 d
			}
			at[k] = y[k] + h
			up := target.density(at, scratch)
			at[k] = y[k] - h
			down := target.density(at, scratch)
			if want := (up - down) / (2 * h); math.Abs(gradient[k]-want) > 2e-4*math.Abs(want)+1e-3 {
				t.Errorf("%s: derivative by %s is %.8g, differences give %.8g", name, d.name, gradient[k], want)
			}
		}
	}
}

// TestMarginalLikelihood compares the likelihood with the coefficients integrated
// over with the same integral done numerically, for two coefficients.
func TestMarginalLikelihood(t *testing.T) {
	s := newScene(t, 42, 60, 1)
	model := s.model()
	model.Trend = systematics.Trend{Polynomial: 1}
	model.White = Priors{uniform("radiusRatio", 0.02, 0.3), {Name: "u1", Kind: Fixed, A: 0.4}, {Name: "trend.time", Kind: Normal, A: 1e-4, B: 2e-4}}
	m, _ := posed(t, s, model)
	target := newTarget(m)
	y := []float64{0.11}
	got := target.likelihood(y)

	_, _, best, _ := target.place(y, false)
	sd := [2]float64{1e-4, 2e-4}
	const half, steps = 8, 400
	sum := 0.0
	at := func(a, b float64) float64 {
		c := []float64{a, b}
		m.combine(c)
		total := 0.0
		for i, f := range m.dip {
			r := (f*m.trend[i] - m.flux[i]) / m.sigma[i]
			total -= r*r/2 + math.Log(m.sigma[i]) + math.Log(2*math.Pi)/2
		}
		z := (b - 1e-4) / 2e-4
		return total - z*z/2 - math.Log(2e-4) - math.Log(2*math.Pi)/2
	}
	top := at(best[0], best[1])
	for i := -steps; i <= steps; i++ {
		for j := -steps; j <= steps; j++ {
			a, b := best[0]+half*sd[0]*float64(i)/steps, best[1]+half*sd[1]*float64(j)/steps
			sum += math.Exp(at(a, b) - top)
		}
	}
	cell := half * sd[0] / steps * half * sd[1] / steps
	want := top + math.Log(sum*cell)
	if math.Abs(got-want) > 1e-6*math.Abs(want) {
		t.Errorf("log likelihood %.9f, by integration %.9f", got, want)
	}
}
