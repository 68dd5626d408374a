package sample

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/chain"
	"rimlight/steps/check"
)

// normalLikelihood is a normal density of that standard deviation about the middle
// of the unit cube, of which nothing to speak of lies outside: the evidence is 1.
func normalLikelihood(n int, sd float64) func(x []float64) float64 {
	return func(x []float64) float64 {
		sum := 0.0
		for _, v := range x {
			z := (v - 0.5) / sd
			sum += z * z
		}
		return -sum/2 - float64(n)*math.Log(sd*math.Sqrt(2*math.Pi))
	}
}

// evidences runs nested sampling for seeds and gives the mean deviation of LogZ from
// the truth in units of its standard error, by the scatter of the runs, and the mean
// square deviation in units of the errors claimed.
func evidences(t *testing.T, name string, trials int, truth float64, run func(seed uint64) (Evidence, error)) (bias, square float64) {
	t.Helper()
	var sum, squares, err float64
	evaluations := 0
	ranks := 0.0
	for seed := range uint64(trials) {
		e, failure := run(seed)
		if failure != nil {
			t.Fatal(failure)
		}
		sum += (e.LogZ - truth) / float64(trials)
		squares += (e.LogZ - truth) * (e.LogZ - truth) / float64(trials)
		err += e.Err * e.Err / float64(trials)
		square += (e.LogZ - truth) * (e.LogZ - truth) / (e.Err * e.Err) / float64(trials)
		evaluations += e.Evaluations / trials
		ranks = max(ranks, -math.Log10(e.RankP))
	}
	bias = sum / math.Sqrt((squares-sum*sum)/float64(trials-1))
	t.Logf("%s: LogZ off by %.3f on average, %.1f of its error; claimed error %.3f, made %.2f of it; %d evaluations; least probability of ranks 1e-%.1f",
		name, sum, bias, math.Sqrt(err), math.Sqrt(square), evaluations, ranks)
	return bias, square
}

func TestNestedNormal(t *testing.T) {
	for n, trials := range map[int]int{1: 40, 2: 40, 5: 30, 10: 12} {
		bias, square := evidences(t, fmt.Sprint(n, " parameters"), trials, 0, func(seed uint64) (Evidence, error) {
			_, e, err := Nested(numbered(n, 0, 1), nil, normalLikelihood(n, 0.02), NestedSettings{Seed: seed, Live: 100})
			return e, err
		})
		if math.Abs(bias) > 3.5 {
			t.Errorf("%d parameters: the evidence is biased by %.1f of the error of the mean", n, bias)
		}
		// The mean of 12 squares of normal numbers scatters by 0.4.
		if square < 0.2 || square > 2.4 {
			t.Errorf("%d parameters: mean square error of the evidence is %.2f of that claimed", n, square)
		}
	}
}

// The evidences of targets of other shapes are known, too, and so are moments.
func TestNestedShapes(t *testing.T) {
	bimodal := func(x []float64) float64 { // a third at (0.2, 0.2), narrow; two thirds at (0.7, 0.8), wide
		mode := func(at0, at1, sd float64) float64 {
			a, b := (x[0]-at0)/sd, (x[1]-at1)/sd
			return -(a*a+b*b)/2 - math.Log(2*math.Pi*sd*sd)
		}
		return logSum(mode(0.2, 0.2, 0.005)+math.Log(1.0/3), mode(0.7, 0.8, 0.03)+math.Log(2.0/3))
	}
	correlated := func(x []float64) float64 {
		const rho, sd = 0.99, 0.05
		a, b := (x[0]-0.5)/sd, (x[1]-0.5)/sd
		return -(a*a-2*rho*a*b+b*b)/(2*(1-rho*rho)) - math.Log(2*math.Pi*sd*sd*math.Sqrt(1-rho*rho))
	}
	bananaPrior := func(u []float64) []float64 {
		return []float64{NormalQuantile(u[0], 0, 1), UniformQuantile(u[1], -10, 30)}
	}
	bananaLikelihood := func(x []float64) float64 { return -(x[1] - x[0]*x[0]) * (x[1] - x[0]*x[0]) / 2 / 0.01 }
	corner := func(x []float64) float64 { // zero in three quarters of the prior
		if x[0] < 0.5 || x[1] < 0.5 {
			return math.Inf(-1)
		}
		return -20 * (x[0] - 0.5)
	}
	plateau := func(x []float64) float64 { // two levels
		if x[0] < 0.1 {
			return math.Log(50)
		}
		return 0
	}
	for _, tc := range []struct {
		name       string
		n          int
		prior      func(u []float64) []float64
		likelihood func(x []float64) float64
		logZ       float64
		drift      float64 // factor of the error claimed that the numbers of points in separate modes bring
		of         func(x []float64) float64
		mean       float64
	}{
		{"bimodal", 2, nil, bimodal, 0, 2.5, func(x []float64) float64 { return math.Floor(x[0] + 0.6) }, 2.0 / 3},
		{"correlated", 2, nil, correlated, 0, 1, func(x []float64) float64 { return (x[0] - 0.5) * (x[1] - 0.5) / 0.0025 }, 0.99},
		{"banana", 2, bananaPrior, bananaLikelihood, math.Log(0.1 * math.Sqrt(2*math.Pi) / 40), 1, func(x []float64) float64 { return x[1] }, 1},
		{"corner", 2, nil, corner, math.Log((1 - math.Exp(-10)) / 20 / 2), 1, func(x []float64) float64 { return x[0] }, 0.55},
		{"plateau", 2, nil, plateau, math.Log(5.9), 1, func(x []float64) float64 { return math.Floor(x[0] + 0.9) }, 0.9 / 5.9},
	} {
		means, squares := 0.0, 0.0
		const trials = 20
		bias, square := evidences(t, tc.name, trials, tc.logZ, func(seed uint64) (Evidence, error) {
			w, e, err := Nested(numbered(tc.n, 0, 1), tc.prior, tc.likelihood, NestedSettings{Seed: 100 + seed, Live: 200})
			if err != nil {
				return e, err
			}
			mean := 0.0
			for i, log := range w.LogWeight {
				mean += math.Exp(log) * tc.of(w.X[i*tc.n:(i+1)*tc.n])
			}
			means += mean / trials
			squares += mean * mean / trials
			return e, nil
		})
		if math.Abs(bias) > 3.5 || square < 0.2 || square > 2.2*tc.drift*tc.drift {
			t.Errorf("%s: bias %.1f, mean square error %.2f of that claimed", tc.name, bias, square)
		}
		if e := math.Sqrt((squares - means*means) / (trials - 1)); math.Abs(means-tc.mean) > 4.5*e {
			t.Errorf("%s: mean %.4f ± %.4f, want %.4f", tc.name, means, e, tc.mean)
		}
	}
}

