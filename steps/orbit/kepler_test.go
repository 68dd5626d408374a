package orbit

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestEccentricAnomaly(t *testing.T) {
	worst := 0.0
	for _, row := range readTable(t, "kepler/kepler_mpmath.csv") {
		e, m, want := number(t, row["e"]), number(t, row["M_rad_float64"]), number(t, row["E_rad_25d"])
		got := EccentricAnomaly(m, e)
		// A few roundings of the iteration, and that of an eccentricity which is
		// not a float64 number.
		limit := 2.5
		if e*1024 != math.Trunc(e*1024) {
			limit += 0.06 / (1 - e)
		}
		if math.Abs(want) < 1e-90 {
			want = 0 // in place of an exact zero
		}
		units := math.Abs(got-want) / (math.Nextafter(math.Abs(want), math.Inf(1)) - math.Abs(want))
		worst = max(worst, units)
		if units > limit {
			t.Errorf("e = %g, M = %g: E = %.17g, expected %.17g (%g units in the last place)", e, m, got, want, units)
		}
	}
	t.Logf("largest error %g units in the last place", worst)
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

// TestKeplerEverywhere puts solutions back into the equation.
func TestKeplerEverywhere(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for range 100000 {
		e := 1 - math.Pow(10, -12*rng.Float64())
		if rng.Float64() < 0.5 {
			e = rng.Float64()
		}
		m := math.Pi * math.Pow(10, -20*rng.Float64()*rng.Float64())
		x := EccentricAnomaly(m, e)
		sin, cos := math.Sincos(x)
		back := (1-e)*x + e*arcMinusSine(x, sin)
		if !(math.Abs(back-m) <= 2e-15*m+1e-15*x*(1-e*cos)) {
			t.Fatalf("e = %.17g, M = %.17g: E = %.17g gives M = %.17g", e, m, x, back)
		}
	}
	for _, c := range [][2]float64{{1, 1}, {1, -0.1}, {1, math.NaN()}, {math.NaN(), 0.1}, {math.Inf(1), 0.1}} {
		if got := EccentricAnomaly(c[0], c[1]); !math.IsNaN(got) {
			t.Errorf("EccentricAnomaly(%g, %g) = %g, expected NaN", c[0], c[1], got)
		}
	}
}

func BenchmarkEccentricAnomaly(b *testing.B) {
	m := 0.0
	for b.Loop() {
		m = math.Mod(m+0.7, 3)
		EccentricAnomaly(m, 0.3)
	}
}
