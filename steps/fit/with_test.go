package fit

import (
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/vector"
)

// ramp is an exponential settling as a recipe writes it: 1 + p0 exp(-(t-t0)/p1).
func ramp(curve lightcurve.Curve) func(p []float64) vector.V {
	t := vector.Of(curve.Time).Shift(-curve.Time[0])
	return func(p []float64) vector.V { return t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1) }
}

var rampNames = []string{"hook", "hookTime"}

func rampPriors() Priors {
	return Priors{{Name: "hookTime", Kind: LogUniform, A: 0.001, B: 0.1, Unit: "d"}, uniform("hook", -0.01, 0.01)}
}

// flat drops the terms of a model that a ramp in its own right would not
// multiply in the same way, so that both models are the same.
func flat(model Model, settling bool) Model {
	model.Trend = systematics.Trend{Settling: settling, SettlingTime: 0.02}
	return model
}

func others(priors Priors, name string) Priors {
	return slices.DeleteFunc(slices.Clone(priors), func(p Prior) bool { return p.Name == name })
}

// near compares two values against an error, and the two errors.
func near(t *testing.T, what string, got, gotErr, want, wantErr float64) {
	t.Helper()
	if !(math.Abs(got-want) <= 2e-3*wantErr) || !(math.Abs(gotErr/wantErr-1) <= 2e-3) {
		t.Errorf("%s: %.9g +- %.4g, want %.9g +- %.4g", what, got, gotErr, want, wantErr)
	}
}

// TestWithMatchesNative fits the same model twice, with settling as a term of
// the trend and as a function of the recipe.
func TestWithMatchesNative(t *testing.T) {
	s := newScene(t, 31, 600, 3)
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	native, nativeFit, err := White(curve, withWhite(flat(s.model(), true), whitePriors()))
	if err != nil {
		t.Fatal(err)
	}
	own, ownFit, err := whiteWith(curve, flat(s.model(), false), append(rampPriors(), others(whitePriors(), "settlingTime")...), rampNames, ramp(curve))
	if err != nil {
		t.Fatal(err)
	}
	if own.Status != statusConverged || math.Abs(own.Chi2-native.Chi2) > 1e-3 || own.Dof != native.Dof {
		t.Errorf("chi-square %.6f of %d (%s), want %.6f of %d", own.Chi2, own.Dof, own.Status, native.Chi2, native.Dof)
	}
	for _, name := range []string{"midTransitOffset", "axisRatio", "inclination", "radiusRatio", "u1", "u2", "depth", "duration"} {
		got, gotErr := value(t, own, name)
		want, wantErr := value(t, native, name)
		near(t, name, got, gotErr, want, wantErr)
	}
	got, gotErr := value(t, own, "hookTime")
	want, wantErr := value(t, native, "settlingTime")
	near(t, "time scale", got, gotErr, want, wantErr)
	if k := slices.Index(own.Names, "hookTime"); own.Units[k] != "d" || own.Names[k-1] != "hook" || own.Names[k+1] != "trend.constant" {
		t.Errorf("names %v, units %v", own.Names, own.Units)
	}
	for i := range ownFit.Flux {
		a, b := ownFit.Transit[i]*ownFit.Trend[i]*ownFit.Level, nativeFit.Transit[i]*nativeFit.Trend[i]*nativeFit.Level
		if math.Abs(a-b) > 1e-7 || math.Abs(ownFit.Flux[i]*ownFit.Level-curve.Flux[i]) > 1e-12 {
			t.Fatalf("model %g and %g at %d", a, b, i)
		}
	}
	if !strings.HasPrefix(own.Model.Equation().String(), "flux = transit(t) × f(t; hook, hookTime) × (c0); ") {
		t.Errorf("model %q", own.Model.Equation().String())
	}

	channel := lightcurve.Curves(s.cube)[1]
	rows := channelPriors("u1", "u2", -1, 2)
	free := Prior{Name: "settlingTime", Kind: Uniform, A: 0.001, B: 0.1}
	for _, test := range []struct {
		name        string
		native, own Priors
	}{
		{"held", rows, append(slices.Clone(rows), uniform("hook", -0.01, 0.01))},
		{"free", append(slices.Clone(rows), free), append(slices.Clone(rows), rampPriors()...)},
	} {
		want, _, err := Channel(channel, native, withChannel(flat(s.model(), true), test.native))
		if err != nil {
			t.Fatal(err)
		}
		got, _, err := channelWith(channel, own, flat(s.model(), false), test.own, rampNames, ramp(channel))
		if err != nil {
			t.Fatal(err)
		}
		near(t, test.name+" depth", got.Depth, got.DepthErr, want.Depth, want.DepthErr)
		near(t, test.name+" u1", got.Limb[0], got.LimbErr[0], want.Limb[0], want.LimbErr[0])
		if got.Flag != want.Flag || math.Abs(got.Chi2-want.Chi2) > 1e-3 {
			t.Errorf("%s: chi-square %g, want %g; flag %q", test.name, got.Chi2, want.Chi2, got.Flag)
		}
		nativeShift := want.ShiftGeometry[slices.Index(native.Names, "settlingTime")]
		ownShift := got.ShiftGeometry[slices.Index(own.Names, "hookTime")]
		if (test.name == "held") != (nativeShift != 0) || math.Abs(ownShift-nativeShift) > 0.01*math.Abs(nativeShift) {
			t.Errorf("%s: the depth shifts by %g per day, want %g", test.name, ownShift, nativeShift)
		}
		a, b := SharedCovariance([]spectrum.Point{got}, own)[0][0], SharedCovariance([]spectrum.Point{want}, native)[0][0]
		if !(math.Abs(a/b-1) < 0.01) {
			t.Errorf("%s: shared variance %g, want %g", test.name, a, b)
		}
	}
}

