package transit

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"strings"
	"testing"
)

const (
	// fluxTolerance is what Quadratic promises, plus what a last-place error of
	// the decimal arguments does to the flux.
	fluxTolerance = 1e-14
	// gradientTolerance is relative to max(1, |derivative|).
	gradientTolerance = 1e-13
)

// table reads a CSV file and returns its rows by column name.
func table(t *testing.T, name string) []map[string]string {
	t.Helper()
	file, err := os.Open("../../testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) < 2 {
		t.Fatalf("%s is empty", name)
	}
	var out []map[string]string
	for _, row := range rows[1:] {
		m := map[string]string{}
		for i, key := range rows[0] {
			m[key] = row[i]
		}
		out = append(out, m)
	}
	return out
}

// number parses a decimal number or a sum like 1.125-2**-8.
func number(t *testing.T, s string) float64 {
	t.Helper()
	if v, err := strconv.ParseFloat(s, 64); err == nil {
		return v
	}
	sign := 1.0
	head, power, found := strings.Cut(s, "2**-")
	n, err := strconv.Atoi(power)
	if !found || err != nil {
		t.Fatalf("%q is no number", s)
	}
	base := 0.0
	if head != "" {
		if strings.HasSuffix(head, "-") {
			sign = -1
		}
		base = number(t, head[:len(head)-1])
	}
	return base + sign*math.Ldexp(1, -n)
}

func TestQuadraticTable(t *testing.T) {
	worst := 0.0
	for _, row := range table(t, "transit/flux_cases.csv") {
		r, z := number(t, row["r_expr"]), number(t, row["z_expr"])
		u1, u2 := number(t, row["u1"]), number(t, row["u2"])
		want := number(t, row["flux"])
		tolerance := fluxTolerance
		if r > 10 {
			tolerance *= r / 10
		}
		got := Quadratic(r, z, u1, u2)
		diff := math.Abs(got - want)
		if row["exact"] == "1" {
			worst = math.Max(worst, diff)
		}
		if !(diff <= tolerance) {
			t.Errorf("%s, %s: r = %s, z = %s: flux %.17g, want %s, off by %.1e", row["note"], row["law"], row["r_expr"], row["z_expr"], got, row["flux"], got-want)
		}
	}
	t.Logf("largest error %.1e", worst)
}

func TestQuadraticGradientTable(t *testing.T) {
	worst := 0.0
	for _, row := range table(t, "transit/flux_derivatives.csv") {
		r, z := number(t, row["r"]), number(t, row["z"])
		flux, dr, dz, du1, du2 := QuadraticGradient(r, z, number(t, row["u1"]), number(t, row["u2"]))
		for i, got := range []float64{flux, dr, dz, du1, du2} {
			name := []string{"flux", "dr", "dz", "du1", "du2"}[i]
			if row[name] == "" {
				continue
			}
			want := number(t, row[name])
			diff := math.Abs(got-want) / math.Max(1, math.Abs(want))
			worst = math.Max(worst, diff)
			if !(diff <= gradientTolerance) {
				t.Errorf("%s, r = %g, z = %g: %s is %.17g, want %s", row["law"], r, z, name, got, row[name])
			}
		}
	}
	t.Logf("largest error %.1e", worst)
}

// bruteForce integrates the covered light over the radius ρ of the star, the
// fraction of each ring covered by the planet being known; Simpson's rule with
// substitutions that take the square roots out of both ends.
func bruteForce(r, z, u1, u2 float64) float64 {
	covered := func(rho float64) float64 { // half-angle of the ring
		if rho+z <= r {
			return math.Pi
		}
		if rho >= z+r || rho <= z-r {
			return 0
		}
		// tan²(angle/2) keeps digits at both ends.
		return 2 * math.Atan(math.Sqrt((r-rho+z)*(r+rho-z)/((rho+z-r)*(rho+z+r))))
	}
	integrand := func(rho float64) float64 {
		mu := math.Sqrt(math.Max(0, (1-rho)*(1+rho)))
		return 2 * rho * covered(rho) * (1 - u1*(1-mu) - u2*(1-mu)*(1-mu))
	}
	edges := []float64{0, math.Min(1, math.Abs(z-r)), math.Min(1, z+r), 1}
	sum := 0.0
	const n = 1500
	for i := 1; i < len(edges); i++ {
		a, b := edges[i-1], edges[i]
		if b <= a {
			continue
		}
		for k := 0; k <= n; k++ {
			weight := 2.0
			if k == 0 || k == n {
				weight = 1
			} else if k%2 == 1 {
				weight = 4
			}
			s, c := math.Sincos(math.Pi * float64(k) / n / 2)
			rho := a + (b-a)*s*s
			sum += weight / 3 * integrand(rho) * (b - a) * 2 * s * c * math.Pi / 2 / n
		}
	}
	return 1 - sum/(math.Pi*(1-u1/3-u2/6))
}

