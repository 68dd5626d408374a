package transit

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
)

// quadratic is a quadratic law.
func quadratic(u1, u2 float64) limb.Law {
	return limb.Law{Name: limb.Quadratic, Coefficients: []float64{u1, u2}}
}

// scenes are the orbits, radius ratios and limb darkening of the check values.
func scenes() map[string]Params {
	deg := math.Pi / 180
	return map[string]Params{
		"A": {Orbit: orbit.Orbit{Period: 3, AxisRatio: 8, Inclination: 87 * deg, Periastron: 90 * deg}, RadiusRatio: 0.1, Law: quadratic(0.4, 0.3)},
		"B": {Orbit: orbit.Orbit{Period: 10, AxisRatio: 20, Inclination: 89.25 * deg, Eccentricity: 0.3, Periastron: 60 * deg}, RadiusRatio: 0.08, Law: quadratic(0.35, 0.2)},
		"C": {Orbit: orbit.Orbit{Period: 1.5, AxisRatio: 3.5, Inclination: 75.5 * deg, Periastron: 90 * deg}, RadiusRatio: 0.15, Law: quadratic(0.5, 0.1)},
		"D": {Orbit: orbit.Orbit{Period: 50, AxisRatio: 60, Inclination: 89.5 * deg, Eccentricity: 0.7, Periastron: 240 * deg}, RadiusRatio: 0.05, Law: quadratic(0.2, 0.4)},
		"E": {Orbit: orbit.Orbit{Period: 4, AxisRatio: 10, Inclination: 84.75 * deg, Eccentricity: 0.1}, RadiusRatio: 0.125, Law: quadratic(0.3, 0.3)},
	}
}

func TestCurveTable(t *testing.T) {
	worst := 0.0
	for _, row := range table(t, "geometry/lightcurve_orbit.csv") {
		at, want := number(t, row["t_minus_conjunction_d"]), number(t, row["flux_quadratic"])
		flux, err := Curve([]float64{at}, scenes()[row["orbit"]])
		if err != nil {
			t.Fatal(err)
		}
		worst = max(worst, math.Abs(flux[0]-want))
		// Rounding of the separation on an orbit of 60 stellar radii.
		if math.Abs(flux[0]-want) > 2e-14 {
			t.Errorf("orbit %s, t = %g: flux %.17g, want %s", row["orbit"], at, flux[0], row["flux_quadratic"])
		}
	}
	t.Logf("largest error %.1e", worst)
}

func TestExposureTable(t *testing.T) {
	worst := 0.0
	for _, row := range table(t, "geometry/lightcurve_exposure.csv") {
		p := scenes()[row["orbit"]]
		p.Exposure = secondsPerDay * number(t, row["t_exp_d"])
		at, want := number(t, row["t_mid_d"]), number(t, row["mean_flux_over_exposure"])
		flux, err := Curve([]float64{at}, p)
		if err != nil {
			t.Fatal(err)
		}
		worst = max(worst, math.Abs(flux[0]-want))
		if math.Abs(flux[0]-want) > 1e-8 { // the stated error
			t.Errorf("orbit %s, t = %g: flux %.12g, want %s", row["orbit"], at, flux[0], row["mean_flux_over_exposure"])
		}
	}
	t.Logf("largest error %.1e", worst)
}

// randomParams draws a transiting planet.
func randomParams(random *rand.Rand) Params {
	e := 0.0
	if random.Float64() < 0.7 {
		e = 0.8 * random.Float64()
	}
	r := 0.02 + 0.2*random.Float64()
	a := (1.2 + r + 12*random.Float64()*random.Float64()) / (1 - e)
	w := 6 * random.Float64()
	b := (1 + r) * random.Float64()
	q1, q2 := random.Float64(), random.Float64()
	return Params{
		Orbit: orbit.Orbit{
			Period: math.Exp(4 * random.Float64()), MidTransit: random.Float64(), AxisRatio: a,
			Inclination: math.Acos(math.Min(1, b*(1+e*math.Sin(w))/(a*(1-e*e)))), Eccentricity: e, Periastron: w,
		},
		RadiusRatio: r, Law: quadratic(2*math.Sqrt(q1)*q2, math.Sqrt(q1)*(1-2*q2)),
	}
}

// shifted returns p with an argument, counted as in CurveGradient, increased.
func (p Params) shifted(argument int, step float64) Params {
	o := &p.Orbit
	p.Law.Coefficients = slices.Clone(p.Law.Coefficients)
	*[]*float64{&o.Period, &o.MidTransit, &o.AxisRatio, &o.Inclination, &o.Eccentricity, &o.Periastron, &p.RadiusRatio, &p.Law.Coefficients[0], &p.Law.Coefficients[1], &p.Companion}[argument] += step
	return p
}

