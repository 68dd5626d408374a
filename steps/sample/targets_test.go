package sample

import (
	"math"
	"testing"

	"rimlight/steps/chain"
	"rimlight/steps/check"
)

func unbounded(names ...string) []Parameter {
	var out []Parameter
	for _, n := range names {
		out = append(out, Parameter{Name: n})
	}
	return out
}

func numbered(n int, lo, hi float64) []Parameter {
	var out []Parameter
	for i := range n {
		out = append(out, Parameter{Name: string(rune('a' + i)), Lo: lo, Hi: hi})
	}
	return out
}

// A normalTarget is a normal distribution of 20 parameters of scales from 1e-5 to
// 1e3, each correlated with the next by 0.9: a first-order autoregressive series,
// whose inverse covariance is tridiagonal.
type normalTarget struct {
	mean, sd []float64
	rho      float64
}

func newNormalTarget(n int) normalTarget {
	t := normalTarget{rho: 0.9}
	for k := range n {
		t.mean = append(t.mean, float64(k))
		t.sd = append(t.sd, math.Pow(10, float64((k*7)%9-5)))
	}
	return t
}

func (t normalTarget) gradient(x, g []float64) float64 {
	n := len(x)
	square, norm := 0.0, 1-t.rho*t.rho
	z := func(k int) float64 { return (x[k] - t.mean[k]) / t.sd[k] }
	for k := range n {
		step := z(k)
		if k > 0 {
			step -= t.rho * z(k-1)
			step /= math.Sqrt(norm)
		}
		square += step * step
		if k > 0 {
			g[k] -= step / math.Sqrt(norm) / t.sd[k]
			g[k-1] += t.rho * step / math.Sqrt(norm) / t.sd[k-1]
		} else {
			g[k] -= step / t.sd[k]
		}
	}
	return -square / 2
}

func (t normalTarget) density(x []float64) float64 { return t.gradient(x, make([]float64, len(x))) }

// starts puts chains around the mean, twice as wide as the target.
func (t normalTarget) starts(tb testing.TB, n int) [][]float64 {
	tb.Helper()
	wide := make([]float64, len(t.sd))
	for k, s := range t.sd {
		wide[k] = 2 * s
	}
	start, err := Around(numbered(len(t.sd), 0, 0), t.mean, wide, n, 7)
	if err != nil {
		tb.Fatal(err)
	}
	return start
}

// A moment is the known mean of a function of the parameters.
type moment struct {
	name string
	of   func(x []float64) float64
	want float64
}

// holds fails unless the moments are within 4 of the Monte-Carlo errors claimed.
func holds(t *testing.T, d chain.Draws, moments ...moment) {
	t.Helper()
	n := len(d.Names)
	for _, m := range moments {
		values := make([]float64, d.Chains*d.Length)
		sum := 0.0
		for i := range values {
			values[i] = m.of(d.X[i*n : (i+1)*n])
			sum += values[i] / float64(len(values))
		}
		e, err := chain.MeanError(values, d.Chains)
		if err != nil {
			t.Fatal(err)
		}
		if !(math.Abs(sum-m.want) < 4*e) {
			t.Errorf("%s: %.5g ± %.2g, want %.5g", m.name, sum, e, m.want)
		}
	}
}

// sound fails unless the draws pass all checks.
func sound(t *testing.T, d chain.Draws) {
	t.Helper()
	for _, c := range check.Failed(chain.Checks("", d)) {
		t.Errorf("%s: %g; %s (%s)", c.Name, c.Value, c.Limit, c.Why)
	}
}

// sizes gives the least bulk effective sample size.
func leastSize(t testing.TB, d chain.Draws) float64 {
	t.Helper()
	all, err := chain.Summaries(d)
	if err != nil {
		t.Fatal(err)
	}
	least := math.Inf(1)
	for _, s := range all {
		least = math.Min(least, s.BulkESS)
	}
	return least
}

// banana is the density of x, y for a normal x and a y about x²: means 0 and 1,
// mean of y² 3 + 1.
func banana(x, g []float64) float64 {
	d := x[1] - x[0]*x[0]
	if g != nil {
		g[0], g[1] = -x[0]+2*d*x[0], -d
	}
	return -x[0]*x[0]/2 - d*d/2
}

// truncated is flat exponential and half-normal densities, cut: x of density
// exp(-x) between 0 and 1, y of a normal density above 1, z of exp(z) below -2.
var truncated = []Parameter{{Name: "x", Lo: 0, Hi: 1}, {Name: "y", Lo: 1, Hi: math.Inf(1)}, {Name: "z", Lo: math.Inf(-1), Hi: -2}}

func truncatedDensity(x, g []float64) float64 {
	if g != nil {
		g[0], g[1], g[2] = -1, -x[1], 1
	}
	return -x[0] - x[1]*x[1]/2 + x[2]
}

func truncatedMoments() []moment {
	above := math.Exp(-0.5) / math.Sqrt(2*math.Pi) / normal(-1) // mean of a normal number above 1
	return []moment{
		{"x", func(x []float64) float64 { return x[0] }, 1 - 1/(math.E-1)},
		{"y", func(x []float64) float64 { return x[1] }, above},
		{"y²", func(x []float64) float64 { return x[1] * x[1] }, 1 + above},
		{"z", func(x []float64) float64 { return x[2] }, -3},
		{"z²", func(x []float64) float64 { return x[2] * x[2] }, 10},
	}
}
