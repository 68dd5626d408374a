package compress

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"

	"rimlight/steps/chain"
	"rimlight/steps/limb"
	"rimlight/steps/sample"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// scenes are those that accuracy is tested on.
func scenes() map[string]scene {
	base := scene{n: 1000, r: 0.1, b: 0.3, u: [2]float64{0.3, 0.2}, noise: 6e-4, slope: true, seed: 1}
	with := func(change func(s *scene)) scene {
		s := base
		change(&s)
		return s
	}
	square := Parameters{Radius: Prior{Kind: Uniform, A: 0.001, B: 0.5}, Square: true,
		Limb: [2]Prior{{Kind: Uniform, A: 0, B: 1}, {Kind: Uniform, A: 0, B: 1}}}
	return map[string]scene{
		"plain":     with(func(s *scene) { s.parameters = square }),
		"precise":   with(func(s *scene) { s.n, s.noise = 8000, 1e-4 }),
		"eccentric": with(func(s *scene) { s.eccentricity = 0.45 }),
		"exposure":  with(func(s *scene) { s.n, s.exposure, s.noise = 200, 120, 3e-4 }),
		"added":     with(func(s *scene) { s.additive, s.pointing = true, 2 }),
		"grazing":   with(func(s *scene) { s.b, s.r, s.noise, s.n, s.parameters = 0.85, 0.15, 2e-4, 3000, square }),
		"grazed":    with(func(s *scene) { s.b, s.r, s.noise, s.parameters = 0.95, 0.12, 3e-4, square }),
		"masked":    with(func(s *scene) { s.masked, s.pointing = 0.1, 2 }),
		"gappy":     with(func(s *scene) { s.masked = 0.5 }),
		"unequal":   with(func(s *scene) { s.unequal, s.pointing, s.masked = 0.7, 2, 0.02 }),
		"settling":  with(func(s *scene) { s.settling, s.tau, s.hook, s.curved = true, 0.02, 2e-3, true }),
		"unsettled": with(func(s *scene) { s.settling, s.tau, s.hook, s.unequal = true, 0.02, 1e-4, 0.1 }),
		"held":      with(func(s *scene) { s.settling, s.tau, s.hook, s.fixed = true, 0.02, 1e-3, 0.02 }),
		"noisy":     with(func(s *scene) { s.noise, s.parameters = 3e-3, square }),
		"small":     with(func(s *scene) { s.r, s.noise, s.parameters = 0.02, 1e-3, square }),
		"given":     with(func(s *scene) { s.normal = []Coefficient{{1, 0, 1e-4}} }),
		"root":      with(func(s *scene) { s.law = limb.SquareRoot }),
		"logarithm": with(func(s *scene) { s.law = limb.Logarithmic }),
		"linear":    with(func(s *scene) { s.law = limb.Linear }),
		"uniform":   with(func(s *scene) { s.law = limb.Uniform }),
	}
}

// TestTablesChangeNothing weighs all draws anew with the exact likelihood. What moves is
// what tables do to the posterior.
func TestTablesChangeNothing(t *testing.T) {
	for _, name := range slices.Sorted(maps.Keys(scenes())) {
		s := scenes()[name]
		for _, scale := range []bool{false, true} {
			if scale && name != "plain" && name != "unequal" {
				continue
			}
			shared, curve := s.make(t, 0)
			settings := Settings{Effective: 1000, Scale: scale, Seed: 2}
			c, err := newChannel(shared, curve, scale)
			if err != nil {
				t.Fatal(name, err)
			}
			var out Posterior
			f, d, err := c.draw(settings, &out)
			if err != nil {
				t.Fatal(name, err)
			}
			compared, err := c.compare(d, f.nodes, 400)
			if err != nil {
				t.Fatal(name, err)
			}
			if !(math.Abs(compared.Shift) < 0.01 && math.Abs(compared.Ratio-1) < 0.01 && compared.SD < 0.05) {
				t.Errorf("%s: %+v", name, compared)
			}
			if !(d.size >= 1000) || !out.Mixed {
				t.Errorf("%s: %d draws worth %g, k-hat %.2f, R-hat %g, by %s", name, len(d.node), d.size, out.K, out.RHat, out.By)
			}
			t.Logf("%-10s shift %8.1e ratio-1 %8.1e sd %7.1e  k-hat %5.2f, %d of %d, %s, %d tables, error %.4f, refits %d, edge %.0e", name,
				compared.Shift, compared.Ratio-1, compared.SD, d.k, int(d.size), len(d.node), out.By, len(f.sections), f.error, out.Refits, out.Edge)
		}
	}
}

