package orbit

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// TestSkyReference compares places on the sky, separations and all derivatives
// with those of 60-digit arithmetic. Allowed is what times that are off by a few
// roundings would do.
func TestSkyReference(t *testing.T) {
	names := []string{"z", "X", "Y", "Z", "zP", "zT", "zA", "zI", "zE", "zW", "zH", "zK"}
	all := func(p *Path, since, elapsed float64) (v [12]float64) {
		var grad [6]float64
		v[0], _, grad = p.SeparationGradient(since, elapsed)
		copy(v[4:], grad[:])
		v[1], v[2], v[3] = p.Sky(since)
		_, _, grad = p.VectorGradient(since, elapsed)
		copy(v[10:], grad[4:])
		return v
	}
	var worst [12]float64
	for line, row := range readTable(t, "geometry/sky_gradient.csv") {
		get := func(name string) float64 { return number(t, row[name]) }
		o := Orbit{Period: get("period"), MidTransit: get("midTransit"), AxisRatio: get("axisRatio"), Inclination: get("inclination"),
			Eccentricity: get("eccentricity"), Periastron: get("periastron"), StarRadius: get("starRadius")}
		if err := o.Validate(); err != nil {
			t.Fatal(err)
		}
		p := o.Path()
		since, elapsed := p.Fold(get("time"))
		got := all(p, since, elapsed)
		if again, front := p.Separation(since); math.Abs(again-got[0]) > 4e-16*got[0] || front != (got[3] > 0) {
			t.Errorf("line %d: z = %.17g, but %.17g with the gradient", line+2, again, got[0])
		}
		const roundings = 4 * 0x1p-52
		late := roundings * (math.Abs(since) + math.Abs(elapsed-since)*0x1p-2)
		before, after := all(p, since-late, elapsed-late), all(p, since+late, elapsed+late)
		for i, name := range names {
			want := get(name)
			allowed := math.Abs(after[i]-want) + math.Abs(before[i]-want)
			relative := 1e-10
			if i < 4 {
				relative = 4e-16
				allowed += 4e-16 * o.AxisRatio * math.Min(1, math.Abs(got[i])) // of sine and cosine of the inclination
			}
			if name == "Y" || name == "zI" { // cos i near 90° is that of the number in the table
				allowed += 2e-16 * o.AxisRatio
			}
			d := math.Abs(got[i] - want)
			if d > allowed {
				worst[i] = max(worst[i], (d-allowed)/math.Abs(want))
			}
			if !(d <= allowed+relative*math.Abs(want)) {
				t.Errorf("line %d: %s is %.17g, expected %.17g, e = %g, z = %g", line+2, name, got[i], want, o.Eccentricity, got[0])
			}
		}
	}
	t.Logf("largest errors beyond that of the time: %.2g", worst)
}

// complexSeparation is the separation as written in textbooks, by way of the true
// anomaly, for parameters (period, mid-transit, axis ratio, inclination,
// e cos ω, e sin ω) with a small imaginary part.
func complexSeparation(t float64, v [6]complex128) complex128 {
	h, k := v[4], v[5]
	e2 := h*h + k*k
	minor := cmplx.Sqrt(1 - e2)
	// F = E + ω at conjunction, where u = 0, from its real value by Newton's method.
	e, w := cmplx.Abs(complex(real(h), real(k))), math.Atan2(real(k), real(h))
	f0 := complex(w+math.Atan2(real(minor)*math.Cos(w), e+math.Sin(w)), 0)
	beta := 1 / (1 + minor)
	for range 5 {
		sin, cos := cmplx.Sin(f0), cmplx.Cos(f0)
		f0 += ((1-beta*k*k)*cos + beta*h*k*sin - h) / ((1-beta*k*k)*sin - beta*h*k*cos)
	}
	longitude := f0 - h*cmplx.Sin(f0) + k*cmplx.Cos(f0) + complex(2*math.Pi, 0)*(complex(t, 0)-v[1])/v[0]
	f := longitude
	for range 100 {
		step := (f - h*cmplx.Sin(f) + k*cmplx.Cos(f) - longitude) / (1 - h*cmplx.Cos(f) - k*cmplx.Sin(f))
		if size := cmplx.Abs(step); size > 0.5 {
			step *= complex(0.5/size, 0)
		}
		f -= step
	}
	sin, cos := cmplx.Sin(f), cmplx.Cos(f)
	x := v[2] * ((1-beta*k*k)*cos + beta*h*k*sin - h)
	y := v[2] * ((1-beta*h*h)*sin + beta*h*k*cos - k) * cmplx.Cos(v[3])
	return cmplx.Sqrt(x*x + y*y)
}

