package orbit

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// ulps returns the difference in units in the last place of want, which is
// rounded from want + rest.
func ulps(got, want, rest float64) float64 {
	_, exponent := math.Frexp(want)
	return math.Abs((got-want)-rest) / math.Ldexp(1, max(exponent-53, -1074))
}

func TestEccentricAnomaly(t *testing.T) {
	worst := 0.0
	for _, row := range readTable(t, "kepler/kepler_mpmath.csv") {
		e, m, want := number(t, row["e"]), number(t, row["M_rad_float64"]), number(t, row["E_rad_25d"])
		got := EccentricAnomaly(m, e)
		limit := 2.5 // half for the rounding of what is expected
		if e*1024 != math.Trunc(e*1024) {
			limit += 0.06 / (1 - e) // that of an eccentricity which is not a float64 number
		}
		if math.Abs(want) < 1e-90 {
			want = 0 // in place of an exact zero
		}
		units := ulps(got, want, 0)
		worst = max(worst, units)
		if units > limit {
			t.Errorf("e = %g, M = %g: E = %.17g, expected %.17g (%g units in the last place)", e, m, got, want, units)
		}
	}
	for _, row := range readTable(t, "kepler/kepler_random.csv") {
		e, m, want := number(t, row["e"]), number(t, row["M"]), number(t, row["E"])
		units := ulps(EccentricAnomaly(m, e), want, number(t, row["remainder"]))
		worst = max(worst, units)
		if units > 2 {
			t.Errorf("e = %g, M = %g: E = %.17g, expected %.17g (%g units in the last place)", e, m, EccentricAnomaly(m, e), want, units)
		}
	}
	t.Logf("largest error %.3g units in the last place", worst)
}

func TestPublishedAnomalies(t *testing.T) {
	for _, row := range readTable(t, "kepler/kepler_published.csv") {
		e, m := number(t, row["e"]), number(t, row["M"])
		published := number(t, row["E_published"])
		tolerance := 1.01*math.Abs(published-number(t, row["E"])) + 1e-13
		unit := 1.0
		if row["unit"] == "deg" {
			unit = math.Pi / 180
		}
		if got := EccentricAnomaly(m*unit, e) / unit; math.Abs(got-published) > tolerance {
			t.Errorf("%s: e = %g, M = %g: E = %.13g, expected %.13g", row["source"], e, m, got, published)
		}
	}
}

// bigSine returns the sine and cosine of x, 0 ≤ x ≤ 4, to 160 bits.
func bigSine(x float64) (sin, cos *big.Float) {
	value := func(v float64) *big.Float { return new(big.Float).SetPrec(160).SetFloat64(v) }
	arg := value(x / 4)
	sin, cos = value(0), value(0)
	for term, n := value(1), 0; n < 60; n++ {
		sum := cos
		if n%2 == 1 {
			sum = sin
		}
		if n%4 < 2 {
			sum.Add(sum, term)
		} else {
			sum.Sub(sum, term)
		}
		term = value(0).Quo(value(0).Mul(term, arg), value(float64(n+1)))
	}
	for range 2 { // sin 2x = 2 sin x cos x, cos 2x = 1 - 2 sin² x
		product := value(0).Mul(sin, cos)
		squared := value(0).Mul(sin, sin)
		sin, cos = product.Mul(product, value(2)), value(1).Sub(value(1), squared.Mul(squared, value(2)))
	}
	return sin, cos
}