// TestWithHeld holds parameters, under every kind of prior.
func TestWithHeld(t *testing.T) {
	s := newScene(t, 32, 300, 1)
	curve := lightcurve.Curves(s.cube)[0]
	rows := append(others(whitePriors(), "settlingTime"), Prior{Name: "hookTime", Kind: Fixed, A: 0.012, Unit: "d"})
	free, _, err := whiteWith(curve, flat(s.model(), false), append(slices.Clone(rows), uniform("hook", -0.1, 0.1)), rampNames, ramp(curve))
	if err != nil {
		t.Fatal(err)
	}
	hook, hookErr := value(t, free, "hook")
	if h, ok := free.find("hookTime"); !ok || h != (Prior{Name: "hookTime", Kind: Fixed, A: 0.012, Unit: "d"}) {
		t.Errorf("held: %+v", free.Held)
	}
	// A normal prior as strong as the data halves the variance and takes the value
	// half way.
	mean := hook + 3*hookErr
	for _, prior := range []Prior{
		{Name: "hook", Kind: Normal, A: mean, B: hookErr},
		{Name: "hook", Kind: TruncatedNormal, A: mean, B: hookErr, Lo: hook - 9*hookErr, Hi: mean + 9*hookErr},
	} {
		p, _, err := whiteWith(curve, flat(s.model(), false), append(slices.Clone(rows), prior), rampNames, ramp(curve))
		if err != nil {
			t.Fatal(err)
		}
		got, gotErr := value(t, p, "hook")
		if math.Abs(got-(hook+1.5*hookErr)) > 0.05*hookErr || math.Abs(gotErr/hookErr*math.Sqrt2-1) > 0.03 {
			t.Errorf("%s: %g +- %g, without %g +- %g", prior.Kind, got, gotErr, hook, hookErr)
		}
	}
	limited, _, err := whiteWith(curve, flat(s.model(), false), append(slices.Clone(rows), uniform("hook", hook+hookErr, hook+2*hookErr)), rampNames, ramp(curve))
	if err != nil {
		t.Fatal(err)
	}
	if got, _ := value(t, limited, "hook"); math.Abs(got-hook-hookErr) > 1e-9 || !strings.Contains(strings.Join(limited.Warnings, "; "), "hook is at the end of its range") {
		t.Errorf("%g, limited to %g: %v", got, hook+hookErr, limited.Warnings)
	}
}

