package chain

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// importance draws from the exponential distribution of rate lambda and gives the
// logarithms of its ratios to that of rate 1, of which k = 1 - 1/lambda.
func importance(seed uint64, lambda float64, n int) (x, logRatio []float64) {
	rng := rand.New(rand.NewPCG(seed, 2))
	for range n {
		v := rng.ExpFloat64() / lambda
		x = append(x, v)
		logRatio = append(logRatio, (lambda-1)*v-math.Log(lambda))
	}
	return x, logRatio
}

func TestParetoRandom(t *testing.T) {
	for _, lambda := range []float64{1.25, 2, 10.0 / 3} {
		var sum, squares float64
		const trials, n = 200, 4000
		for i := range trials {
			_, ratio := importance(uint64(i), lambda, n)
			_, k, err := ParetoSmooth(ratio)
			if err != nil {
				t.Fatal(err)
			}
			sum += k / trials
			squares += k * k / trials
		}
		// The maximum-likelihood error is (1+k) / √190 (Smith 1984), about 0.1;
		// the prior pulls by 10 in 200 towards 1/2.
		want := 1 - 1/lambda
		if sd := math.Sqrt(squares - sum*sum); math.Abs(sum-want) > 0.03 || sd > 1.3*(1+want)/math.Sqrt(190) {
			t.Errorf("lambda %g: k-hat %.3f ± %.3f, want %.3f", lambda, sum, sd, want)
		}
	}
}

// Smoothing lessens the error of a mean where ratios have no finite variance.
func TestParetoHelps(t *testing.T) {
	const trials, n = 300, 1000
	var raw, smooth float64
	for i := range trials {
		x, ratio := importance(uint64(500+i), 10.0/3, n)
		weight, _, err := ParetoSmooth(ratio)
		if err != nil {
			t.Fatal(err)
		}
		mean := func(logWeight []float64) float64 {
			w, err := weights(logWeight)
			if err != nil {
				t.Fatal(err)
			}
			m, _ := moments(x, w, 1, 0, 0)
			return (m - 1) * (m - 1) / trials
		}
		raw += mean(ratio)
		smooth += mean(weight)
	}
	if smooth > 0.9*raw {
		t.Errorf("mean square error %.4f with smoothed weights, %.4f with raw ones", smooth, raw)
	}
}

func TestParetoSmoothWeights(t *testing.T) {
	_, ratio := importance(1, 2, 1000)
	weight, _, err := ParetoSmooth(ratio)
	if err != nil {
		t.Fatal(err)
	}
	sum := 0.0
	for _, w := range weight {
		sum += math.Exp(w)
	}
	near(t, "sum", sum, 1, 1e-12)
	// Ranks are kept, and below the tail so are the ratios' ratios.
	order := make([]int, len(ratio))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(i, j int) int {
		if ratio[i] < ratio[j] {
			return -1
		}
		return 1
	})
	for r := 1; r < len(order); r++ {
		i, j := order[r-1], order[r]
		if weight[i] > weight[j] {
			t.Fatalf("ranks %d and %d changed places", r-1, r)
		}
		if r < 900 && math.Abs(weight[j]-weight[i]-(ratio[j]-ratio[i])) > 1e-12 {
			t.Fatalf("the weight of rank %d was changed", r)
		}
	}
}

func TestParetoExtremes(t *testing.T) {
	equal := make([]float64, 100)
	rounded := make([]float64, 100)
	lone := make([]float64, 100)
	zeros := make([]float64, 100)
	for i := range rounded {
		rounded[i] = float64(i%3) * 1e-16
		lone[i] = -1000 * float64(i)
		zeros[i] = math.Inf(-1)
		if i > 90 {
			zeros[i] = float64(i % 4)
		}
	}
	for _, tc := range []struct {
		name     string
		ratio    []float64
		min, max float64
	}{
		{"equal", equal, -1, -1}, {"equal but for rounding", rounded, -1, -1},
		{"one outweighs all", lone, 0.7, math.Inf(1)}, {"few", equal[:20], math.Inf(1), math.Inf(1)},
		{"mostly zero", zeros, -2, math.Inf(1)},
	} {
		weight, k, err := ParetoSmooth(tc.ratio)
		if err != nil || !(k >= tc.min && k <= tc.max) {
			t.Errorf("%s: k-hat %g, %v", tc.name, k, err)
		}
		for i, w := range weight {
			if math.IsNaN(w) || w > 0 {
				t.Errorf("%s: weight %d is exp(%g)", tc.name, i, w)
			}
		}
	}
	for _, bad := range [][]float64{nil, {math.NaN()}, {math.Inf(1)}, {math.Inf(-1), math.Inf(-1)}} {
		if _, _, err := ParetoSmooth(bad); err == nil {
			t.Errorf("%v was accepted", bad)
		}
	}
	near(t, "limit", MostParetoK(100), 0.5, 1e-15)
	near(t, "limit", MostParetoK(4000), 0.7, 1e-15)
}

func BenchmarkParetoSmooth(b *testing.B) {
	_, ratio := importance(1, 2, 10000)
	for b.Loop() {
		if _, _, err := ParetoSmooth(ratio); err != nil {
			b.Fatal(err)
		}
	}
}
