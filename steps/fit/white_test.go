package fit

import (
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/transit"
)

// quiet replaces the noise of a scene's first channel by none and returns it as
// a curve with small errors.
func quiet(t testing.TB, s scene, radius, u1, u2 float64) lightcurve.Curve {
	t.Helper()
	c := lightcurve.Curves(s.cube)[0]
	flux, err := transit.Curve(c.Time, transit.Params{Orbit: s.orbit, RadiusRatio: radius, Law: quadratic(u1, u2)})
	if err != nil {
		t.Fatal(err)
	}
	for i, f := range flux {
		age := c.Time[i] - c.Time[0]
		c.Flux[i] = 2000 * f * (1 + 0.002*math.Exp(-age/0.015) - 0.001*age + 0.01*(c.Aux[0].Value[i]-12))
		c.Err[i] = 2000 * 1e-5
	}
	return c
}

func value(t testing.TB, p Posterior, name string) (v, e float64) {
	t.Helper()
	for k, n := range p.Names {
		if n == name {
			return p.Value[k], p.Err[k]
		}
	}
	for _, q := range p.Derived {
		if q.Name == name {
			return q.Value, q.Err
		}
	}
	t.Fatalf("posterior has no %s: %v", name, p.Names)
	return 0, 0
}

// TestWhiteRecoversTruth fits noise-free data from starts that are off, in every
// parameterisation.
func TestWhiteRecoversTruth(t *testing.T) {
	s := newScene(t, 5, 700, 1)
	curve := quiet(t, s, 0.115, 0.35, 0.2)
	base := Priors{uniform("midTransitOffset", -0.03, 0.03), uniform("axisRatio", 3, 30), uniform("radiusRatio", 0.02, 0.3),
		uniform("settlingTime", 0.001, 0.1)}
	for _, more := range []Priors{
		{uniform("inclination", 75, 90), uniform("u1", -1, 2), uniform("u2", -1, 2)},
		{uniform("impact", 0, 1), uniform("q1", 0, 1), uniform("q2", 0, 1)},
	} {
		model := s.model()
		model.Inclination, model.AxisRatio = 89.9, 11
		p, fitted, err := White(curve, withWhite(model, append(more, base...)))
		if err != nil {
			t.Fatal(err)
		}
		if p.Status != statusConverged || p.Chi2 > 1e-4 {
			t.Errorf("chi-square %g of noise-free data (%s)", p.Chi2, p.Status)
		}
		for _, c := range []struct {
			name      string
			want, tol float64
		}{
			{"midTransit", s.orbit.MidTransit, 2e-9}, {"axisRatio", 9.4, 1e-4}, {"inclination", 87.3, 1e-4}, {"impact", s.orbit.ImpactParameter(), 1e-5},
			{"radiusRatio", 0.115, 1e-6}, {"depth", 0.115 * 0.115, 1e-7}, {"settlingTime", 0.015, 1e-5},
		} {
			if got, e := value(t, p, c.name); math.Abs(got-c.want) > c.tol || !(e > 0) {
				t.Errorf("%s = %.9g +- %g, want %.9g", c.name, got, e, c.want)
			}
		}
		for i := range fitted.Flux {
			if r := fitted.Flux[i] - fitted.Transit[i]*fitted.Trend[i]; math.Abs(r) > 1e-8 {
				t.Fatalf("residual %g at %d", r, i)
			}
		}
		if math.Abs(fitted.Mid-s.orbit.MidTransit) > 2e-9 {
			t.Errorf("mid-transit %.9f", fitted.Mid)
		}
	}
}

// TestWhiteCentralTransit has its truth at the end of the inclination's range,
// where the light curve does not change with it.
func TestWhiteCentralTransit(t *testing.T) {
	s := newScene(t, 6, 700, 1)
	s.orbit.Inclination = math.Pi / 2
	curve := quiet(t, s, 0.115, 0.35, 0.2)
	for i := range curve.Flux { // some noise, so that errors mean something
		curve.Flux[i] *= 1 + 1e-5*math.Sin(float64(i*i))
	}
	model := s.model()
	model.Inclination = 90
	p, _, err := White(curve, withWhite(model, whitePriors()))
	if err != nil {
		t.Fatal(err)
	}
	incl, e := value(t, p, "inclination")
	if p.Status != statusConverged || math.Abs(incl-90) > 3*e || !(e > 0 && e < 2) {
		t.Errorf("inclination %g +- %g (%s)", incl, e, p.Status)
	}
	if k, e := value(t, p, "radiusRatio"); math.Abs(k-0.115) > 4*e || e > 1e-3 {
		t.Errorf("radius ratio %g +- %g", k, e)
	}
}