// dip is a light curve wholly the recipe's own: a bell-shaped dip of relative
// depth p0 at p1 with the width p2.
func dip(times []float64) func(p []float64) vector.V {
	t := vector.Of(times)
	return func(p []float64) vector.V {
		x := t.Shift(-p[1]).Scale(1 / p[2])
		return x.Mul(x).Scale(-0.5).Exp().Scale(-p[0]).Shift(1)
	}
}

var dipNames = []string{"dipDepth", "midTransit", "width"}

func dipCurve(rng *rand.Rand, n int) lightcurve.Curve {
	c := lightcurve.Curve{Channel: lightcurve.Channel{Index: -1, Lo: 1, Hi: 2}, Mask: make([]lightcurve.Flag, n)}
	for i := range n {
		c.Time = append(c.Time, 2460300.5+0.2*float64(i)/float64(n))
	}
	for i, f := range dip(c.Time)([]float64{0.01, 2460300.61, 0.02}).X {
		c.Err = append(c.Err, 700*0.001)
		c.Flux = append(c.Flux, 700*(f*(1+0.002*float64(i)/float64(n))+0.001*rng.NormFloat64()))
	}
	return c
}

func dipPriors() Priors {
	return Priors{uniform("width", 0.002, 0.1), uniform("dipDepth", 0, 0.1), {Name: "midTransit", Kind: Uniform, A: 2460300.5, B: 2460300.7, Unit: "d"}}
}

// TestFunctionIsHonest fits many simulated curves: differences from the truth
// are as large as the errors say. The bounds are four standard deviations of mean
// and variance of so many normal numbers.
func TestFunctionIsHonest(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	const fits = 120
	truth := []float64{0.01, 2460300.61, 0.02}
	var sum, squares [3]float64
	for range fits {
		c := dipCurve(rng, 250)
		p, f, err := functionOf(c, systematics.Trend{Polynomial: 1}, dipPriors(), dipNames, dip(c.Time))
		if err != nil {
			t.Fatal(err)
		}
		if p.Status != statusConverged || p.Derived != nil || p.Held != nil {
			t.Errorf("%+v", p)
		}
		for k, want := range truth {
			got, e := value(t, p, dipNames[k])
			sum[k] += (got - want) / e
			squares[k] += (got - want) * (got - want) / e / e
		}
		mid, _ := value(t, p, "midTransit")
		if f.Mid != mid || f.Transit[0] < 0.999 || math.Abs(f.Level/700-1) > 0.01 {
			t.Fatalf("mid-transit %g, %g at the start, level %g", f.Mid, f.Transit[0], f.Level)
		}
	}
	for k, name := range dipNames {
		if mean, variance := sum[k]/fits, squares[k]/fits; math.Abs(mean) > 4/math.Sqrt(fits) || math.Abs(variance-1) > 4*math.Sqrt(2./fits) {
			t.Errorf("%s: pulls of mean %.3f and variance %.3f", name, mean, variance)
		}
	}
}

// TestFunctionOfLinearTerms has an answer in closed form: the same terms as a
// trend.
func TestFunctionOfLinearTerms(t *testing.T) {
	c := dipCurve(rand.New(rand.NewPCG(9, 9)), 300)
	x := vector.Linspace(-1, 1, 300)
	f := func(p []float64) vector.V { return x.Polynomial([]float64{1, p[0], p[1]}) }
	p, _, err := functionOf(c, systematics.Trend{}, Priors{uniform("a", -1e3, 1e3), {Name: "b", Kind: Normal, A: 0, B: 1e6}}, []string{"a", "b"}, f)
	if err != nil {
		t.Fatal(err)
	}
	q, _, err := functionOf(c, systematics.Trend{Polynomial: 2}, nil, nil, func([]float64) vector.V { return vector.Full(300, 1) })
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(p.Chi2-q.Chi2) > 1e-6 {
		t.Errorf("chi-square %.9g, want %.9g", p.Chi2, q.Chi2)
	}
	level, _ := value(t, q, "trend.constant")
	for k, name := range []string{"trend.time", "trend.time^2"} {
		want, wantErr := value(t, q, name)
		got, gotErr := value(t, p, []string{"a", "b"}[k])
		if math.Abs(got-want/level) > 1e-3*wantErr || math.Abs(gotErr/wantErr*level-1) > 0.01 {
			t.Errorf("%s: %g +- %g, want %g +- %g", name, got, gotErr, want/level, wantErr/level)
		}
	}
}