func TestNestedPosterior(t *testing.T) {
	likelihood := normalLikelihood(3, 0.02)
	settings := NestedSettings{Seed: 1}
	w, e, err := Nested(numbered(3, 0, 1), nil, likelihood, settings)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range check.Failed(EvidenceChecks("", w, e)) {
		t.Errorf("%s: %g; %s", c.Name, c.Value, c.Limit)
	}
	s, err := chain.WeightedSummaries(w)
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range s {
		tolerance := 4 * 0.02 / math.Sqrt(p.BulkESS)
		if math.Abs(p.Mean-0.5) > tolerance || math.Abs(p.SD-0.02) > tolerance || math.Abs(p.Lo68-0.48) > 2*tolerance || math.Abs(p.Hi95-0.54) > 3*tolerance {
			t.Errorf("%s: %+v", p.Name, p)
		}
	}
	again, f, err := Nested(numbered(3, 0, 1), nil, likelihood, settings)
	if err != nil || !reflect.DeepEqual(w, again) || e != f {
		t.Errorf("the same seed gave another result, %v", err)
	}
	// What the evidence of a normal likelihood says of itself.
	if want := -3*math.Log(0.02*math.Sqrt(2*math.Pi*math.E)) - 0.0; math.Abs(e.Information-want) > 0.5 {
		t.Errorf("information %.2f, want %.2f", e.Information, want)
	}
}

func TestUniformRanks(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	low := 0
	for range 1000 {
		ranks := make([]int, 2000)
		for i := range ranks {
			ranks[i] = rng.IntN(100)
		}
		if uniformRanks(ranks, 100) < 0.05 {
			low++
		}
	}
	if low > 80 || low < 15 { // 50 expected, or fewer, since ranks are whole numbers
		t.Errorf("%d of 1000 sets of even ranks have a probability below 0.05", low)
	}
	ranks := make([]int, 2000)
	for i := range ranks {
		ranks[i] = max(rng.IntN(100), rng.IntN(100)/2)
	}
	if p := uniformRanks(ranks, 100); p > 1e-3 {
		t.Errorf("uneven ranks have a probability of %g", p)
	}
}

func TestNestedRefused(t *testing.T) {
	f := func(x []float64) float64 { return 0 }
	good := numbered(2, 0, 1)
	for name, tc := range map[string]struct {
		parameters []Parameter
		prior      func(u []float64) []float64
		f          func(x []float64) float64
		settings   NestedSettings
		want       string
	}{
		"nil":      {good, nil, nil, NestedSettings{}, "nil"},
		"open":     {unbounded("a"), nil, f, NestedSettings{}, "no finite range"},
		"live":     {good, nil, f, NestedSettings{Live: 3}, "live points"},
		"lengths":  {good, func(u []float64) []float64 { return u[:1] }, f, NestedSettings{}, "the prior gave 1 numbers"},
		"infinite": {good, func(u []float64) []float64 { return []float64{0, math.NaN()} }, f, NestedSettings{}, "the prior gave NaN for b"},
		"empty":    {good, nil, func(x []float64) float64 { return math.NaN() }, NestedSettings{Evaluations: 1000}, "spent"},
		"spent":    {good, nil, normalLikelihood(2, 0.01), NestedSettings{Evaluations: 5000}, "share"},
	} {
		if _, _, err := Nested(tc.parameters, tc.prior, tc.f, tc.settings); err == nil || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
}
