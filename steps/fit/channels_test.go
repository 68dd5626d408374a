package fit

import (
	"math"
	"reflect"
	"runtime"
	"strings"
	"testing"

	"rimlight/steps/check"
	"rimlight/steps/lightcurve"
)

// samplingPriors are those of the shipped recipe's channels.
func samplingPriors() Priors {
	return Priors{uniform("radiusRatio", 0.001, 0.5), uniform("u1", -2, 3), uniform("u2", -2, 3),
		{Name: "settlingTime", Kind: LogUniform, A: 0.002, B: 0.2, Unit: "d"}}
}

// fittedScene is a scene whose white light curve has been fitted with the model.
func fittedScene(t *testing.T, seed uint64, integrations, channels int) (s scene, model Model, white Posterior) {
	t.Helper()
	s = newScene(t, seed, integrations, channels)
	model = s.model()
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	if white, _, err = White(curve, withWhite(model, whitePriors())); err != nil {
		t.Fatal(err)
	}
	return s, model, white
}

// TestChannelsAgreeWithFits holds means and standard deviations of the posteriors against
// the best fits and their errors, which they are near to in light curves like these.
func TestChannelsAgreeWithFits(t *testing.T) {
	s, model, white := fittedScene(t, 5, 1500, 6)
	curves := lightcurve.Curves(s.cube)
	curves[2].Mask[700] = lightcurve.Outlier
	curves[2].Flux[700] = math.NaN()
	for k := range curves[3].Err { // photon noise differs from sample to sample
		curves[3].Err[k] *= 1 + 0.1*math.Sin(float64(k))
	}
	model.Channel = Priors{uniform("radiusRatio", 0.001, 0.5), uniform("u1", -2, 3), uniform("u2", -2, 3)}
	points, posteriors, err := Channels(curves, white, model, Sampling{})
	if err != nil {
		t.Fatal(err)
	}
	fits, err := ChannelCurves(curves, posteriors, white, model)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := ChannelCurves(curves, posteriors[1:], white, model); err == nil {
		t.Error("a posterior too few was accepted")
	}
	for i, c := range curves {
		want, wantFit, err := Channel(c, white, model)
		if err != nil {
			t.Fatal(err)
		}
		p := points[i]
		near := func(name string, got, want, tolerance float64) {
			if !(math.Abs(got-want) <= tolerance) {
				t.Errorf("channel %d: %s %.8g, want %.8g within %.2g", i, name, got, want, tolerance)
			}
		}
		near("depth", p.Depth, want.Depth, 0.1*want.DepthErr)
		near("its error", p.DepthErr, want.DepthErr, 0.05*want.DepthErr)
		near("radius ratio", p.RadiusRatio, want.RadiusRatio, 0.1*want.RadiusRatioErr)
		near("u1", p.Limb[0], want.Limb[0], 0.15*want.LimbErr[0])
		near("u2 error", p.LimbErr[1], want.LimbErr[1], 0.07*want.LimbErr[1])
		near("chi-square", p.Chi2, want.Chi2, 0.05)
		near("scatter", p.Scatter, want.Scatter, 1e-3*want.Scatter)
		near("samples", float64(p.Used), float64(want.Used), 0)
		near("degrees of freedom", float64(p.Dof), float64(want.Dof), 0)
		for g, shift := range want.ShiftGeometry {
			near("shift by "+white.Names[g], p.ShiftGeometry[g]*white.Err[g], shift*white.Err[g], 0.05*want.DepthErr) // that of Channel is a difference over two standard deviations
		}
		if p.Flag != "" {
			t.Errorf("channel %d is flagged: %s", i, p.Flag)
		}
		q := posteriors[i]
		if q.Effective < 4000 || !q.Reliable || q.How != "importance sampling" {
			t.Errorf("channel %d: %+v", i, q)
		}
		fitted := fits[i]
		for k := range c.Time {
			near("transit", fitted.Transit[k], wantFit.Transit[k], 2e-6)
			near("trend", fitted.Trend[k], wantFit.Trend[k], 2e-5)
		}
	}
	for _, c := range SamplingChecks(posteriors) {
		if !c.Passed {
			t.Errorf("failed: %+v", c)
		}
	}
	if n := len(SamplingChecks(posteriors)); n != 4 {
		t.Errorf("%d checks", n)
	}
}