func TestQuadraticRandom(t *testing.T) {
	random := rand.New(rand.NewPCG(7, 1))
	worst := 0.0
	for range 1500 {
		r := math.Exp(random.Float64()*7 - 5.5) // 0.004 to 4.5
		z := random.Float64() * (1 + r)
		u1, u2 := random.Float64()*2-0.5, random.Float64()*1.5-1
		got, want := Quadratic(r, z, u1, u2), bruteForce(r, z, u1, u2)
		worst = math.Max(worst, math.Abs(got-want))
		if !(math.Abs(got-want) < 1e-9) {
			t.Errorf("Quadratic(%g, %g, %g, %g) = %.12g, want %.12g", r, z, u1, u2, got, want)
		}
	}
	t.Logf("largest difference %.1e", worst)
}

func TestQuadraticGradientDifferences(t *testing.T) {
	random := rand.New(rand.NewPCG(7, 2))
	for range 2000 {
		r := math.Exp(random.Float64()*6 - 5)
		z := random.Float64() * (1 + r)
		u1, u2 := random.Float64()*1.5-0.5, random.Float64()-0.5
		const step = 1e-5
		// Away from the contacts, where the third derivative is infinite.
		if math.Min(math.Abs(z-math.Abs(1-r)), 1+r-z) < 300*step || z < step || r < 2*step {
			continue
		}
		flux, dr, dz, du1, du2 := QuadraticGradient(r, z, u1, u2)
		if flux != Quadratic(r, z, u1, u2) {
			t.Fatalf("flux with gradient differs at r = %g, z = %g", r, z)
		}
		numeric := []float64{
			Quadratic(r+step, z, u1, u2) - Quadratic(r-step, z, u1, u2),
			Quadratic(r, z+step, u1, u2) - Quadratic(r, z-step, u1, u2),
			Quadratic(r, z, u1+step, u2) - Quadratic(r, z, u1-step, u2),
			Quadratic(r, z, u1, u2+step) - Quadratic(r, z, u1, u2-step),
		}
		for i, got := range []float64{dr, dz, du1, du2} {
			if want := numeric[i] / (2 * step); !(math.Abs(got-want) < 1e-6) {
				t.Errorf("r = %g, z = %g, u = %g, %g: derivative %d is %.10g, differences give %.10g", r, z, u1, u2, i, got, want)
			}
		}
	}
}

// TestContinuity walks across every seam of the domain in the smallest steps:
// neighbouring numbers must give neighbouring fluxes and derivatives.
func TestContinuity(t *testing.T) {
	for _, r := range []float64{1e-4, 0.01, 0.1, 0.3, 0.5, math.Nextafter(0.5, 0), 0.7, 1, 1.5, 2, 3, 20} {
		for _, z := range []float64{0, r, math.Abs(1 - r), 1 + r, 0.5, 1, 2, r / 3} {
			if z > 1+r || z < r-1 {
				continue
			}
			flux, dr, dz, du1, du2 := QuadraticGradient(r, z, 0.4, 0.3)
			for _, away := range []float64{-1, 1} {
				next := z
				for range 40 {
					next = math.Nextafter(next, away*math.Inf(1))
					if next < 0 {
						break
					}
					f, br, bz, b1, b2 := QuadraticGradient(r, next, 0.4, 0.3)
					// dr goes as the square root of the distance from a contact.
					near := 2*math.Sqrt(math.Abs(next-z))*math.Max(1, r) + 1e-12
					if r == 1 && z == 0 {
						near = 3 // a corner
					}
					if !(math.Abs(f-flux) < 1e-13*math.Max(1, r) && math.Abs(br-dr) < near && math.Abs(bz-dz) < near && math.Abs(b1-du1) < 1e-13*math.Max(1, r) && math.Abs(b2-du2) < 1e-13*math.Max(1, r)) {
						t.Fatalf("r = %g: from z = %.17g to %.17g: %v to %v", r, z, next, []float64{flux, dr, dz, du1, du2}, []float64{f, br, bz, b1, b2})
					}
				}
			}
		}
	}
}

