package program

import (
	"math"
	"os"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
	"rimlight/steps/spectrum"
	"rimlight/steps/transit"
	"rimlight/steps/vector"
)

// A recipe with models of its own, and the ways in which these can go wrong.
const modelRecipe = `
func ramp(curve lightcurve.Curve) func(p []float64) vector.V {
	t := vector.Of(curve.Time).Shift(-curve.Time[0])
	return func(p []float64) vector.V {
		return t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
	}
}

func White(white lightcurve.Curve, model fit.Model, priors fit.Priors) (geometry fit.Posterior, whiteFit fit.CurveFit, err error) {
	model.White, model.Function = priors, []string{"hook", "hookTime"}
	return fit.WhiteWith(white, model, ramp(white))
}

func Channel(channel lightcurve.Curve, geometry fit.Posterior, model fit.Model, priors fit.Priors) (point spectrum.Point, err error) {
	model.Channel, model.Function = priors, []string{"hook", "hookTime"}
	point, _, err = fit.ChannelWith(channel, geometry, model, ramp(channel))
	return
}

// Loop has the model as a loop over elements.
func Loop(white lightcurve.Curve, priors fit.Priors) (line fit.Posterior, err error) {
	line, _, err = fit.Function(white, fit.Model{White: priors, Function: []string{"slope"}}, func(p []float64) vector.V {
		out := make([]float64, len(white.Time))
		for i, t := range white.Time {
			out[i] = 1 + p[0]*(t-white.Time[0])
		}
		return vector.Of(out)
	})
	return
}

func Short(white lightcurve.Curve, priors fit.Priors) (line fit.Posterior, err error) {
	line, _, err = fit.Function(white, fit.Model{White: priors, Function: []string{"slope"}}, func(p []float64) vector.V {
		return vector.Of(white.Time[1:])
	})
	return
}

func Panic(white lightcurve.Curve, priors fit.Priors) (line fit.Posterior, err error) {
	line, _, err = fit.Function(white, fit.Model{White: priors, Function: []string{"slope"}}, func(p []float64) vector.V {
		slope := p[0]
		curvature := p[1]
		return vector.Of(white.Time).Scale(slope * curvature)
	})
	return
}
`

// modelCurve is a transit of a settling detector.
func modelCurve(t testing.TB, setup fit.Model) lightcurve.Curve {
	t.Helper()
	c := lightcurve.Curve{Channel: lightcurve.Channel{Index: -1, Lo: 1, Hi: 2}, Mask: make([]lightcurve.Flag, 500)}
	for i := range c.Mask {
		c.Time = append(c.Time, setup.MidTransit+0.25*(float64(i)/500-0.5))
	}
	p := transit.Params{RadiusRatio: 0.1, Law: limb.Law{Name: limb.Quadratic, Coefficients: []float64{0.3, 0.2}}}
	p.Orbit.Period, p.Orbit.MidTransit, p.Orbit.AxisRatio, p.Orbit.Inclination = setup.Period, setup.MidTransit, setup.AxisRatio, setup.Inclination*math.Pi/180
	flux, err := transit.Curve(c.Time, p)
	if err != nil {
		t.Fatal(err)
	}
	for i, f := range flux {
		ramp := 1 + 0.003*math.Exp(-(c.Time[i]-c.Time[0])/0.02)
		c.Flux = append(c.Flux, f*ramp+2e-4*math.Sin(float64(i*i)))
		c.Err = append(c.Err, 2e-4)
	}
	return c
}