// TestFunctionDomain has a function that does not exist everywhere, which the
// search has to avoid, up to the very edge.
func TestFunctionDomain(t *testing.T) {
	c := dipCurve(rand.New(rand.NewPCG(10, 9)), 200)
	age := vector.Of(c.Time).Shift(-c.Time[0])
	f := func(p []float64) vector.V { return age.Shift(p[1]).Sqrt().Scale(p[0]).Shift(1) }
	p, _, err := functionOf(c, systematics.Trend{}, Priors{uniform("a", -1, 1), uniform("b", -1, 0.5)}, []string{"a", "b"}, f)
	if err != nil {
		t.Fatal(err)
	}
	if b, _ := value(t, p, "b"); !(b >= 0) {
		t.Errorf("b = %g, where the function is NaN", b)
	}
}

func TestWithErrors(t *testing.T) {
	s := newScene(t, 33, 200, 2)
	curve := lightcurve.Curves(s.cube)[0]
	model := flat(s.model(), false)
	rows := append(rampPriors(), others(whitePriors(), "settlingTime")...)
	n := len(curve.Time)
	constant := func(x float64) func([]float64) vector.V {
		return func([]float64) vector.V { return vector.Full(n, x) }
	}
	for _, test := range []struct {
		name   string
		names  []string
		f      func([]float64) vector.V
		priors Priors
		want   string
	}{
		{"nil", rampNames, nil, rows, "the function is nil"},
		{"short", rampNames, func(p []float64) vector.V { return vector.Full(n-1, 1) }, rows, "gave 199 values at hook = 0, hookTime = 0.01; expected one for each of 200 integrations"},
		{"fault", rampNames, func(p []float64) vector.V { return vector.V{}.Add(vector.Full(2, 1)) }, rows, "failed at hook = 0, hookTime = 0.01: Add of columns of 0 and 2 elements"},
		{"NaN", rampNames, constant(math.NaN()), rows, "is NaN at integration 0 for hook = 0, hookTime = 0.01; expected a finite number"},
		{"infinite", rampNames, constant(math.Inf(1)), rows, "is +Inf at integration 0"},
		{"zero", rampNames, constant(0), rows, "the terms of the trend cannot be told apart"},
		{"huge", rampNames, constant(1e308), rows, ""},
		{"taken", []string{"radiusRatio"}, constant(1), rows, "radiusRatio is a parameter of the transit, the trend or the noise"},
		{"no name", []string{""}, constant(1), rows, `parameter 1 of the function is called ""`},
		{"trend name", []string{"trend.x"}, constant(1), rows, `expected a name that does not start with "trend."`},
		{"twice", []string{"hook", "hook"}, constant(1), rows, "two parameters of the function are called hook"},
		{"many", make([]string, 51), constant(1), rows, "the function has 51 parameters; expected at most 50"},
		{"no row", []string{"hook", "hookTime", "slope"}, constant(1), rows, "parameter slope of the function has no prior; add a row for it"},
		{"two rows", rampNames, constant(1), append(rampPriors(), rows...), "parameter hookTime has two priors"},
		{"mistyped", []string{"hook"}, constant(1), append(slices.Clone(rows), uniform("hok", 0, 1)), `unknown parameter "hookTime"`},
		{"bad prior", rampNames, constant(1), append(Priors{uniform("hook", 1, 0)}, rows[:1]...), "prior of hook is U with A=1, B=0"},
		{"endless prior", rampNames, constant(1), append(Priors{uniform("hook", -1.7e308, 1.7e308)}, rows[:1]...), "the prior of hook leaves no room, or more than can be computed with"},
	} {
		_, _, err := whiteWith(curve, model, test.priors, test.names, test.f)
		if err == nil || !strings.HasPrefix(err.Error(), "white fit: ") || !strings.Contains(err.Error(), test.want) {
			t.Errorf("%s: error %v, want %q", test.name, err, test.want)
		}
	}

	white, _, err := whiteWith(curve, model, rows, rampNames, ramp(curve))
	if err != nil {
		t.Fatal(err)
	}
	channel := lightcurve.Curves(s.cube)[1]
	_, _, err = Channel(channel, white, withChannel(model, channelPriors("u1", "u2", -1, 2)))
	if err == nil || !strings.Contains(err.Error(), "fit the channels with ChannelWith") {
		t.Errorf("error %v", err)
	}
	_, _, err = channelWith(channel, white, model, channelPriors("u1", "u2", -1, 2), []string{"hook", "other"}, ramp(curve))
	if err == nil || !strings.Contains(err.Error(), "parameter other of the function has no prior, and the white posterior does not know it") {
		t.Errorf("error %v", err)
	}
	for _, test := range []struct {
		trend  systematics.Trend
		priors Priors
		names  []string
		want   string
	}{
		{systematics.Trend{Polynomial: 9}, dipPriors(), dipNames, "polynomial of order 9"},
		{systematics.Trend{}, append(dipPriors(), uniform("settlingTime", 0.01, 1)), dipNames, `unknown parameter "settlingTime"; expected one of errorScale, jitter, dipDepth, midTransit, width`},
		{systematics.Trend{}, append(dipPriors(), uniform("with", 0.01, 1)), dipNames, "nearest known name: width"},
		{systematics.Trend{Settling: true, SettlingTime: -1}, dipPriors(), dipNames, "settlingTime is -1"},
		{systematics.Trend{Settling: true, SettlingTime: 0.01}, append(dipPriors(), uniform("settlingTime", 0.01, 1)), []string{"dipDepth", "midTransit", "width", "settlingTime"}, "settlingTime is a parameter of the trend"},
	} {
		_, _, err := functionOf(curve, test.trend, test.priors, test.names, dip(curve.Time))
		if err == nil || !strings.HasPrefix(err.Error(), "fit of a function: ") || !strings.Contains(err.Error(), test.want) {
			t.Errorf("error %v, want %q", err, test.want)
		}
	}
}

