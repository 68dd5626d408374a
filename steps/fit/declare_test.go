package fit

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

func TestEquation(t *testing.T) {
	m := Model{
		Trend:    systematics.Trend{Polynomial: 2, Settling: true, Regressors: []string{"X"}, Added: []string{"sky<"}},
		Function: []string{"hook"}, White: Priors{uniform("radiusRatio", 0, 1), uniform("jitter", 0, 1), {Name: "u1", Kind: Fixed}},
		Channel: Priors{uniform("radiusRatio", 0, 1)},
	}
	e := m.Equation()
	want := []string{"flux = transit(t) × f(t; hook) × (c0 + c1 x + c2 x^2 + s exp(-(t - t0)/settlingTime) + k_X z(X)) + a_sky< z(sky<)", "σ^2 = σ_given^2 + jitter^2"}
	for i, line := range want {
		if i >= len(e.Text) || e.Text[i] != line {
			t.Errorf("%q\nwant %q", e.Text, want)
		}
	}
	where := strings.Join(e.Where, "; ")
	for _, clause := range []string{"quadratic limb darkening", "f is a function of the recipe", "x is time scaled to [-1, 1]", "free are radiusRatio, jitter and", "each channel has its own radiusRatio and"} {
		if !strings.Contains(where, clause) {
			t.Errorf("%q lacks %q", where, clause)
		}
	}
	if math := e.MathML[0]; !strings.Contains(math, "<msub><mi>a</mi><mi>sky&lt;</mi></msub>") || strings.Count(math, "<mrow>") != strings.Count(math, "</mrow>") {
		t.Errorf("MathML %s", math)
	}
	huge := Model{Trend: systematics.Trend{Polynomial: math.MaxInt, Regressors: []string{strings.Repeat("x", 1e6)}}, LimbLaw: strings.Repeat("y", 1e6)}
	if n := len(huge.Equation().String()); n > 2000 {
		t.Errorf("an equation of %d bytes", n)
	}
}

// TestNoiseParameters recovers what was done to the noise, and counts how often
// the errors of that cover it.
func TestNoiseParameters(t *testing.T) {
	const fits = 40
	var scale, jitter float64
	for i := range fits {
		s := newScene(t, 61, 400, 1)
		model := simple(s)
		model.Trend = systematics.Trend{}
		model.White = Priors{uniform("radiusRatio", 0.05, 0.2), {Name: "u1", Kind: Fixed, A: 0.4}, {Name: "u2", Kind: Fixed, A: 0.2},
			{Name: "errorScale", Kind: LogUniform, A: 0.1, B: 10}, uniform("jitter", 0, 0.01)}
		flux, err := transit.Curve(s.cube.Time, transit.Params{Orbit: s.orbit, RadiusRatio: 0.11, Law: quadratic(0.4, 0.2)})
		if err != nil {
			t.Fatal(err)
		}
		rng := rand.New(rand.NewPCG(61, uint64(i)))
		c := lightcurve.Curve{Time: s.cube.Time, Flux: flux, Err: make([]float64, 400), Mask: make([]lightcurve.Flag, 400)}
		for k := range flux {
			c.Err[k] = 2e-4
			if k%2 == 0 {
				c.Err[k] = 1e-3
			}
			flux[k] += math.Hypot(1.3*c.Err[k], 5e-4) * rng.NormFloat64()
		}
		p, fitted, err := White(c, model)
		if err != nil {
			t.Fatal(err)
		}
		if n := len(p.Names); p.Names[n-2] != "errorScale" || p.Names[n-1] != "jitter" || p.Status != statusConverged {
			t.Fatalf("names %v, %s", p.Names, p.Status)
		}
		got, e := value(t, p, "errorScale")
		scale += math.Pow((got-1.3)/e, 2) / fits
		got, e = value(t, p, "jitter")
		jitter += math.Pow((got-5e-4)/e, 2) / fits
		want := math.Hypot(p.Value[len(p.Names)-2]*c.Err[0], got) / p.Value[1]
		if math.Abs(fitted.Err[0]/want-1) > 1e-3 {
			t.Fatalf("error %g of the curve fit, want %g", fitted.Err[0], want)
		}
	}
	// Chi-square of 40 over 40: outside [0.5, 1.8] with a chance of 0.002.
	if scale < 0.5 || scale > 1.8 || jitter < 0.5 || jitter > 1.8 {
		t.Errorf("mean squared pulls of errorScale %.2f and jitter %.2f", scale, jitter)
	}
}