// TestAgainstWalkers samples the exact posterior by another way altogether: walkers on a
// likelihood that solves for the trend by orthogonal factors, in the parameters
// themselves.
func TestAgainstWalkers(t *testing.T) {
	names := []string{"eccentric", "unsettled"}
	if long() {
		names = []string{"plain", "eccentric", "exposure", "added", "grazing", "masked", "unequal", "settling", "unsettled", "noisy"}
	}
	for _, name := range names {
		s := scenes()[name]
		if !long() {
			s.n = 300
		}
		shared, curve := s.make(t, 0)
		p, err := shared.Posterior(curve, Settings{Effective: 20000, Seed: 1})
		if err != nil {
			t.Fatal(err)
		}
		start := []float64{p.Marginals[0].Mean, 0, 0}
		width := []float64{p.Marginals[0].SD, 0.05, 0.05}
		parameters := []sample.Parameter{{Name: "r", Lo: 0.001, Hi: 0.5}, {Name: "u1", Lo: -2, Hi: 3}, {Name: "u2", Lo: -2, Hi: 3}}
		start[1], start[2] = p.Limb[0], p.Limb[1]
		if s.parameters.Square {
			parameters[1], parameters[2] = sample.Parameter{Name: "q1", Lo: 0, Hi: 1}, sample.Parameter{Name: "q2", Lo: 0, Hi: 1}
			q1, q2, err := limb.ToSquare(limb.Quadratic, p.Limb[0], p.Limb[1])
			if err != nil {
				t.Fatal(err)
			}
			start[1], start[2] = math.Min(0.9, math.Max(0.1, q1)), math.Min(0.9, math.Max(0.1, q2))
		}
		if s.settling {
			parameters = append(parameters, sample.Parameter{Name: "ln tau", Lo: math.Log(0.002), Hi: math.Log(0.2)})
			start, width = append(start, math.Log(0.02)), append(width, 0.1)
		}
		starts, err := sample.Around(parameters, start, width, 16, 3)
		if err != nil {
			t.Fatal(err)
		}
		target := directTarget(t, shared, curve, s)
		draws, steps := 700, 300
		if long() {
			draws, steps = 4000, 1000
		}
		w, err := sample.Ensemble(parameters, target, starts, sample.EnsembleSettings{Seed: 4, WarmUp: steps, Draws: draws, Differential: 0.4})
		if err != nil {
			t.Fatal(err)
		}
		summaries, err := chain.Summaries(w)
		if err != nil {
			t.Fatal(err)
		}
		want, got := summaries[0], p.Marginals[0]
		meanError := (got.Mean - want.Mean) / want.SD
		line := fmt.Sprintf("%s: mean %+.3f sd off (error %.3f), sd ratio-1 %+.3f (error %.3f)", name, meanError, want.MeanError/want.SD, got.SD/want.SD-1, want.SDError/want.SD)
		if math.Abs(meanError) > 0.01+4*want.MeanError/want.SD || math.Abs(got.SD/want.SD-1) > 0.01+4*want.SDError/want.SD {
			t.Error(line)
		}
		t.Log(line)
	}
}

// directTarget is the log density of radius ratio, limb darkening and ln τ.
func directTarget(t *testing.T, shared *Shared, curve *Curve, s scene) func(x []float64) float64 {
	star, trend := shared.star, shared.trend
	var flux, sigma []float64
	var rows []int
	for i, used := range curve.Used {
		if used {
			rows = append(rows, i)
			flux, sigma = append(flux, curve.Flux[i]/5000), append(sigma, curve.Err[i]/5000)
		}
	}
	columns := func(logTau float64) [][]float64 {
		out := append([][]float64(nil), trend.Columns...)
		if trend.Settling {
			out = append(out, systematics.Settle(star.Times, trend.Start, math.Exp(logTau)))
		}
		return out
	}
	solve := func(f func(i int) float64, logTau float64) (chi2, logDet float64) {
		b := columns(logTau)
		a, y := mat.NewDense(len(rows), len(b), nil), mat.NewVecDense(len(rows), nil)
		for k, i := range rows {
			y.SetVec(k, flux[k]/sigma[k])
			for j := range b {
				x := b[j][i] / sigma[k]
				if j == 0 || !s.additive {
					x *= f(i)
				}
				a.Set(k, j, x)
			}
		}
		var qr mat.QR
		qr.Factorize(a)
		var x, fit mat.VecDense
		if err := qr.SolveVecTo(&x, false, y); err != nil {
			return math.Inf(1), 0
		}
		fit.MulVec(a, &x)
		fit.SubVec(y, &fit)
		var r mat.Dense
		qr.RTo(&r)
		for j := range b {
			logDet += 2 * math.Log(math.Abs(r.At(j, j)))
		}
		return mat.Dot(&fit, &fit), logDet
	}
	return func(x []float64) float64 {
		u1, u2 := x[1], x[2]
		if s.parameters.Square {
			u1, u2, _, _ = limb.FromSquare(limb.Quadratic, x[1], x[2])
		}
		logTau := 0.0
		if s.settling {
			logTau = x[3]
		}
		f, err := transit.Curve(star.Times, transit.Params{Orbit: star.Orbit, RadiusRatio: x[0], Exposure: star.Exposure,
			Law: limb.Law{Name: limb.Quadratic, Coefficients: []float64{u1, u2}}})
		if err != nil {
			return math.Inf(-1)
		}
		chi2, logDet := solve(func(i int) float64 { return f[i] }, logTau)
		value := -(chi2 + logDet) / 2
		if s.settling { // the Jeffreys prior of the coefficients given τ
			_, flat := solve(func(int) float64 { return 1 }, logTau)
			value += flat / 2
		}
		return value
	}
}
