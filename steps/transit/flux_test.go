package transit

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"rimlight/steps/limb"
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

// tabled returns the law of a row.
func tabled(t *testing.T, row map[string]string) limb.Law {
	t.Helper()
	law := limb.Law{Name: row["law"]}
	for _, name := range []string{"u1", "u2", "u3", "u4"} {
		if row[name] != "" {
			law.Coefficients = append(law.Coefficients, number(t, row[name]))
		}
	}
	return law
}

// closedLaw reports whether the flux of a law is a closed expression.
func closedLaw(name string) bool {
	return name == limb.Uniform || name == limb.Linear || name == limb.Quadratic
}

func TestFluxTable(t *testing.T) {
	for _, stated := range []float64{DefaultTolerance, LeastTolerance} {
		worst := map[string]float64{}
		for _, row := range table(t, "transit/flux_cases.csv") {
			r, z, law := number(t, row["r_expr"]), number(t, row["z_expr"]), tabled(t, row)
			want := number(t, row["flux"])
			tolerance := stated
			if closedLaw(law.Name) {
				tolerance = fluxTolerance
			}
			if r > 10 {
				tolerance *= r / 10
			}
			flux, err := Flux(r, []float64{z}, law, stated)
			if err != nil {
				t.Fatal(err)
			}
			diff := math.Abs(flux[0] - want)
			if row["exact"] == "1" && r <= 10 {
				worst[law.Name] = math.Max(worst[law.Name], diff)
			}
			if !(diff <= tolerance) {
				t.Errorf("%s, %s: r = %s, z = %s: flux %.17g, want %s, off by %.1e", row["note"], row["law"], row["r_expr"], row["z_expr"], flux[0], row["flux"], flux[0]-want)
			}
		}
		for name, diff := range worst {
			t.Logf("tolerance %g, %s: largest error %.1e", stated, name, diff)
		}
	}
}

func TestGradientTable(t *testing.T) {
	for _, stated := range []float64{DefaultTolerance, LeastTolerance} {
		worst := map[string]float64{}
		for _, row := range table(t, "transit/flux_derivatives.csv") {
			r, z, law := number(t, row["r"]), number(t, row["z"]), tabled(t, row)
			tolerance := stated
			if closedLaw(law.Name) {
				tolerance = gradientTolerance
			}
			g, err := FluxGradient(r, []float64{z}, law, stated)
			if err != nil {
				t.Fatal(err)
			}
			got := []float64{g.Flux[0], g.ByRadius[0], g.BySeparation[0]}
			for _, by := range g.ByCoefficient {
				got = append(got, by[0])
			}
			for i, got := range got {
				name := []string{"flux", "dr", "dz", "du1", "du2", "du3", "du4"}[i]
				want := number(t, row[name])
				diff := math.Abs(got-want) / math.Max(1, math.Abs(want))
				worst[law.Name] = math.Max(worst[law.Name], diff)
				if !(diff <= tolerance) {
					t.Errorf("%s, r = %g, z = %g: %s is %.17g, want %s", row["law"], r, z, name, got, row[name])
				}
			}
		}
		for name, diff := range worst {
			t.Logf("tolerance %g, %s: largest error %.1e", stated, name, diff)
		}
	}
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

// benchmarkFlux reports the time of one of 4096 separations between two limits.
func benchmarkFlux(b *testing.B, law limb.Law, from, to float64) {
	z := make([]float64, 4096)
	for i := range z {
		z[i] = from + (to-from)*float64(i)/float64(len(z))
	}
	var g Gradient
	for b.Loop() {
		if err := FluxGradientInto(&g, 0.1, z, law, 0); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*len(z)), "ns/sample")
}

func BenchmarkFluxGradient(b *testing.B) {
	for _, law := range []limb.Law{
		quadratic(0.4, 0.3),
		{Name: limb.FourParameter, Coefficients: []float64{0.5, -0.2, 0.6, -0.3}},
		{Name: limb.SquareRoot, Coefficients: []float64{0.2, 0.5}},
		{Name: limb.Logarithmic, Coefficients: []float64{0.6, 0.25}},
		{Name: limb.Power2, Coefficients: []float64{0.75, 0.625}},
	} {
		b.Run(law.Name+"/transit", func(b *testing.B) { benchmarkFlux(b, law, 0.3, 1.1) })
		b.Run(law.Name+"/inside", func(b *testing.B) { benchmarkFlux(b, law, 0.2, 0.85) })
		b.Run(law.Name+"/limb", func(b *testing.B) { benchmarkFlux(b, law, 0.9, 1.1) })
		b.Run(law.Name+"/outside", func(b *testing.B) { benchmarkFlux(b, law, 1.1001, 3) })
	}
}

