package sample

import (
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"rimlight/steps/chain"
	"rimlight/steps/check"
)

func TestImportance(t *testing.T) {
	target := newNormalTarget(3)
	parameters := numbered(3, 0, 0)
	scale := make([][]float64, 3)
	for k := range scale {
		scale[k] = make([]float64, 3)
		for l := range scale[k] {
			scale[k][l] = math.Pow(0.85, math.Abs(float64(k-l))) * target.sd[k] * target.sd[l] // not quite that of the target
		}
	}
	proposal := StudentT{Mean: append([]float64(nil), target.mean...), Scale: scale, Degrees: 5}
	proposal.Mean[1] += 0.3 * target.sd[1]
	w, ratio, err := Importance(parameters, target.density, proposal, 20000, 1)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range check.Failed(chain.ImportanceChecks("", ratio)) {
		t.Errorf("%s: %g; %s", c.Name, c.Value, c.Limit)
	}
	// The density is that of a normal distribution but for its constant.
	want := 1.5*math.Log(2*math.Pi) + math.Log(1-0.9*0.9)
	for _, sd := range target.sd {
		want += math.Log(sd)
	}
	if z, sd, err := chain.LogMeanWeight(ratio); err != nil || math.Abs(z-want) > 4*sd || sd > 0.02 {
		t.Errorf("evidence exp(%.4f ± %.4f), want exp(%.4f), %v", z, sd, want, err)
	}
	s, err := chain.WeightedSummaries(w)
	if err != nil {
		t.Fatal(err)
	}
	for k, p := range s {
		tolerance := 4.5 * target.sd[k] / math.Sqrt(p.BulkESS)
		if math.Abs(p.Mean-target.mean[k]) > tolerance || math.Abs(p.SD-target.sd[k]) > tolerance {
			t.Errorf("%s: mean %g and standard deviation %g, want %g and %g", p.Name, p.Mean, p.SD, target.mean[k], target.sd[k])
		}
	}
	c, err := chain.WeightedCovariance(w)
	if err != nil {
		t.Fatal(err)
	}
	if rho := c[0][1] / target.sd[0] / target.sd[1]; math.Abs(rho-0.9) > 4.5/math.Sqrt(s[0].BulkESS) {
		t.Errorf("correlation %.3f, want 0.9", rho)
	}
	again, _, err := Importance(parameters, target.density, proposal, 20000, 1)
	if err != nil || !reflect.DeepEqual(w, again) {
		t.Errorf("the same seed gave other draws, %v", err)
	}

	// Limits cut.
	cut, _, err := Importance([]Parameter{{Name: "a", Lo: 0, Hi: math.Inf(1)}}, func(x []float64) float64 { return -x[0] * x[0] / 2 },
		StudentT{Mean: []float64{0}, Scale: [][]float64{{1}}, Degrees: 3}, 20000, 2)
	if err != nil {
		t.Fatal(err)
	}
	s, err = chain.WeightedSummaries(cut)
	if err != nil {
		t.Fatal(err)
	}
	if want := math.Sqrt(2 / math.Pi); math.Abs(s[0].Mean-want) > 4*0.6/math.Sqrt(s[0].BulkESS) {
		t.Errorf("mean of a half normal number %.4f, want %.4f", s[0].Mean, want)
	}

	// A proposal that is too narrow is seen.
	narrow := StudentT{Mean: []float64{0}, Scale: [][]float64{{0.04}}, Degrees: 50}
	_, ratio, err = Importance(unbounded("a"), func(x []float64) float64 { return -x[0] * x[0] / 2 }, narrow, 4000, 1)
	if err != nil {
		t.Fatal(err)
	}
	if failed := check.Failed(chain.ImportanceChecks("", ratio)); len(failed) == 0 {
		t.Error("a proposal of a fifth of the width passed")
	}
}

func TestImportanceRefused(t *testing.T) {
	f := func(x []float64) float64 { return 0 }
	good := StudentT{Mean: []float64{0}, Scale: [][]float64{{1}}, Degrees: 5}
	for name, tc := range map[string]struct {
		f        func(x []float64) float64
		proposal StudentT
		n        int
	}{
		"nil": {nil, good, 10}, "count": {f, good, 0}, "empty": {func(x []float64) float64 { return math.NaN() }, good, 10},
		"mean": {f, StudentT{Scale: good.Scale, Degrees: 5}, 10}, "NaN": {f, StudentT{[]float64{math.NaN()}, good.Scale, 5}, 10},
		"degrees": {f, StudentT{good.Mean, good.Scale, 0}, 10}, "scale": {f, StudentT{good.Mean, [][]float64{{-1}}, 5}, 10},
		"rows": {f, StudentT{good.Mean, [][]float64{{}}, 5}, 10},
	} {
		if _, _, err := Importance(unbounded("a"), tc.f, tc.proposal, tc.n, 1); err == nil {
			t.Errorf("%s was accepted", name)
		}
	}
}

// A chi-squared number has the mean n and the variance 2 n.
func TestChiSquared(t *testing.T) {
	const n = 200000
	for _, degrees := range []float64{0.5, 1, 5, 30} {
		rng := rand.New(rand.NewPCG(1, 2))
		var sum, square float64
		for range n {
			x := chiSquared(rng, degrees)
			sum += x / n
			square += (x - degrees) * (x - degrees) / n
		}
		sd := math.Sqrt(2 * degrees / n)
		if math.Abs(sum-degrees) > 4*sd || math.Abs(square/(2*degrees)-1) > 4*math.Sqrt((2+12/degrees)/n) {
			t.Errorf("%g degrees: mean %.4f, variance %.4f", degrees, sum, square)
		}
	}
}