// TestCurveIsQuadratic holds the curve against the two functions it is made of,
// at times all around the orbit: the fast ways out must not change anything.
func TestCurveIsQuadratic(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 1))
	for range 300 {
		p := randomParams(random)
		times := make([]float64, 300)
		for i := range times {
			times[i] = p.Orbit.MidTransit + p.Orbit.Period*(6*random.Float64()-3)
			if i%2 == 0 {
				times[i] = p.Orbit.MidTransit + 0.1*p.Orbit.Period*(random.Float64()-0.5)
			}
		}
		flux, err := Curve(times, p)
		if err != nil {
			t.Fatal(err)
		}
		with, grad, err := CurveGradient(times, p)
		if err != nil {
			t.Fatal(err)
		}
		for i, at := range times {
			z, front, byOrbit := p.Orbit.SeparationGradient(at)
			want := [11]float64{1}
			if front {
				f, dr, dz, du1, du2 := QuadraticGradient(p.RadiusRatio, z, p.Law.Coefficients[0], p.Law.Coefficients[1])
				want = [11]float64{f, dz * byOrbit[0], dz * byOrbit[1], dz * byOrbit[2], dz * byOrbit[3], dz * byOrbit[4], dz * byOrbit[5], dr, du1, du2, 1 - f}
			}
			if flux[i] != want[0] || with[i] != want[0] {
				t.Fatalf("%+v, t = %g: flux %.17g and %.17g, want %.17g", p, at, flux[i], with[i], want[0])
			}
			for k := range grad {
				if got := grad[k][i]; got != want[k+1] && !(k == 9 && math.Abs(got-want[10]) < 1e-15) {
					t.Fatalf("%+v, t = %g: derivative %d is %.17g, want %.17g", p, at, k, grad[k][i], want[k+1])
				}
			}
		}
	}
}

// TestCurveAnyOrder holds a curve in the order of time, which passes over what is
// out of transit, against the same times in another order.
func TestCurveAnyOrder(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 4))
	for k := range 60 {
		p := randomParams(random)
		p.Orbit.MidTransit += 2460000
		if k%2 == 1 {
			p.Exposure = 0.01 * p.Orbit.Period * secondsPerDay
		}
		times := make([]float64, 400)
		for i := range times {
			times[i] = p.Orbit.MidTransit + p.Orbit.Period*(7*random.Float64()-3)
		}
		mixed, err := Curve(times, p)
		if err != nil {
			t.Fatal(err)
		}
		byTime := map[float64]float64{}
		for i, at := range times {
			byTime[at] = mixed[i]
		}
		slices.Sort(times)
		sorted, err := Curve(times, p)
		if err != nil {
			t.Fatal(err)
		}
		for i, at := range times {
			if sorted[i] != byTime[at] {
				t.Fatalf("%+v, t = %.9g: %.17g in order, %.17g out of it", p, at, sorted[i], byTime[at])
			}
		}
	}
}

// TestCurveGradientDifferences compares averaged derivatives with differences of
// averaged fluxes.
func TestCurveGradientDifferences(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 2))
	for range 60 {
		p := randomParams(random)
		p.Orbit.Eccentricity *= 0.5
		p.RadiusRatio += 0.05
		p.Companion = 0.1
		if p.Orbit.Eccentricity < 0.01 {
			p.Orbit.Eccentricity = 0.1
		}
		if p.Validate() != nil {
			continue
		}
		t14, _ := p.Orbit.Duration(p.RadiusRatio)
		if t14 == 0 || p.Orbit.ImpactParameter() > 0.8-p.RadiusRatio || p.Orbit.ImpactParameter() < 0.01 {
			continue // differences across a grazing contact say little
		}
		p.Exposure = secondsPerDay * t14 / 30
		times := make([]float64, 40)
		for i := range times {
			times[i] = p.Orbit.MidTransit + 2*p.Orbit.Period + t14*1.3*(float64(i)/39-0.5)
		}
		_, grad, err := CurveGradient(times, p)
		if err != nil {
			t.Fatal(err)
		}
		for k := range grad {
			const step = 3e-6
			above, err := Curve(times, p.shifted(k, step))
			if err != nil {
				t.Fatal(err)
			}
			below, err := Curve(times, p.shifted(k, -step))
			if err != nil {
				t.Fatal(err)
			}
			largest := 0.0
			for i := range times {
				largest = max(largest, math.Abs(grad[k][i]))
			}
			for i := range times {
				want := (above[i] - below[i]) / (2 * step)
				// The quadrature error of the differences, and their third
				// derivatives, which averaging leaves finite.
				if math.Abs(grad[k][i]-want) > 2e-3*largest+1e-5 {
					t.Errorf("%+v, t = %g: derivative %d is %.8g, differences give %.8g (largest %.3g)", p, times[i], k, grad[k][i], want, largest)
				}
			}
		}
	}
}