// TestAllocations holds that a result that is used again costs no memory.
func TestAllocations(t *testing.T) {
	z := []float64{0.1, 0.5, 0.95, 1.3}
	for _, law := range []limb.Law{quadratic(0.4, 0.3), {Name: limb.FourParameter, Coefficients: []float64{0.5, -0.2, 0.6, -0.3}}} {
		var g Gradient
		if n := testing.AllocsPerRun(20, func() {
			if err := FluxGradientInto(&g, 0.1, z, law, 0); err != nil {
				t.Fatal(err)
			}
		}); n != 0 {
			t.Errorf("%s: %g allocations", law.Name, n)
		}
	}
}

// TestHardTable has fluxes and derivatives next to the seams of the domain.
func TestHardTable(t *testing.T) {
	for _, stated := range []float64{DefaultTolerance, LeastTolerance} {
		worst := map[string][2]float64{}
		for _, row := range table(t, "transit/flux_hard.csv") {
			r, z, law := number(t, row["r"]), number(t, row["z"]), tabled(t, row)
			g, err := FluxGradient(r, []float64{z}, law, stated)
			if err != nil {
				t.Fatal(err)
			}
			off := math.Abs(1 - g.Flux[0] - number(t, row["deficit"]))
			columns := map[string]float64{"dr": g.ByRadius[0], "dz": g.BySeparation[0]}
			for k, by := range g.ByCoefficient {
				columns["du"+strconv.Itoa(k+1)] = by[0]
			}
			offBy := 0.0
			for name, got := range columns {
				want := number(t, row[name])
				offBy = max(offBy, math.Abs(got-want)/max(1, math.Abs(want)))
			}
			was := worst[law.Name]
			worst[law.Name] = [2]float64{max(was[0], off), max(was[1], offBy)}
			limit, limitBy := stated, min(stated, 1e-10)
			if closedLaw(law.Name) {
				limit, limitBy = fluxTolerance, gradientTolerance
			}
			if !(off <= limit && offBy <= limitBy) {
				t.Errorf("%s, r = %g, z = %.17g: off by %.1e, derivatives by %.1e", row["law"], r, z, off, offBy)
			}
		}
		for _, name := range limb.Names() {
			t.Logf("tolerance %g, %s: largest error %.1e, of derivatives %.1e", stated, name, worst[name][0], worst[name][1])
		}
	}
}

// TestEdgesOfLaws has laws with coefficients of all sizes at separations of all
// sizes: nothing may come out that is not a number.
func TestEdgesOfLaws(t *testing.T) {
	lengths := []float64{0, 5e-324, 1e-200, 1e-99, 1e-20, 1e-9, 0.25, 0.5, math.Nextafter(1, 0), 1, math.Nextafter(1, 2), 1.5, 3, 1e3, 1e6, 1e17, 1e300, math.MaxFloat64}
	sizes := []float64{0, 0.3, -0.2, 1, -40, 1e30, -1e30, 1e100}
	for _, name := range limb.Names() {
		n, _ := limb.Count(name)
		for k := range 40 {
			law := limb.Law{Name: name}
			for i := range n {
				law.Coefficients = append(law.Coefficients, sizes[(k+3*i*k+i)%len(sizes)])
			}
			if name == limb.Power2 {
				law.Coefficients[1] = []float64{1e-100, 1e-3, 0.2, 3, 50, 1e9, 1e100}[k%7]
			}
			if law.Validate() != nil {
				continue
			}
			for _, r := range lengths {
				separations := append([]float64{r, 1 + r, math.Abs(1 - r), math.Nextafter(r, 0), math.Nextafter(1+r, 0), r + 0.5, r - 0.25, math.Inf(1)}, lengths...)
				separations = slices.DeleteFunc(separations, func(z float64) bool { return z < 0 })
				g, err := FluxGradient(r, separations, law, 0)
				if err != nil {
					t.Fatal(err)
				}
				for i, z := range separations {
					values := []float64{g.Flux[i], g.ByRadius[i], g.BySeparation[i]}
					for _, by := range g.ByCoefficient {
						values = append(values, by[i])
					}
					for _, v := range values {
						if v-v != 0 {
							t.Fatalf("%+v, r = %g, z = %g: %v", law, r, z, values)
						}
					}
					if f := g.Flux[i]; law.Physical() && !(name == limb.Power2 && law.Coefficients[1] > 10) && !(f >= -1e-9 && f <= 1+1e-9) {
						t.Errorf("%+v, r = %g, z = %g: flux %.17g is not within 0 and 1", law, r, z, f)
					}
				}
			}
		}
	}
	for _, z := range []float64{-0.1, math.NaN()} {
		if _, err := Flux(0.1, []float64{0.5, z}, quadratic(0.4, 0.3), 0); err == nil || !strings.Contains(err.Error(), "separations[1]") {
			t.Errorf("separation %g: error %v", z, err)
		}
	}
	for _, r := range []float64{-0.1, math.NaN(), math.Inf(1)} {
		if _, err := Flux(r, []float64{0.5}, quadratic(0.4, 0.3), 0); err == nil || !strings.Contains(err.Error(), "radius ratio") {
			t.Errorf("radius ratio %g: error %v", r, err)
		}
	}
}