func TestEdgesOfDomain(t *testing.T) {
	lengths := []float64{0, 5e-324, 1e-200, 1e-160, 1e-101, 1e-99, 1e-20, 1e-9, 0.25, 0.5, math.Nextafter(1, 0), 1, math.Nextafter(1, 2), 1.5, 2, 3, 1e3, 1e6, 1e9, 1e17, 1e300, math.MaxFloat64}
	coefficients := [][2]float64{{0, 0}, {0.4, 0.3}, {3, 0}, {0, 6}, {-5, 12}, {1e200, -1e300}, {math.MaxFloat64, math.MaxFloat64}, {2, 1.9999999}}
	for _, r := range lengths {
		separations := append([]float64{r, 1 + r, math.Abs(1 - r), math.Nextafter(r, 0), math.Nextafter(1+r, 0), r + 0.5, r - 0.25, math.Inf(1)}, lengths...)
		for _, z := range separations {
			if z < 0 || math.IsInf(1+r, 1) {
				continue
			}
			for _, u := range coefficients {
				flux, dr, dz, du1, du2 := QuadraticGradient(r, z, u[0], u[1])
				for _, v := range []float64{flux, dr, dz, du1, du2, Quadratic(r, z, u[0], u[1])} {
					if math.IsNaN(v) || math.IsInf(v, 0) {
						t.Fatalf("r = %g, z = %g, u = %v: %v", r, z, u, []float64{flux, dr, dz, du1, du2})
					}
				}
				if u[0] == 0.4 && !(flux >= -1e-9 && flux <= 1) {
					t.Fatalf("r = %g, z = %g: flux %.17g is not within 0 and 1", r, z, flux)
				}
			}
		}
	}
	nan := math.NaN()
	for _, a := range [][2]float64{{-0.1, 0.5}, {0.1, -0.5}, {nan, 0.5}, {0.1, nan}, {math.Inf(1), 1}, {math.Inf(1), math.Inf(1)}} {
		if v := Quadratic(a[0], a[1], 0.4, 0.3); !math.IsNaN(v) {
			t.Errorf("Quadratic(%g, %g) is %g, want NaN", a[0], a[1], v)
		}
	}
	if v := Quadratic(0.1, 0.5, 3, 0); v != 1 {
		t.Errorf("a star without light has flux %g, want 1", v)
	}
}

func FuzzQuadratic(f *testing.F) {
	f.Add(0.1, 0.2, 0.4, 0.3)
	f.Add(0.5, 0.5, 0.4, 0.3)
	f.Add(1.0, 1e-10, 0.4, 0.3)
	f.Add(1.5, 0.5000001, 0.0, 1.0)
	f.Fuzz(func(t *testing.T, r, z, a, b float64) {
		if !(r >= 0 && z >= 0 && r < 1e6 && a >= 0 && a <= 1 && b >= 0 && b <= 1) {
			t.Skip()
		}
		u1, u2 := 2*math.Sqrt(a)*b, math.Sqrt(a)*(1-2*b)
		flux, dr, dz, du1, du2 := QuadraticGradient(r, z, u1, u2)
		if slack := 1e-14 * math.Max(1, r); !(flux >= -slack && flux <= 1+slack && dr <= 1e-12*math.Max(1, r)) {
			t.Errorf("r = %g, z = %g, u = %g, %g: flux %.17g, dr %g", r, z, u1, u2, flux, dr)
		}
		if math.IsNaN(dz + du1 + du2) {
			t.Errorf("r = %g, z = %g, u = %g, %g: not a number", r, z, u1, u2)
		}
	})
}

func benchmarkGradient(b *testing.B, z float64) {
	sum := 0.0
	for b.Loop() {
		flux, dr, dz, du1, du2 := QuadraticGradient(0.1, z, 0.4, 0.3)
		sum += flux + dr + dz + du1 + du2
	}
	if math.IsNaN(sum) {
		b.Fatal("not a number")
	}
}

func BenchmarkQuadraticGradientInside(b *testing.B)  { benchmarkGradient(b, 0.3) }
func BenchmarkQuadraticGradientLimb(b *testing.B)    { benchmarkGradient(b, 0.97) }
func BenchmarkQuadraticGradientOutside(b *testing.B) { benchmarkGradient(b, 1.3) }