// TestExposureRandom holds averages, and their derivatives by radius ratio and
// limb darkening, against many instantaneous values in their place: exposures
// short and long, up to several times the transit.
func TestExposureRandom(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 3))
	worst, worstSlope := 0.0, 0.0
	for range 50 {
		p := randomParams(random)
		t14, _ := p.Orbit.Duration(p.RadiusRatio)
		if t14 == 0 {
			continue
		}
		exposure := math.Min(t14*math.Exp(6*random.Float64()-5), 0.45*p.Orbit.Period)
		times := make([]float64, 12)
		for i := range times {
			times[i] = p.Orbit.MidTransit + (t14+exposure)*1.1*(random.Float64()-0.5)
		}
		long := p
		long.Exposure = exposure * secondsPerDay
		mean, grad, err := CurveGradient(times, long)
		if err != nil {
			t.Fatal(err)
		}
		for i, at := range times {
			const n = 4000
			dense := make([]float64, n)
			for k := range dense {
				dense[k] = at + exposure*((float64(k)+0.5)/n-0.5)
			}
			flux, slopes, err := CurveGradient(dense, p)
			if err != nil {
				t.Fatal(err)
			}
			var want, wantSlope [3]float64
			for k := range dense {
				want[0] += flux[k] / n
				for j := range wantSlope {
					wantSlope[j] += slopes[6+j][k] / n
				}
			}
			// The midpoint rule errs by about the depth over n^1.5 at a contact.
			worst = max(worst, math.Abs(mean[i]-want[0]))
			if math.Abs(mean[i]-want[0]) > 1e-7 {
				t.Errorf("%+v, t = %g: mean flux %.12g, want %.12g", long, at, mean[i], want[0])
			}
			for j := range wantSlope {
				worstSlope = max(worstSlope, math.Abs(grad[6+j][i]-wantSlope[j]))
				if math.Abs(grad[6+j][i]-wantSlope[j]) > 1e-5 {
					t.Errorf("%+v, t = %g: derivative %d is %.10g, want %.10g", long, at, 6+j, grad[6+j][i], wantSlope[j])
				}
			}
		}
	}
	t.Logf("largest difference: flux %.1e, derivatives %.1e", worst, worstSlope)
}

// TestLongExposure averages over an exposure that reaches two transits.
func TestLongExposure(t *testing.T) {
	p := scenes()["A"]
	p.Orbit.AxisRatio = 1.3
	p.Orbit.Inclination = math.Pi / 2
	p.Exposure = 0.49 * 3 * secondsPerDay
	times := []float64{0, 1.5, 0.7, -0.7, 2.3, 30.7}
	mean, err := Curve(times, p)
	if err != nil {
		t.Fatal(err)
	}
	p.Exposure = 0
	for i, at := range times {
		const n = 20000
		dense := make([]float64, n)
		for k := range dense {
			dense[k] = at + 0.49*3*((float64(k)+0.5)/n-0.5)
		}
		flux, err := Curve(dense, p)
		if err != nil {
			t.Fatal(err)
		}
		want := 0.0
		for _, f := range flux {
			want += f / n
		}
		if math.Abs(mean[i]-want) > 1e-7 {
			t.Errorf("t = %g: mean flux %.10g, want %.10g", at, mean[i], want)
		}
	}
}

func TestCurveRefuses(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for want, change := range map[string]func(p *Params){
		"Period":             func(p *Params) { p.Orbit.Period = -1 },
		"RadiusRatio is -":   func(p *Params) { p.RadiusRatio = -0.1 },
		"RadiusRatio is NaN": func(p *Params) { p.RadiusRatio = nan },
		"RadiusRatio is +":   func(p *Params) { p.RadiusRatio = inf },
		"flux of":            func(p *Params) { p.Law = quadratic(3, 0) },
		"u1 of":              func(p *Params) { p.Law = quadratic(nan, 0.1) },
		"u2 of":              func(p *Params) { p.Law = quadratic(0.1, inf) },
		"no limb":            func(p *Params) { p.Law.Name = "quadric" },
		"Companion is -1":    func(p *Params) { p.Companion = -1 },
		"tolerance is 1e-13": func(p *Params) { p.Tolerance = 1e-13 },
		"Exposure is -":      func(p *Params) { p.Exposure = -1 },
		"Exposure is 1e+06":  func(p *Params) { p.Exposure = 1e6 },
		"Exposure is NaN":    func(p *Params) { p.Exposure = nan },
		"times[1]":           func(*Params) {},
	} {
		p := scenes()["A"]
		change(&p)
		times := []float64{0, 1}
		if want == "times[1]" {
			times[1] = nan
		}
		flux, err := Curve(times, p)
		if flux != nil || err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: flux %v, error %v", want, flux, err)
		}
		if _, grad, err := CurveGradient(times, p); grad != nil || err == nil {
			t.Errorf("%s: gradient %v, error %v", want, grad, err)
		}
	}
	if flux, grad, err := CurveGradient(nil, scenes()["A"]); err != nil || len(flux) != 0 || len(grad) != len(scenes()["A"].Arguments()) {
		t.Errorf("no times: %v, %v, %v", flux, grad, err)
	}
}

func benchmarkCurve(b *testing.B, exposure float64) {
	p := scenes()["A"]
	p.Exposure = exposure
	times := make([]float64, 6000)
	for i := range times {
		times[i] = 0.3 * (float64(i)/6000 - 0.5) // 40 % in transit
	}
	for b.Loop() {
		if _, _, err := CurveGradient(times, p); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkCurveGradient6000(b *testing.B)         { benchmarkCurve(b, 0) }
func BenchmarkCurveGradient6000Exposure(b *testing.B) { benchmarkCurve(b, 8) }
