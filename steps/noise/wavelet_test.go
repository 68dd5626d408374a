package noise

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestWaveletReference(t *testing.T) {
	var cases []struct {
		Residual                      []float64
		Red, White                    float64
		LogLike, ByLogRed, ByLogWhite string
	}
	readJSON(t, "wavelet.json", &cases)
	if len(cases) < 3 {
		t.Fatal("cases are missing")
	}
	for _, c := range cases {
		g, err := Wavelet{c.Red, c.White}.Gradient(c.Residual)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "log likelihood", g.LogLikelihood, parse(t, c.LogLike), 1, 1e-13)
		near(t, "by red", g.ByLogRed, parse(t, c.ByLogRed), 1, 1e-12)
		near(t, "by white", g.ByLogWhite, parse(t, c.ByLogWhite), 1, 1e-12)
		// The likelihood is quadratic in each residual, so that central differences are exact.
		for i := range c.Residual {
			x := append([]float64(nil), c.Residual...)
			x[i] += 0.5
			up, _ := Wavelet{c.Red, c.White}.LogLikelihood(x)
			x[i]--
			down, _ := Wavelet{c.Red, c.White}.LogLikelihood(x)
			near(t, "by residual", g.ByResidual[i], up-down, 1, 1e-12)
		}
	}
}

// Noise whose wavelet coefficients have the variances of the model gives them back.
func TestWaveletRecovers(t *testing.T) {
	const n, truth = 4096, 20.0
	rng := rand.New(rand.NewPCG(1, 2))
	x, work := make([]float64, n), make([]float64, n)
	for i := range x {
		m := max(1, math.Ilogb(float64(i))+1) // coefficients 2^(m-1) to 2^m-1 are of scale m
		share := math.Ldexp(1, -m)
		if m == 1 || i == 0 {
			share = 0.5 / (2 * math.Ln2)
		}
		x[i] = math.Sqrt(share*truth*truth+1) * rng.NormFloat64()
	}
	for length := 4; length <= n; length *= 2 {
		backward(x[:length], work)
	}
	w := Wavelet{Red: 5, White: 2}
	for range 200 { // steepest ascent in logarithms
		g, err := w.Gradient(x)
		if err != nil {
			t.Fatal(err)
		}
		w.Red *= math.Exp(g.ByLogRed / n)
		w.White *= math.Exp(g.ByLogWhite / n)
	}
	near(t, "red", w.Red, truth, 0, 0.1)
	near(t, "white", w.White, 1, 0, 0.05)
}

func TestUsableLength(t *testing.T) {
	for n := range 1500 {
		m := UsableLength(n)
		if m > n || n >= 4 && m == 0 || UsableLength(m) != m || n >= 64 && (n-m)*16 > n {
			t.Fatalf("of %d, %d are usable", n, m)
		}
		if _, err := (Wavelet{1, 1}).Gradient(make([]float64, m)); (err == nil) != (m > 0) {
			t.Fatalf("%d: %v", m, err)
		}
		if m != n {
			if _, err := (Wavelet{1, 1}).Gradient(make([]float64, n)); err == nil {
				t.Fatalf("%d residuals were taken", n)
			}
		}
	}
}