// TestOwnModel compares a recipe's own models with the same ones compiled, bit
// for bit, and looks at how their faults come out.
func TestOwnModel(t *testing.T) {
	m, err := accept(t, modelRecipe).Compile()
	if err != nil {
		t.Fatal(err)
	}
	call := func(step string, args ...any) ([]reflect.Value, error) {
		var in []reflect.Value
		for _, a := range args {
			in = append(in, reflect.ValueOf(a))
		}
		return m.Call(step, in)
	}
	setup := fit.Model{Period: 3.1, MidTransit: 2460100.4, AxisRatio: 9.4, Inclination: 87.3, RadiusRatio: 0.11}
	curve := modelCurve(t, setup)
	uniform := func(name string, a, b float64) fit.Prior {
		return fit.Prior{Name: name, Kind: fit.Uniform, A: a, B: b}
	}
	priors := fit.Priors{uniform("radiusRatio", 0.01, 0.3), uniform("u1", -1, 2), uniform("u2", -1, 2),
		uniform("hook", -0.01, 0.01), {Name: "hookTime", Kind: fit.LogUniform, A: 0.001, B: 0.2, Unit: "d"}}
	start := vector.Of(curve.Time).Shift(-curve.Time[0])
	ramp := func(p []float64) vector.V { return start.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1) }
	names := []string{"hook", "hookTime"}

	model := setup
	model.White, model.Channel, model.Function = priors, priors[:3], names
	whiteModel := model
	whiteModel.Channel = nil
	want, wantFit, err := fit.WhiteWith(curve, whiteModel, ramp)
	if err != nil {
		t.Fatal(err)
	}
	out, err := call("White", curve, setup, priors)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(out[0].Interface(), want) || !reflect.DeepEqual(out[1].Interface(), wantFit) {
		t.Errorf("interpreted %+v\ncompiled %+v", out[0].Interface(), want)
	}
	point, _, err := fit.ChannelWith(curve, want, model, ramp)
	if err != nil {
		t.Fatal(err)
	}
	out, err = call("Channel", curve, want, setup, priors[:3])
	if err != nil {
		t.Fatal(err)
	}
	if got := out[0].Interface().(spectrum.Point); !reflect.DeepEqual(got, point) || math.Abs(got.RadiusRatio-0.1) > 5*got.RadiusRatioErr {
		t.Errorf("interpreted %+v\ncompiled %+v", got, point)
	}

	rows := fit.Priors{uniform("slope", -1, 1)}
	line, _, err := fit.Function(curve, fit.Model{White: rows, Function: []string{"slope"}}, func(p []float64) vector.V {
		return start.Scale(p[0]).Shift(1)
	})
	if err != nil {
		t.Fatal(err)
	}
	out, err = call("Loop", curve, rows)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(out[0].Interface(), line) {
		t.Errorf("loop %+v\ncolumns %+v", out[0].Interface(), line)
	}

	_, err = call("Short", curve, rows)
	if e, ok := err.(*StepError); !ok || !strings.Contains(e.Text, "the function of the recipe gave 499 values at slope = 0; expected one for each of 500 integrations") {
		t.Errorf("error %v", err)
	}
	_, err = call("Panic", curve, rows)
	wantLine := 1 + strings.Count(modelRecipe[:strings.Index(modelRecipe, "curvature := p[1]")], "\n")
	if e, ok := err.(*PanicError); !ok || e.Pos.Line != wantLine || !strings.Contains(e.Text, "index out of range") {
		t.Errorf("error %v, want a panic in line %d", err, wantLine)
	}
}

// TestReadmeModel checks the code of the README's section on models.
func TestReadmeModel(t *testing.T) {
	readme, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	_, section, _ := strings.Cut(string(readme), "\n## Your own model\n")
	_, code, _ := strings.Cut(section, "```go\n")
	code, _, found := strings.Cut(code, "```")
	if !found {
		t.Fatal("the section has no Go block")
	}
	m, err := accept(t, "\n"+code).Compile()
	if err != nil {
		t.Fatal(err)
	}
	setup := fit.Model{Period: 3.1, MidTransit: 2460100.4, AxisRatio: 9.4, Inclination: 87.3, RadiusRatio: 0.11}
	priors := fit.Priors{{Name: "radiusRatio", Kind: fit.Uniform, A: 0.01, B: 0.3}, {Name: "u1", Kind: fit.Uniform, A: -1, B: 2}, {Name: "u2", Kind: fit.Uniform, A: -1, B: 2},
		{Name: "hook", Kind: fit.Uniform, A: -0.01, B: 0.01}, {Name: "hookTime", Kind: fit.LogUniform, A: 0.001, B: 0.1, Unit: "d"}}
	out, err := m.Call("FitWhite", []reflect.Value{reflect.ValueOf(modelCurve(t, setup)), reflect.ValueOf(setup), reflect.ValueOf(priors)})
	if err != nil {
		t.Fatal(err)
	}
	if p := out[0].Interface().(fit.Posterior); p.Status != "converged" || len(p.Warnings) > 0 {
		t.Errorf("%s, %v", p.Status, p.Warnings)
	}
}
