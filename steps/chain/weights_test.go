package chain

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestWeightESS(t *testing.T) {
	for _, tc := range []struct {
		logWeight []float64
		want      float64
	}{
		{[]float64{5, 5, 5, 5}, 4},
		{[]float64{-1000, math.Inf(-1)}, 1},
		{[]float64{math.Log(3), math.Log(1)}, 1.6}, // 16 / 10
	} {
		got, err := WeightESS(tc.logWeight)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "size", got, tc.want, 1e-14)
	}
}

func TestLogMeanWeight(t *testing.T) {
	value, sd, err := LogMeanWeight([]float64{math.Log(3e200), math.Log(1e200), math.Inf(-1), math.Inf(-1)})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "mean", value, math.Log(1e200), 1e-14)
	near(t, "error", sd, math.Sqrt(10.0/16-1.0/4), 1e-14)
}

func TestWeightedQuantile(t *testing.T) {
	x, w := []float64{3, 1, 2, 99}, []float64{0, 0, 0, math.Inf(-1)}
	for p, want := range map[float64]float64{0: 1, 1.0 / 6: 1, 0.5: 2, 2.0 / 3: 2.5, 1: 3} {
		got, err := WeightedQuantile(x, w, p)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "quantile", got, want, 1e-14)
	}
	// Weights of 2 and 1: the middles are at 1/3 and 5/6.
	got, err := WeightedQuantile([]float64{0, 1}, []float64{math.Log(2), 0}, 0.5)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "quantile", got, 1.0/3, 1e-14)
	for _, p := range []float64{-0.1, 1.1, math.NaN()} {
		if _, err := WeightedQuantile(x, w, p); err == nil {
			t.Errorf("p %g was accepted", p)
		}
	}
}

// Normal draws with weights are draws from a normal distribution of another mean.
func TestWeightedMoments(t *testing.T) {
	const n = 40000
	rng := rand.New(rand.NewPCG(1, 2))
	w := Weighted{Names: []string{"a", "b"}, Units: []string{"d", ""}}
	for range n {
		a, z := rng.NormFloat64(), rng.NormFloat64()
		w.X = append(w.X, a, 0.6*a+0.8*z)
		w.LogWeight = append(w.LogWeight, 0.5*a-7)
	}
	s, err := WeightedSummaries(w)
	if err != nil {
		t.Fatal(err)
	}
	c, err := WeightedCovariance(w)
	if err != nil {
		t.Fatal(err)
	}
	check := func(what string, got, want float64) {
		t.Helper()
		if math.Abs(got-want) > 4*1.3/math.Sqrt(s[0].BulkESS) {
			t.Errorf("%s: %.4f, want %.4f", what, got, want)
		}
	}
	check("mean", s[0].Mean, 0.5)
	check("mean", s[1].Mean, 0.3)
	check("median", s[0].Median, 0.5)
	check("lower", s[0].Lo68, -0.5)
	check("upper", s[0].Hi68, 1.5)
	check("sd", s[0].SD, 1)
	check("covariance", c[0][1], 0.6)
	check("variance", c[1][1], 1)
	near(t, "size", s[0].BulkESS, n*math.Exp(-0.25), 0.05)
	d, err := Resample(w, 20000, 5)
	if err != nil {
		t.Fatal(err)
	}
	r, err := Summaries(d)
	if err != nil {
		t.Fatal(err)
	}
	check("resampled mean", r[1].Mean, s[1].Mean)
	check("resampled sd", r[1].SD, s[1].SD)
	if r[0].RHat > 1.01 || r[0].Unit != "d" {
		t.Errorf("resampled: %+v", r[0])
	}
	again, err := Resample(w, 20000, 5)
	if err != nil || again.X[777] != d.X[777] {
		t.Errorf("the same seed gave other draws, %v", err)
	}
}