// TestFunctionSettling has a settling term with a free time beside a function.
func TestFunctionSettling(t *testing.T) {
	c := dipCurve(rand.New(rand.NewPCG(11, 9)), 400)
	for i, x := range c.Time {
		c.Flux[i] *= 1 + 0.01*math.Exp(-(x-c.Time[0])/0.015)
	}
	p, _, err := functionOf(c, systematics.Trend{Polynomial: 1, Settling: true, SettlingTime: 0.04},
		append(dipPriors(), uniform("settlingTime", 0.001, 0.1)), dipNames, dip(c.Time))
	if err != nil {
		t.Fatal(err)
	}
	if got, e := value(t, p, "settlingTime"); math.Abs(got-0.015) > 4*e || !(e < 0.005) || p.Status != statusConverged {
		t.Errorf("settling time %g +- %g (%s)", got, e, p.Status)
	}
}

// TestWithIsReproducible has a function that hands out the same memory each time,
// and changes its argument.
func TestWithIsReproducible(t *testing.T) {
	c := dipCurve(rand.New(rand.NewPCG(12, 9)), 200)
	plain, plainFit, err := functionOf(c, systematics.Trend{}, dipPriors(), dipNames, dip(c.Time))
	if err != nil {
		t.Fatal(err)
	}
	buffer := make([]float64, len(c.Time))
	shared, sharedFit, err := functionOf(c, systematics.Trend{}, dipPriors(), dipNames, func(p []float64) vector.V {
		copy(buffer, dip(c.Time)(p).X)
		clear(p)
		return vector.Of(buffer)
	})
	if err != nil {
		t.Fatal(err)
	}
	clear(buffer)
	if !reflect.DeepEqual(plain, shared) || !reflect.DeepEqual(plainFit, sharedFit) {
		t.Error("two fits of the same data differ")
	}
}