// TestGradientComplexStep compares derivatives with those of complex steps on
// many orbits. The textbook form cancels near conjunction, to 1e-16 of the
// terms.
func TestGradientComplexStep(t *testing.T) {
	rng := rand.New(rand.NewPCG(41, 42))
	worst := 0.0
	for n := range 3000 {
		o := randomTransit(rng, 0.1)
		o.Eccentricity = math.Min(o.Eccentricity, 0.8)
		if n%10 == 0 {
			o.Eccentricity = math.Pow(10, -15*rng.Float64())
		}
		if n%7 == 0 {
			o.Periastron = math.Pi / 2 * float64(rng.IntN(9)-4)
		}
		since := 0.5 * (rng.Float64() - 0.5) * o.Period
		if n%2 == 0 {
			since = 0.6 * (rng.Float64() - 0.5) * o.Period / o.AxisRatio
		}
		at := o.MidTransit + since
		p := o.Path()
		since, elapsed := p.Fold(at)
		z, _, grad := p.VectorGradient(since, elapsed)
		const step = 1e-100
		parameters := [6]complex128{complex(o.Period, 0), complex(o.MidTransit, 0), complex(o.AxisRatio, 0), complex(o.Inclination, 0), complex(p.h, 0), complex(p.k, 0)}
		for j := range grad {
			moved := parameters
			moved[j] += complex(0, step)
			got := complexSeparation(at, moved)
			want := imag(got) / step
			scale := []float64{math.Abs(grad[1]), math.Abs(grad[1]), 1, o.AxisRatio, o.AxisRatio, o.AxisRatio}[j]
			// Rounding of the textbook form, and where z comes from places 1e-16 a off.
			rounding := 1e-15 * o.AxisRatio / (1 - o.Eccentricity) / (1 - o.Eccentricity)
			allowed := 1e-10*math.Abs(want) + 4*scale*rounding*(1+1/z)
			worst = max(worst, math.Abs(grad[j]-want)/allowed)
			if !(math.Abs(grad[j]-want) <= allowed) || math.Abs(real(got)-z) > 4*rounding*o.AxisRatio {
				t.Errorf("%+v, t = %g, z = %g (%g): derivative %d is %.15g, by a complex step %.15g", o, at, z, real(got), j, grad[j], want)
			}
		}
	}
	t.Logf("largest difference %.2g of what is allowed", worst)
}

// TestGradientNowhereNaN asks for derivatives in corners of the domain.
func TestGradientNowhereNaN(t *testing.T) {
	for _, e := range []float64{0, 5e-324, 1e-300, 1e-16, 1e-8, 0.5, 0.999} {
		for _, w := range []float64{0, math.Pi / 2, -math.Pi / 2, math.Pi, -math.Pi, 1.5 * math.Pi, 1e15, -1e300} {
			for _, i := range []float64{0, 1e-300, 1, math.Pi / 2, math.Pi} {
				for _, a := range []float64{1.0000001 / (1 - e), 10 / (1 - e), 1e12} {
					for _, radius := range []float64{0, 1e-3} {
						o := Orbit{Period: 7, MidTransit: 0, AxisRatio: a, Inclination: i, Eccentricity: e, Periastron: w, StarRadius: radius}
						if o.Validate() != nil {
							continue
						}
						for _, at := range []float64{0, 5e-324, 1e-300, 1e-9, -1e-3, 1.75, 3.5, -3.5, 1e6} {
							p := o.Path()
							since, elapsed := p.Fold(at)
							z, _, grad := p.SeparationGradient(since, elapsed)
							sum := z
							for _, g := range grad {
								sum += g
							}
							if math.IsNaN(sum) || math.IsInf(sum, 0) || z < 0 || z > a*(1+e)*(1+1e-12) {
								t.Errorf("%+v, t = %g: z = %g, %v", o, at, z, grad)
							}
						}
					}
				}
			}
		}
	}
}
