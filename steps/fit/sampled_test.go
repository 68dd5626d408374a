package fit

import (
	"math"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/check"
	"rimlight/steps/lightcurve"
	"rimlight/steps/systematics"
	"rimlight/steps/vector"
)

// simple is a model of few parameters, whose posterior is nearly normal.
func simple(s scene) Model {
	model := s.model()
	model.AxisRatio, model.Inclination, model.MidTransit = 9.4, 87.3, s.orbit.MidTransit
	model.Trend = systematics.Trend{Polynomial: 1, Settling: true, SettlingTime: 0.012, Regressors: []string{"X", "Y"}}
	return withWhite(model, Priors{uniform("midTransitOffset", -0.01, 0.01), uniform("radiusRatio", 0.05, 0.2),
		{Name: "u1", Kind: Normal, A: 0.4, B: 0.05}, {Name: "u2", Kind: Fixed, A: 0.2}})
}

// TestSampleMethods compares the methods with one another and with the fit, whose
// normal distribution is nearly right here.
func TestSampleMethods(t *testing.T) {
	s := newScene(t, 51, 100, 1)
	curve, model := lightcurve.Curves(s.cube)[0], simple(s)
	plain, _, err := White(curve, model)
	if err != nil {
		t.Fatal(err)
	}
	for _, settings := range []Sampler{
		{Method: SamplerNUTS, Seed: 3, WarmUp: 200, Draws: 400},
		{Method: SamplerEnsemble, Seed: 3, WarmUp: 150, Draws: 500},
		{Method: SamplerNested, Seed: 3, Live: 120},
	} {
		got, err := Sample(curve, model, settings)
		if err != nil {
			t.Fatal(err)
		}
		if failed := check.Failed(got.Checks); len(failed) > 0 || len(got.Checks) == 0 {
			t.Errorf("%s: checks failed: %+v", settings.Method, failed)
		}
		if !reflect.DeepEqual(got.Posterior.Value, plain.Value) || !reflect.DeepEqual(got.Posterior.Names, plain.Names) {
			t.Errorf("%s: values %v, want those of the fit, %v", settings.Method, got.Posterior.Value, plain.Value)
		}
		for k, name := range plain.Names {
			summary := got.Summary[k]
			if e := plain.Err[k]; summary.Name != name || math.Abs(summary.Mean-plain.Value[k]) > 0.25*e || math.Abs(summary.SD/e-1) > 0.15 {
				t.Errorf("%s: %s has mean %.6g and deviation %.3g, the fit %.6g +- %.3g", settings.Method, name, summary.Mean, summary.SD, plain.Value[k], e)
			}
		}
		if d := got.Posterior.Derived[0]; d.Name != "depth" || math.Abs(d.Err/plain.Derived[0].Err-1) > 0.15 {
			t.Errorf("%s: %+v, want %+v", settings.Method, d, plain.Derived[0])
		}
		if settings.Method == SamplerEnsemble {
			continue // the others tell as much
		}
		again, err := Sample(curve, model, settings)
		if err != nil || !reflect.DeepEqual(again, got) {
			t.Errorf("%s: not reproducible (%v)", settings.Method, err)
		}
		if settings.Method == SamplerNested {
			evidenceByLaplace(t, s, model, got)
		}
	}
}

// evidenceByLaplace compares an evidence with that of the normal distribution at
// the maximum.
func evidenceByLaplace(t *testing.T, s scene, model Model, got Sampled) {
	m, starts := posed(t, s, model)
	solution, err := m.solve(starts, false)
	if err != nil {
		t.Fatal(err)
	}
	target := newTarget(m)
	y := target.from(solution)
	// Of the covariance of the three parameters with the trend's coefficients
	// integrated over, which is a part of the whole.
	c := solution.cov
	det := c[0][0]*(c[1][1]*c[2][2]-c[1][2]*c[2][1]) - c[0][1]*(c[1][0]*c[2][2]-c[1][2]*c[2][0]) + c[0][2]*(c[1][0]*c[2][1]-c[1][1]*c[2][0])
	prior := target.prior(y, nil) - math.Log(0.02*0.15*0.05*math.Sqrt(2*math.Pi))
	want := target.likelihood(y) + prior + 1.5*math.Log(2*math.Pi) + math.Log(det)/2
	if e := got.Evidence; math.Abs(e.LogZ-want) > 4*e.Err || !(e.Err < 0.5) {
		t.Errorf("log evidence %.2f +- %.2f, by the normal approximation %.2f", e.LogZ, e.Err, want)
	}
}

// TestSampleWith samples a function of the recipe's own.
func TestSampleWith(t *testing.T) {
	s := newScene(t, 52, 200, 1)
	curve, model := lightcurve.Curves(s.cube)[0], simple(s)
	model.Trend.Settling = false
	age := vector.Of(curve.Time).Shift(-curve.Time[0])
	f := func(p []float64) vector.V { return age.Scale(-1 / 0.012).Exp().Scale(p[0]).Shift(1) }
	model.Function = []string{"hook"}
	model.White = append(model.White, uniform("hook", -0.01, 0.01))
	plain, _, err := WhiteWith(curve, model, f)
	if err != nil {
		t.Fatal(err)
	}
	for _, method := range []string{SamplerNUTS, SamplerEnsemble} {
		got, err := SampleWith(curve, model, f, Sampler{Method: method, Seed: 5, WarmUp: 150, Draws: 250})
		if err != nil {
			t.Fatal(err)
		}
		for k, name := range plain.Names {
			if e := plain.Err[k]; math.Abs(got.Summary[k].Mean-plain.Value[k]) > 0.3*e || math.Abs(got.Posterior.Err[k]/e-1) > 0.2 {
				t.Errorf("%s: %s has mean %.6g +- %.3g, the fit %.6g +- %.3g", method, name, got.Summary[k].Mean, got.Posterior.Err[k], plain.Value[k], e)
			}
		}
	}
}

func TestSampleErrors(t *testing.T) {
	s := newScene(t, 53, 200, 1)
	curve, model := lightcurve.Curves(s.cube)[0], simple(s)
	held := withWhite(model, Priors{{Name: "u1", Kind: Fixed, A: 0.4}})
	open := withWhite(model, append(Priors{}, model.White...))
	for _, c := range []struct {
		model    Model
		settings Sampler
		want     string
	}{
		{model, Sampler{Method: "NUT"}, `sampling by "NUT"; expected one of none, nuts`},
		{model, Sampler{Method: SamplerNUTS, Chains: 65}, "65 chains; expected 1 to 64"},
		{model, Sampler{Method: SamplerNUTS, Draws: 20001}, "20001 draws"},
		{model, Sampler{Method: SamplerNested, Live: -1}, "-1 live points"},
		{held, Sampler{Method: SamplerNUTS}, "the fit is exact"},
		{withFunctionNames(open, "a"), Sampler{}, "function of the recipe's own"},
	} {
		if _, err := Sample(curve, c.model, c.settings); err == nil || !strings.HasPrefix(err.Error(), "posterior of a light curve: ") || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want %q", err, c.want)
		}
	}
	got, err := Sample(curve, model, Sampler{})
	if plain, _, _ := White(curve, model); err != nil || !reflect.DeepEqual(got, Sampled{Posterior: plain}) {
		t.Errorf("without sampling: %v", err)
	}
}

func withFunctionNames(model Model, names ...string) Model { model.Function = names; return model }