// TestFunctionHostile throws odd functions and priors at the fit, which must end,
// in a result or in an error.
func TestFunctionHostile(t *testing.T) {
	s := newScene(t, 34, 80, 1)
	curve := lightcurve.Curves(s.cube)[0]
	n := len(curve.Time)
	constant := func(x float64) vector.V { return vector.Full(n, x) }
	functions := []func(p []float64) vector.V{
		func(p []float64) vector.V { return constant(p[0]) },
		func(p []float64) vector.V { return constant(math.Floor(p[0])) },
		func(p []float64) vector.V { return constant(math.Log(p[0])) },
		func(p []float64) vector.V { return constant(1 / p[0]) },
		func(p []float64) vector.V { return constant(1e300 * p[0]) },
		func(p []float64) vector.V { return constant(1e-300 * p[0]) },
		func(p []float64) vector.V { return constant(math.Exp(1e3 * p[0])) },
		func(p []float64) vector.V { return vector.Linspace(0, p[0], n).Pow(p[0]) },
		func(p []float64) vector.V { return vector.Linspace(-p[0], p[0], n).Log() },
		func(p []float64) vector.V { return vector.V{Fault: strings.Repeat("x", 1000)} },
		func(p []float64) vector.V { // chaos
			rng := rand.New(rand.NewPCG(math.Float64bits(p[0]), 1))
			out := make([]float64, n)
			for i := range out {
				out[i] = math.Float64frombits(rng.Uint64())
			}
			return vector.Of(out)
		},
		func(p []float64) vector.V { // noise
			rng := rand.New(rand.NewPCG(math.Float64bits(p[0]), 1))
			return constant(rng.NormFloat64()).Add(vector.Linspace(0, rng.NormFloat64(), n))
		},
	}
	priors := []Prior{
		{Kind: Uniform, A: -1, B: 1}, {Kind: Uniform, A: 0, B: math.SmallestNonzeroFloat64}, {Kind: Uniform, A: -8e307, B: 8e307},
		{Kind: Uniform, A: 1, B: 1 + 1e-15}, {Kind: LogUniform, A: math.SmallestNonzeroFloat64, B: math.MaxFloat64},
		{Kind: Normal, A: 1e308, B: 1e308}, {Kind: Normal, A: 0, B: math.SmallestNonzeroFloat64}, {Kind: Normal, A: 1, B: 1e-9},
		{Kind: TruncatedNormal, A: -1e9, B: 1, Lo: 1, Hi: 2}, {Kind: TruncatedNormal, A: 0, B: 1, Lo: -math.MaxFloat64, Hi: math.MaxFloat64},
		{Kind: Fixed, A: 1}, {Kind: Fixed, A: -1e308},
	}
	for i, f := range functions {
		for j, prior := range priors {
			prior.Name = "a"
			p, fitted, err := functionOf(curve, systematics.Trend{}, Priors{prior}, []string{"a"}, f)
			if err != nil {
				if len(err.Error()) > 600 {
					t.Errorf("function %d, prior %d: error of %d bytes", i, j, len(err.Error()))
				}
				continue
			}
			if lo, hi := prior.limits(); prior.Kind != Fixed && !(p.Value[0] >= lo && p.Value[0] <= hi) {
				t.Errorf("function %d, prior %d: value %g", i, j, p.Value[0])
			}
			if len(fitted.Trend) != n || len(p.Cov) != len(p.Names) {
				t.Errorf("function %d, prior %d: %d values, %d rows", i, j, len(fitted.Trend), len(p.Cov))
			}
		}
	}
}