// TestChannelsOnAnyCores asks for the same bytes whatever the cores, and whatever the
// block that a channel is in.
func TestChannelsOnAnyCores(t *testing.T) {
	s, model, white := fittedScene(t, 6, 800, 5)
	curves := lightcurve.Curves(s.cube)
	for k := range curves[1].Mask { // too little is left
		if k > 20 {
			curves[1].Mask[k] = lightcurve.Excluded
		}
	}
	sampling := Sampling{Effective: 500, Seed: 3, Compared: -1}
	model.Channel = samplingPriors()
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(1))
	points, posteriors, err := Channels(curves, white, model, sampling)
	if err != nil {
		t.Fatal(err)
	}
	if points[1].Good() || !strings.Contains(points[1].Flag, "usable samples") || len(posteriors[1].Quantities) != 0 {
		t.Errorf("a channel without samples: %+v", points[1])
	}
	nan := func(x any) any { // NaN differs from itself
		switch v := x.(type) {
		case []ChannelPosterior:
			out := append([]ChannelPosterior(nil), v...)
			for i := range out {
				out[i].KHat, out[i].RHat, out[i].RadiusRatio = math.Float64frombits(0), 0, 0
			}
			return out
		}
		return x
	}
	runtime.GOMAXPROCS(7)
	again, posteriorsAgain, err := Channels(curves, white, model, sampling)
	if err != nil {
		t.Fatal(err)
	}
	again[1], points[1] = points[0], points[0]
	if !reflect.DeepEqual(points, again) || !reflect.DeepEqual(nan(posteriors), nan(posteriorsAgain)) {
		t.Error("the result depends on the number of cores")
	}
	part, _, err := Channels(curves[2:4], white, model, sampling)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(part, points[2:4]) {
		t.Error("the result depends on the block")
	}
}

func TestChannelsErrors(t *testing.T) {
	s := newScene(t, 7, 300, 3)
	white := Posterior{Names: []string{"radiusRatio"}, Value: []float64{0.1}, Err: []float64{0.001}, Cov: [][]float64{{1e-6}}}
	curves := lightcurve.Curves(s.cube)
	shifted := append([]lightcurve.Curve(nil), curves...)
	shifted[1].Time = append([]float64(nil), shifted[1].Time...)
	shifted[1].Time[3] += 1e-6
	model := s.model()
	model.Channel = samplingPriors()
	power, orbits, radius, trend, kind, jitter := model, model, model, model, model, model
	power.LimbLaw = LawPower2
	power.Channel = Priors{uniform("radiusRatio", 0.001, 0.5), uniform("u1", 0.1, 1), uniform("u2", 0.1, 1)}
	orbits.Channel = append(samplingPriors(), uniform("axisRatio", 3, 30))
	radius.Channel = Priors{uniform("u1", -2, 3), uniform("u2", -2, 3)}
	trend.Channel = append(samplingPriors(), Prior{Name: "trend.Z", Kind: Normal, B: 1})
	kind.Channel = append(samplingPriors(), uniform("trend.time", 0, 1))
	jitter.Channel = append(samplingPriors(), uniform("jitter", 0, 1))
	for _, test := range []struct {
		name     string
		curves   []lightcurve.Curve
		model    Model
		sampling Sampling
		want     string
	}{
		{"times", shifted, model, Sampling{}, "other times"},
		{"law", curves, power, Sampling{}, "not linear"},
		{"draws", curves, model, Sampling{Effective: 3}, "expected 100 to 20000"},
		{"orbit", curves, orbits, Sampling{}, "held at the white fit's value"},
		{"trend", curves, trend, Sampling{}, "no term"},
		{"kind", curves, kind, Sampling{}, "expected N(mean, sd)"},
		{"radius", curves, radius, Sampling{}, "radiusRatio free"},
		{"jitter", curves, jitter, Sampling{}, "jitter is free"},
	} {
		_, _, err := Channels(test.curves, white, test.model, test.sampling)
		if err == nil || !strings.Contains(err.Error(), test.want) {
			t.Errorf("%s: %v, want %q", test.name, err, test.want)
		}
	}
	if points, _, err := Channels(nil, white, model, Sampling{}); err != nil || len(points) != 0 {
		t.Errorf("no channels: %v", err)
	}
	if SamplingChecks(nil) != nil {
		t.Error("checks of nothing")
	}
	bad := []ChannelPosterior{{Quantities: []Interval{{}}, KHat: math.NaN(), RHat: math.NaN(), Effective: 10}}
	if n := len(check.Failed(SamplingChecks(bad))); n != 2 {
		t.Errorf("%d checks of a bad posterior failed, want 2", n)
	}
}