// TestWhiteErrorsAreHonest compares deviations from the truth with quoted errors
// over several noise realisations.
func TestWhiteErrorsAreHonest(t *testing.T) {
	sum, count := map[string]float64{}, 12
	names := []string{"axisRatio", "inclination", "impact", "duration", "radiusRatio", "midTransit", "stellarDensity"}
	for seed := range count {
		s := newScene(t, uint64(seed+100), 300, 1)
		curve := quiet(t, s, 0.115, 0.35, 0.2)
		rng := rand.New(rand.NewPCG(uint64(seed), 3))
		for i := range curve.Flux {
			curve.Flux[i] += 2000 * 6e-5 * rng.NormFloat64()
			curve.Err[i] = 2000 * 6e-5
		}
		p, _, err := White(curve, withWhite(s.model(), whitePriors()))
		if err != nil {
			t.Fatal(err)
		}
		t14, _ := s.orbit.Duration(0.115)
		truth := map[string]float64{"axisRatio": 9.4, "inclination": 87.3, "impact": s.orbit.ImpactParameter(), "duration": 24 * t14,
			"radiusRatio": 0.115, "midTransit": s.orbit.MidTransit}
		density, _ := value(t, p, "stellarDensity")
		a, _ := value(t, p, "axisRatio")
		truth["stellarDensity"] = density * math.Pow(9.4/a, 3)
		for _, name := range names {
			got, e := value(t, p, name)
			sum[name] += math.Pow((got-truth[name])/e, 2)
		}
	}
	for _, name := range names {
		// Chi-square of 12 degrees of freedom: outside [3, 29] with probability 0.01; the fits are not quite linear.
		if c := sum[name]; c < 2.5 || c > 33 {
			t.Errorf("%s: sum of squared pulls %.1f for %d fits", name, c, count)
		}
	}
}

func TestWhiteHoldsWhatPriorsDoNotName(t *testing.T) {
	s := newScene(t, 7, 400, 1)
	curve := quiet(t, s, 0.115, 0.35, 0.2)
	model := s.model()
	p, _, err := White(curve, withWhite(model, Priors{uniform("midTransitOffset", -0.03, 0.03), uniform("radiusRatio", 0.02, 0.3),
		{Name: "axisRatio", Kind: Fixed, A: 9.4}, {Name: "u1", Kind: Fixed, A: 0.35}, uniform("u2", -1, 2)}))
	if err != nil {
		t.Fatal(err)
	}
	want := []string{"midTransitOffset", "radiusRatio", "u2", "trend.constant", "trend.time", "trend.settling", "trend.X", "trend.Y"}
	if !reflect.DeepEqual(p.Names, want) {
		t.Errorf("names %v, want %v", p.Names, want)
	}
	heldAt := map[string]float64{}
	for _, h := range p.Held {
		heldAt[h.Name] = h.A
	}
	if heldAt["axisRatio"] != 9.4 || math.Abs(heldAt["inclination"]-87.6) > 1e-9 || heldAt["u1"] != 0.35 || heldAt["settlingTime"] != 0.02 || len(heldAt) != 7 {
		t.Errorf("held %v", heldAt)
	}
}

func TestWhiteInflate(t *testing.T) {
	s := newScene(t, 8, 400, 1)
	curve := lightcurve.Curves(s.cube)[0]
	for i := range curve.Err {
		curve.Err[i] /= 2
	}
	priors := Priors{uniform("radiusRatio", 0.02, 0.3), uniform("u1", -1, 2), uniform("u2", -1, 2)}
	model := s.model()
	model.AxisRatio, model.Inclination, model.MidTransit = 9.4, 87.3, s.orbit.MidTransit
	plain, fitted, err := White(curve, withWhite(model, priors))
	if err != nil {
		t.Fatal(err)
	}
	model.Inflate = true
	inflated, wide, err := White(curve, withWhite(model, priors))
	if err != nil {
		t.Fatal(err)
	}
	ratio := math.Sqrt(plain.Chi2 / float64(plain.Dof))
	if math.Abs(ratio-2) > 0.2 || math.Abs(inflated.Err[0]/plain.Err[0]/ratio-1) > 1e-6 || math.Abs(wide.Err[5]/fitted.Err[5]/ratio-1) > 1e-6 {
		t.Errorf("ratio %g, errors %g and %g, of samples %g and %g", ratio, plain.Err[0], inflated.Err[0], fitted.Err[5], wide.Err[5])
	}
	if math.Abs(inflated.Chi2/plain.Chi2-1) > 1e-6 {
		t.Errorf("chi-square %g became %g", plain.Chi2, inflated.Chi2)
	}
}