// TestKeplerEverywhere puts solutions back into the equation, in 160 bits: the
// residual over the slope is the error. Sine and cosine, which orbits are
// computed from, must be those of the true anomaly too.
func TestKeplerEverywhere(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	value := func(v float64) *big.Float { return new(big.Float).SetPrec(160).SetFloat64(v) }
	worst, worstSine := 0.0, 0.0
	for range 20000 {
		e := 0.999 * rng.Float64()
		switch rng.IntN(4) {
		case 0:
			e = 1 - math.Pow(10, -3*rng.Float64())
		case 1:
			e = math.Pow(10, -20*rng.Float64())
		}
		m := math.Pi * rng.Float64()
		switch rng.IntN(3) {
		case 0:
			m *= math.Pow(10, -20*rng.Float64()*rng.Float64())
		case 1: // about where the form of the residual changes
			x := 0.99 + 0.02*rng.Float64()
			e = 0.5 + 0.499*rng.Float64()
			m = x - e*math.Sin(x)
		}
		if e > 0.999 {
			e = 0.999
		}
		k := newKepler(e)
		x, sinX, cosX := k.solve(m)
		sin, cos := bigSine(x)
		residual := value(0).Sub(value(x), value(m))
		residual.Sub(residual, value(0).Mul(value(e), sin))
		slope := value(0).Sub(value(1), value(0).Mul(value(e), cos))
		off, _ := value(0).Quo(residual, slope).Float64()
		units := ulps(x, x, off)
		// True sine: sin(x - off) = sin x - off cos x.
		s, _ := value(0).Sub(sin, value(sinX)).Float64()
		c, _ := value(0).Sub(cos, value(cosX)).Float64()
		sine := max(math.Abs(s-off*cosX)/math.Abs(sinX), math.Abs(c+off*sinX)) / 0x1p-53
		worst, worstSine = max(worst, units), max(worstSine, sine)
		if !(units <= 2 && sine <= 8) {
			t.Errorf("e = %.17g, M = %.17g: E = %.17g is off by %.3g units in the last place, its sine or cosine by %.3g", e, m, x, units, sine)
		}
		if y, sinY, cosY := k.solve(-m); y != -x || sinY != -sinX || cosY != cosX {
			t.Errorf("e = %.17g, M = %.17g: E = %.17g, but %.17g at -M", e, m, x, y)
		}
	}
	t.Logf("largest error %.3g units in the last place, of sine and cosine %.3g", worst, worstSine)
	// Beyond the stated range the solution is still one, if not as good.
	for range 10000 {
		e, m := 1-math.Pow(10, -12*rng.Float64()), math.Pi*math.Pow(10, -20*rng.Float64())
		k := newKepler(e)
		x, sin, cos := k.solve(m)
		// The residual's own rounding is relative to its terms.
		if back, _ := k.residual(m, x, sin, cos); !(math.Abs(back) <= 1e-15*(m+x*(1-e*math.Cos(x)))) {
			t.Errorf("e = %.17g, M = %.17g: E = %.17g leaves %g", e, m, x, back)
		}
	}
	for _, c := range [][2]float64{{1, 1}, {1, -0.1}, {1, math.NaN()}, {math.NaN(), 0.1}, {math.Inf(1), 0.1}} {
		if got := EccentricAnomaly(c[0], c[1]); !math.IsNaN(got) {
			t.Errorf("EccentricAnomaly(%g, %g) = %g, expected NaN", c[0], c[1], got)
		}
	}
	for _, e := range []float64{0, 1e-300, 0.3, 0.999} {
		if got := EccentricAnomaly(0, e); got != 0 {
			t.Errorf("E = %g at M = 0, e = %g", got, e)
		}
		for _, m := range []float64{5e-324, 1e-310, 1e-200, math.Pi, 1e6, -7} {
			if got := EccentricAnomaly(m, e); math.IsNaN(got) || math.Abs(got-m) > math.Abs(m)/(1-e) {
				t.Errorf("E = %g at M = %g, e = %g", got, m, e)
			}
		}
	}
}

func BenchmarkEccentricAnomaly(b *testing.B) {
	for _, c := range []struct {
		name string
		e    float64
	}{{"e=0.3", 0.3}, {"e=0.7", 0.7}} {
		b.Run(c.name, func(b *testing.B) {
			k, m, sum := newKepler(c.e), 0.0, 0.0
			for b.Loop() {
				m += 0.7
				if m > 3 {
					m -= 3
				}
				_, sin, _ := k.solve(m)
				sum += sin
			}
		})
	}
}