// TestBases fits the same curve in every description of the orbit, which must not
// change the minimum or the depth; with a diluting companion and an added term.
func TestBases(t *testing.T) {
	s := newScene(t, 62, 500, 1)
	curve := lightcurve.Curves(s.cube)[0]
	p := transit.Params{Orbit: s.orbit, RadiusRatio: 0.11, Law: quadratic(0.4, 0.2), Companion: 0.1}
	flux, err := transit.Curve(curve.Time, p)
	if err != nil {
		t.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(62, 1))
	for i := range flux {
		curve.Flux[i] = 500 * (flux[i]*(1+0.01*(curve.Aux[0].Value[i]-12)) + 0.02*(curve.Aux[1].Value[i]+4) + 1e-4*rng.NormFloat64())
		curve.Err[i] = 500 * 1e-4
	}
	model := s.model()
	model.Companion, model.Trend = 0.1, systematics.Trend{Regressors: []string{"X"}, Added: []string{"Y"}}
	common := Priors{uniform("midTransitOffset", -0.03, 0.03), uniform("radiusRatio", 0.02, 0.3), uniform("u1", -1, 2), uniform("u2", -1, 2)}
	hours := Prior{Name: "duration", Kind: Uniform, A: 1, B: 6, Unit: "h"}
	var first Posterior
	var firstPoint float64
	for i, rows := range []Priors{
		{uniform("axisRatio", 3, 30), uniform("inclination", 75, 90)},
		{uniform("axisRatio", 3, 30), uniform("impact", 0, 1)},
		{{Name: "stellarDensity", Kind: Uniform, A: 0.1, B: 10, Unit: "g.cm-3"}, uniform("impact", 0, 1)},
		{hours, uniform("impact", 0, 1)},
		{hours, uniform("inclination", 75, 90)},
		{hours, uniform("impact", 0, 1), {Name: "ecosw", Kind: Fixed}, {Name: "esinw", Kind: Fixed}},
	} {
		got, fitted, err := White(curve, withWhite(model, append(rows, common...)))
		if err != nil {
			t.Fatal(err)
		}
		if i == 0 {
			first = got
		}
		for _, name := range []string{"radiusRatio", "axisRatio", "impact", "inclination", "duration"} {
			a, ea := value(t, got, name)
			b, eb := value(t, first, name)
			if math.Abs(a-b) > 0.02*eb || math.Abs(ea/eb-1) > 0.2 {
				t.Errorf("%s and %s: %s is %.6g +- %.2g, first %.6g +- %.2g", rows[0].Name, rows[1].Name, name, a, ea, b, eb)
			}
		}
		if k, e := value(t, got, "radiusRatio"); math.Abs(k-0.11) > 4*e {
			t.Errorf("radius ratio %g +- %g", k, e)
		}
		if a, e := value(t, got, "trend.added.Y"); math.Abs(a) < 10*e || math.Abs(fitted.Flux[7]+fitted.Added[7]-curve.Flux[7]/fitted.Level) > 1e-12 {
			t.Errorf("added %g +- %g", a, e)
		}
		point, _, err := Channel(curve, got, withChannel(model, Priors{uniform("radiusRatio", 0.02, 0.3), uniform("u1", -1, 2), uniform("u2", -1, 2)}))
		if err != nil {
			t.Fatal(err)
		}
		shared := SharedCovariance([]spectrum.Point{point}, got)[0][0]
		if i == 0 {
			firstPoint = shared
		}
		if math.Abs(shared/firstPoint-1) > 0.2 {
			t.Errorf("%s and %s: shared variance %.3g, first %.3g", rows[0].Name, rows[1].Name, shared, firstPoint)
		}
	}
}