func TestWhiteErrors(t *testing.T) {
	s := newScene(t, 9, 200, 1)
	curve := lightcurve.Curves(s.cube)[0]
	short := curve
	short.Mask = make([]lightcurve.Flag, len(curve.Mask))
	for i := 40; i < len(short.Mask); i++ {
		short.Mask[i] = lightcurve.Excluded
	}
	ragged := curve
	ragged.Err = curve.Err[:10]
	for _, c := range []struct {
		name   string
		curve  lightcurve.Curve
		change func(*Model)
		priors Priors
		want   string
	}{
		{"period", curve, func(s *Model) { s.Period = 0 }, nil, "white fit: period is 0; expected days above 0"},
		{"NaN", curve, func(s *Model) { s.MidTransit = math.NaN() }, nil, "midTransit is NaN"},
		{"law", curve, func(s *Model) { s.LimbLaw = "cubic" }, nil, `law "cubic"; expected one of uniform, linear, quadratic, square-root, logarithmic, power-2`},
		{"policy", curve, func(s *Model) { s.LimbPolicy = "loose" }, nil, `policy "loose"; expected free, fixed or prior`},
		{"no limb rows", curve, func(*Model) {}, Priors{uniform("radiusRatio", 0, 1)}, "no rows for it; add u1 and u2"},
		{"no table", curve, func(s *Model) { s.LimbPolicy = PolicyFixed }, nil, "no limb-darkening table; give the input limb"},
		{"regressor", curve, func(s *Model) { s.Trend.Regressors = []string{"Z"} }, whitePriors(), "no auxiliary column Z"},
		{"linear law", curve, func(s *Model) { s.LimbLaw = LawLinear }, Priors{uniform("q1", 0, 1)}, "q1 belongs to a law of two coefficients"},
		{"few samples", short, func(*Model) {}, whitePriors(), "40 usable samples of 200"},
		{"ragged", ragged, func(*Model) {}, whitePriors(), "10 errors"},
	} {
		model := s.model()
		c.change(&model)
		_, _, err := White(c.curve, withWhite(model, c.priors))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q", c.name, err, c.want)
		}
	}
}

func TestWhiteIsReproducible(t *testing.T) {
	s := newScene(t, 10, 300, 2)
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	before := lightcurve.Curve{Flux: append([]float64(nil), curve.Flux...)}
	a, fa, err := White(curve, withWhite(s.model(), whitePriors()))
	if err != nil {
		t.Fatal(err)
	}
	b, fb, err := White(curve, withWhite(s.model(), whitePriors()))
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(a, b) || !reflect.DeepEqual(fa, fb) {
		t.Error("two fits of the same data differ")
	}
	if !reflect.DeepEqual(before.Flux, curve.Flux) {
		t.Error("the input was modified")
	}
}

// BenchmarkWhite fits 6000 samples: with nine free parameters, which are time,
// shape and depth of the transit, its limb darkening, and a constant, a slope and
// a regressor; and with twelve, a settling detector and another regressor more.
func BenchmarkWhite(b *testing.B) {
	s := newScene(b, 27, 6000, 1)
	curve := lightcurve.Curves(s.cube)[0]
	settling := s.model()
	nine := settling
	nine.Trend.Settling, nine.Trend.Regressors = false, []string{"X"}
	for _, c := range []struct {
		name   string
		model  Model
		priors Priors
	}{
		{"9", nine, whitePriors()[:6]},
		{"12", settling, whitePriors()},
	} {
		b.Run(c.name, func(b *testing.B) {
			for b.Loop() {
				p, _, err := White(curve, withWhite(c.model, c.priors))
				if err != nil || p.Status != statusConverged {
					b.Fatal(p.Status, err)
				}
				if len(p.Names) < 9 {
					b.Fatal(p.Names)
				}
			}
		})
	}
}
