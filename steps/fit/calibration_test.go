package fit

import (
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"rimlight/steps/lightcurve"
	"rimlight/steps/orbit"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// calibrationModel has every kind of parameter that a white fit usually has. Its
// limb darkening is known to a tenth and its impact parameter too, so that draws
// are nearly independent and their ranks mean what they should.
func calibrationModel() Model {
	normal := func(name string, mean, sd float64) Prior { return Prior{Name: name, Kind: Normal, A: mean, B: sd} }
	return Model{
		Period: 3.1, MidTransit: 2460100.4, AxisRatio: 9.4, Inclination: 87.3, RadiusRatio: 0.11,
		Trend: systematics.Trend{Polynomial: 1},
		White: Priors{uniform("midTransitOffset", -0.003, 0.003), {Name: "duration", Kind: Uniform, A: 2, B: 3.2, Unit: "h"},
			normal("impact", 0.4, 0.08), {Name: "radiusRatio", Kind: LogUniform, A: 0.08, B: 0.14}, normal("u1", 0.4, 0.1), normal("u2", 0.2, 0.1),
			{Name: "errorScale", Kind: LogUniform, A: 0.5, B: 2}},
	}
}

// calibrationCurve draws parameters from the priors and makes data of them. The
// coefficients of the trend, which have flat priors, are drawn from wide ones.
func calibrationCurve(t testing.TB, rng *rand.Rand, model Model, n int) (lightcurve.Curve, map[string]float64) {
	truth := map[string]float64{}
	for _, p := range model.White {
		switch p.Kind {
		case Uniform:
			truth[p.Name] = p.A + (p.B-p.A)*rng.Float64()
		case LogUniform:
			truth[p.Name] = p.A * math.Pow(p.B/p.A, rng.Float64())
		case Normal:
			truth[p.Name] = p.A + p.B*rng.NormFloat64()
		}
	}
	p := transit.Params{RadiusRatio: truth["radiusRatio"], Law: quadratic(truth["u1"], truth["u2"])}
	var err error
	if p.Orbit, err = (orbit.Elements{
		Basis: orbit.Basis{Size: orbit.ByDuration, Tilt: orbit.ByImpact}, Period: model.Period, MidTransit: model.MidTransit + truth["midTransitOffset"],
		Size: truth["duration"] / 24, Tilt: truth["impact"], RadiusRatio: p.RadiusRatio,
	}).Orbit(); err != nil {
		t.Fatal(err)
	}
	truth["depth"] = p.RadiusRatio * p.RadiusRatio
	c := lightcurve.Curve{Time: make([]float64, n), Err: make([]float64, n), Mask: make([]lightcurve.Flag, n)}
	for i := range n {
		c.Time[i] = model.MidTransit + 0.22*(float64(i)+0.5)/float64(n) - 0.11
	}
	if c.Flux, err = transit.Curve(c.Time, p); err != nil {
		t.Fatal(err)
	}
	level, slope := 1000*(1+0.1*rng.NormFloat64()), 0.002*rng.NormFloat64()
	for i := range n {
		x := 2*float64(i)/float64(n-1) - 1
		c.Err[i] = 4e-4 * level
		c.Flux[i] = level*c.Flux[i]*(1+slope*x) + truth["errorScale"]*c.Err[i]*rng.NormFloat64()
	}
	return c, truth
}

// TestCalibration simulates data with parameters from the priors, samples the
// posterior and ranks the truth among the draws: ranks are uniform if the
// posterior is right (Talts et al. 2018), and intervals cover as often as they
// say. RIMLIGHT_CALIBRATION is the number of simulations, 4 otherwise. The tests
// are chi-square of ten bins of ranks, which fails below a chance of 0.001 over
// the number of parameters, and binomial for coverage, four standard deviations.
func TestCalibration(t *testing.T) {
	simulations := 4
	if text := os.Getenv("RIMLIGHT_CALIBRATION"); text != "" {
		var err error
		if simulations, err = strconv.Atoi(text); err != nil {
			t.Fatal(err)
		}
	} else if testing.Short() {
		t.Skip("takes seconds")
	}
	model := calibrationModel()
	rng := rand.New(rand.NewPCG(20, 18))
	const bins, thin, draws = 10, 8, 792 // 99 draws are left, and 100 ranks
	ranks := map[string][bins]int{}
	covered68, covered95, divergent := map[string]int{}, map[string]int{}, 0
	least := math.Inf(1) // effective draws
	names := []string{"depth"}
	for _, p := range model.White {
		names = append(names, p.Name)
	}
	for i := range simulations {
		curve, truth := calibrationCurve(t, rng, model, 100)
		got, err := Sample(curve, model, Sampler{Method: SamplerNUTS, Seed: uint64(i), Chains: 1, WarmUp: 300, Draws: draws})
		if err != nil {
			t.Fatal(err)
		}
		if slices.Contains(got.Draws.Divergent, true) {
			divergent++
		}
		for _, name := range names {
			x, err := got.Draws.Column(name)
			if err != nil {
				t.Fatal(err)
			}
			rank := 0
			for k := 0; k < draws; k += thin {
				if x[k] < truth[name] {
					rank++
				}
			}
			counts := ranks[name]
			counts[rank*bins/(draws/thin+1)]++
			ranks[name] = counts
			for _, s := range got.Summary {
				if s.Name != name {
					continue
				}
				least = min(least, s.BulkESS)
				if truth[name] > s.Lo68 && truth[name] < s.Hi68 {
					covered68[name]++
				}
				if truth[name] > s.Lo95 && truth[name] < s.Hi95 {
					covered95[name]++
				}
			}
		}
	}
	n := float64(simulations)
	t.Logf("%d simulations, %d with divergences; at least %.0f effective draws of %d", simulations, divergent, least, draws)
	for _, name := range names {
		statistic := 0.0
		for _, c := range ranks[name] {
			statistic += math.Pow(float64(c)-n/bins, 2) / (n / bins)
		}
		chance := distuv.ChiSquared{K: bins - 1}.Survival(statistic)
		in68, in95 := float64(covered68[name])/n, float64(covered95[name])/n
		t.Logf("%-16s ranks %3v, chance %.3f; 68.3%% interval covers %.1f%%, 95.4%% interval %.1f%%", name, ranks[name], chance, 100*in68, 100*in95)
		if chance < 0.001/float64(len(names)) {
			t.Errorf("%s: ranks %v are not uniform (chance %.2g)", name, ranks[name], chance)
		}
		for _, c := range []struct{ got, want float64 }{{in68, 0.6827}, {in95, 0.9545}} {
			if off := math.Abs(c.got-c.want) * n; off > 4*math.Sqrt(n*c.want*(1-c.want))+1 {
				t.Errorf("%s: the interval of %.1f%% covers %.1f%%", name, 100*c.want, 100*c.got)
			}
		}
	}
}
