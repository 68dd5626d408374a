package surface

import (
	"math"
	"math/rand/v2"
	"reflect"
	"slices"

	"rimlight/steps/chain"
	"rimlight/steps/check"
	"rimlight/steps/diagnose"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/fits"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
	"rimlight/steps/limbtable"
	"rimlight/steps/noise"
	"rimlight/steps/orbit"
	"rimlight/steps/sample"
	"rimlight/steps/simulate"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/table"
	"rimlight/steps/transit"
	"rimlight/steps/vector"
)

// samples are valid values, which hostile ones are made from.
type samples struct {
	byType map[reflect.Type][]reflect.Value
	// Values that go together, by target: one list for each parameter, which may be
	// empty and be missing.
	own map[string][][]any
}

// of lists the samples for the parameter of a target.
func (s *samples) of(target string, parameter int, t reflect.Type) []reflect.Value {
	own := s.own[target]
	if parameter >= len(own) || len(own[parameter]) == 0 {
		return s.byType[t]
	}
	var all []reflect.Value
	for _, v := range own[parameter] {
		all = append(all, reflect.ValueOf(v))
	}
	return all
}

// asksForMuch reports whether a call is meant to take long: a simulation takes
// as long as the number of its samples and their parts has it, a sampler as long as
// it may evaluate its target, or as it has channels to sample.
func asksForMuch(args []reflect.Value) bool {
	const evaluations = 1e5
	starts, channels := 1.0, 0
	for _, a := range args {
		switch s := a.Interface().(type) {
		case [][]float64:
			starts = float64(len(s))
		case []lightcurve.Curve:
			channels = len(s)
		case fit.Sampling:
			return channels > 8
		case sample.NUTSSettings:
			return s.Evaluations == 0 || float64(s.Evaluations)*starts > evaluations
		case sample.EnsembleSettings:
			return s.WarmUp == 0 || s.Draws == 0 || (float64(s.WarmUp)+float64(s.Draws)*float64(max(1, s.Thin)))*starts > evaluations
		case sample.NestedSettings:
			return s.Evaluations == 0 || s.Evaluations > evaluations
		case simulate.Scenario:
			if s.Validate() == nil {
				parts := 1 + min(100, 40*s.AxisRatio/s.Period*s.Exposure/86400/math.Sqrt(max(s.Depth, 1e-6))*4)
				return float64(s.Integrations)*float64(s.Channels)*parts > 2e5
			}
		}
	}
	return false
}

// limbCSV is a limb-darkening table.
const limbCSV = `# law: quadratic
wave_lo,wave_hi,u1,u2,u1_err,u2_err
0.5,1.0,0.41,0.18,0.02,0.03
1.0,2.0,0.25,0.20,0.02,0.03
2.0,6.0,0.10,0.14,0.02,0.03
`

// intensityCSV and throughputCSV are a small stellar model and an instrument.
const (
	intensityCSV = `wave,mu,intensity
0.9,0.1,4
0.9,0.5,7
0.9,0.8,9
0.9,1,10
3.1,0.1,2
3.1,0.5,2.5
3.1,0.8,2.9
3.1,1,3
`
	throughputCSV = `wave,throughput
0.5,0
1.5,0.3
4,0.1
`
)

// newSamples reduces a small simulated observation and gathers everything that
// was passed on the way. It panics when a step of that fails.
func newSamples() *samples {
	scenario := simulate.Continuous(7)
	scenario.Integrations, scenario.Channels, scenario.DeadChannels = 72, 4, 1
	scenario.Cadence, scenario.Exposure = 290, 280
	settled := scenario
	settled.Integrations, settled.Channels = 12, 3
	cube, truth, err := simulate.Make(scenario)
	must(err)
	clean, err := lightcurve.MaskOutliers(cube, lightcurve.RunningMedian{Window: 11, Sigma: 5})
	must(err)
	white, err := lightcurve.White(clean)
	must(err)
	limbs, err := limbtable.Read([]byte(limbCSV))
	must(err)

	model := fit.Model{
		Period: scenario.Period, MidTransit: scenario.MidTransit, AxisRatio: scenario.AxisRatio,
		Inclination: scenario.Inclination, Periastron: 90, RadiusRatio: 0.115, Exposure: 280,
		LimbLaw: fit.LawQuadratic, LimbPolicy: fit.PolicyFree, Limb: limbs,
		Trend: systematics.Trend{Polynomial: 1, Regressors: []string{"X"}},
	}
	settling := model
	settling.Trend = systematics.Trend{Polynomial: 2, Settling: true, SettlingTime: 0.02}
	settling.LimbPolicy = fit.PolicyPrior
	whitePriors := fit.Priors{
		{Name: "midTransitOffset", Kind: fit.Uniform, A: -0.05, B: 0.05, Unit: "d"},
		{Name: "axisRatio", Kind: fit.TruncatedNormal, A: 9.5, B: 0.3, Lo: 5, Hi: 15},
		{Name: "impact", Kind: fit.Uniform, A: 0, B: 1.2},
		{Name: "radiusRatio", Kind: fit.LogUniform, A: 0.01, B: 0.5},
		{Name: "q1", Kind: fit.Uniform, A: 0, B: 1},
		{Name: "q2", Kind: fit.Normal, A: 0.3, B: 0.1},
		{Name: "period", Kind: fit.Fixed, A: scenario.Period, Unit: "d"},
	}
	otherPriors := fit.Priors{
		{Name: "midTransit", Kind: fit.Normal, A: scenario.MidTransit, B: 0.01, Unit: "d"},
		{Name: "period", Kind: fit.Normal, A: scenario.Period, B: 1e-4, Unit: "d"},
		{Name: "inclination", Kind: fit.Uniform, A: 80, B: 90, Unit: "deg"},
		{Name: "eccentricity", Kind: fit.Uniform, A: 0, B: 0.3},
		{Name: "periastron", Kind: fit.Fixed, A: 80, Unit: "deg"},
		{Name: "radiusRatio", Kind: fit.TruncatedNormal, A: 0.11, B: 0.1, Lo: 0.01, Hi: 0.3},
		{Name: "u1", Kind: fit.Normal, A: 0.3, B: 0.2},
		{Name: "settlingTime", Kind: fit.LogUniform, A: 0.002, B: 0.2, Unit: "d"},
	}
	channelPriors := fit.Priors{
		{Name: "radiusRatio", Kind: fit.Uniform, A: 0.001, B: 0.5},
		{Name: "u1", Kind: fit.Uniform, A: -2, B: 3},
		{Name: "u2", Kind: fit.Uniform, A: -2, B: 3},
	}
	model.White, model.Channel, settling.White, settling.Channel = whitePriors, channelPriors, otherPriors, channelPriors
	posterior, whiteFit, err := fit.White(white, model)
	must(err)
	curves := lightcurve.Curves(clean)
	var points []spectrum.Point
	var curveFits []fit.CurveFit
	for _, c := range curves {
		p, f, err := fit.Channel(c, posterior, model)
		must(err)
		points, curveFits = append(points, p), append(curveFits, f)
	}
	fewDraws, marginal := fit.Sampling{Effective: 100, Compared: 1}, model
	marginal.Channel = append(slices.Clone(model.Channel), fit.Prior{Name: "errorScale", Kind: fit.LogUniform, A: 0.01, B: 100})
	_, sampled, err := fit.Channels(curves, posterior, model, fewDraws)
	must(err)
	var summaries []diagnose.Summary
	for _, f := range curveFits {
		s, err := diagnose.Summarise(f)
		must(err)
		summaries = append(summaries, s)
	}
	spec, err := spectrum.Assemble(points, fit.SharedCovariance(points, posterior))
	must(err)
	fig, err := figure.WhiteFit(whiteFit)
	must(err)
	binning, err := lightcurve.Binned(white.Flux)
	must(err)
	fitsFile, err := lightcurve.WriteFITS(cube)
	must(err)
	withComparison, err := lightcurve.WriteFITSComparison(cube, cube)
	must(err)
	series, channels, err := lightcurve.WriteCSV(cube)
	must(err)
	path := orbit.Orbit{Period: 3.2, MidTransit: 2460512.35, AxisRatio: 9.5, Inclination: 1.53, Eccentricity: 0.1, Periastron: 1}
	elements, err := path.Elements(orbit.Basis{Size: orbit.ByDuration, Tilt: orbit.ByImpact, Shape: orbit.ByRoot}, 0.1)
	must(err)
	ephemeris := orbit.Ephemeris{MidTransit: 2460512.35, Period: 3.2, MidTransitErr: 3e-4, PeriodErr: 1e-6, Covariance: -1e-11}
	columns := lightcurve.Columns{
		{Role: "TIME", Unit: "d", Offset: 2400000.5},
		{Role: "FLUX_ERR", Name: ""},
		{Role: "drift", Name: "X"},
	}

	intensities, err := limbtable.ReadIntensities([]byte(intensityCSV))
	must(err)
	throughput, err := limbtable.ReadThroughput([]byte(throughputCSV))
	must(err)
	profile, err := limbtable.Band(intensities, throughput, 1, 3, limbtable.Photons)
	must(err)
	choice := limbtable.Choice{Law: limb.Power2, Grid: limbtable.GridRadius, Points: 50, MuCut: 0.2, Weight: limbtable.WeightArea}
	channelsOf := []lightcurve.Channel{{Index: 0, Lo: 1, Hi: 1.5}, {Index: 1, Lo: 1.5, Hi: 3}}
	var limbFITS fits.Writer
	must(limbFITS.Table("LIMB", []fits.NewColumn{
		{Name: "WAVE_LO", Unit: "um", Values: []float64{0.5, 1}}, {Name: "WAVE_HI", Unit: "um", Values: []float64{1, 6}},
		{Name: "U1", Values: []float64{0.4, 0.2}}, {Name: "U2", Values: []float64{0.2, 0.2}},
	}, fits.StringCard("LIMBLAW", "quadratic", "")))
	// A ramp is a model of a recipe's own.
	times := vector.Of(white.Time).Shift(-white.Time[0])
	ramp := func(p []float64) vector.V {
		if len(p) < 2 {
			return times
		}
		return times.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
	}
	noiseData, _, err := noise.FromCurve(curves[0], 1)
	must(err)
	noiseModels := []any{
		noise.White(true, true).Plus(noise.NewTerm("red", noise.Matern32)),
		noise.White(true, false).Plus(noise.NewTerm("red", noise.Oscillator)),
		noise.White(false, true).Plus(noise.NewTerm("gp", noise.SquaredExponential, "time")),
		noise.White(true, true).Plus(noise.NewTerm("gp", noise.Matern52, "time")),
	}
	var noiseProcesses, noiseCovariances []any
	values := [][]float64{{1, 1e-4, 3e-4, 0.02}, {1, 3e-4, 0.02, 3}, {1e-4, 3e-4, 0.02}, {1, 1e-4, 3e-4, 0.02}}
	for k, m := range noiseModels {
		p, err := noise.New(m.(noise.Model), noiseData)
		must(err)
		c, err := p.At(values[k])
		must(err)
		noiseProcesses, noiseCovariances = append(noiseProcesses, p), append(noiseCovariances, c)
	}
	residual := make([]float64, len(noiseData.Time))
	for i := range residual {
		residual[i] = 1e-4 * float64(i%7-3)
	}
	allOf := func(x [][]float64) (out []any) {
		for _, v := range x {
			out = append(out, v)
		}
		return out
	}
	detector := noise.Detector{Gain: 1.5, ReadNoise: 5, Pixels: 20, Background: 3}
	evenly := make([]float64, 64)
	for i := range evenly {
		evenly[i] = float64(i%5 - 2)
	}
	names := []string{"hook", "hookTime"}
	parameters := []sample.Parameter{{Name: "a", Lo: 0, Hi: 1}, {Name: "b", Unit: "d"}}
	target := func(x, gradient []float64) float64 {
		if len(x) < 2 || len(gradient) < 2 {
			return 0
		}
		gradient[0], gradient[1] = 1, -x[1]
		return x[0] - x[1]*x[1]/2
	}
	density := func(x []float64) float64 { return target(x, make([]float64, len(x))) }
	prior := func(u []float64) []float64 { return u }
	proposal := sample.StudentT{Mean: []float64{0.5, 0}, Scale: [][]float64{{0.1, 0}, {0, 1}}, Degrees: 5}
	starts, err := sample.Around(parameters, proposal.Mean, []float64{0.1, 1}, 8, 1)
	must(err)
	draws, weighted, column := newDraws(rand.New(rand.NewPCG(1, 2)))
	hook := fit.Priors{
		{Name: "hook", Kind: fit.Normal, A: 0, B: 0.01},
		{Name: "hookTime", Kind: fit.LogUniform, A: 0.002, B: 0.2, Unit: "d"},
	}
	few, nuts := model, fit.Sampler{Method: fit.SamplerNUTS, Chains: 1, WarmUp: 10, Draws: 10}
	few.White = fit.Priors{{Name: "radiusRatio", Kind: fit.Uniform, A: 0.05, B: 0.2}, {Name: "u1", Kind: fit.Normal, A: 0.4, B: 0.1}}
	with, alone := model, fit.Model{Trend: model.Trend, White: hook, Function: names}
	ramps := alone
	ramps.Alone = true
	with.White, with.Channel, with.Function = append(slices.Clone(whitePriors), hook...), append(slices.Clone(channelPriors), hook...), names

	s := &samples{byType: map[reflect.Type][]reflect.Value{}, own: map[string][][]any{
		"fit.White":                {{white, curves[0]}, {model, settling}},
		"fit.WhiteOrbit":           {{white}, {model, settling}, {"fitted", "published", "tested"}},
		"fit.Channel":              {{curves[0], curves[1]}, {posterior}, {model, settling}},
		"fit.Channels":             {{curves, curves[:2]}, {posterior}, {model, settling, marginal}, {fewDraws, fit.Sampling{Effective: 100, Compared: -1}}},
		"fit.GeometryDraws":        {{posterior}, {model}, {8, 20}},
		"fit.ChannelsOverGeometry": {{curves[:1]}, {posterior}, {model}, {fewDraws}, {8}},
		"fit.ChannelCurves":        {{curves}, {sampled}, {posterior}, {model}},
		"fit.WhiteWith":            {{white}, {with}, {ramp}},
		"fit.ChannelWith":          {{curves[0], curves[1]}, {posterior}, {with}, {ramp}},
		"fit.Function":             {{white}, {with, alone}, {ramp}},
		"fit.Sample":               {{curves[0]}, {few, fit.Model{White: hook}}, {fit.Sampler{}, nuts, fit.Sampler{Method: fit.SamplerEnsemble, WarmUp: 10, Draws: 10}}},
		"fit.SampleWith":           {{curves[0]}, {ramps}, {ramp}, {fit.Sampler{}, nuts}},

		"orbit.FitEphemeris":           {{[]int{0, 3, 10}}, {[]float64{100.2, 109.8, 132.3}}, {[]float64{0.001, 0.002, 0.001}}},
		"orbit.Ephemeris.Timings":      {{ephemeris}, {[]float64{2460512.4, 2460525.1}}, {[]float64{0.001, 0}}},
		"orbit.Ephemeris.Move":         {{ephemeris}, {7, -20}},
		"orbit.Ephemeris.Predict":      {{ephemeris}, {7, -20}},
		"orbit.Ephemeris.Number":       {{ephemeris}, {2460512.4}},
		"orbit.Orbit.Visit":            {{path}, {3, -1}, {0.01}},
		"orbit.Orbit.Eclipse":          {{path}, {0.1}},
		"orbit.Orbit.Elements":         {{path}, {orbit.Basis{}, elements.Basis}, {0.1}},
		"orbit.Orbit.DurationGradient": {{path}, {0.1}},

		"limb.Count":      {{limb.Power2, limb.FourParameter}},
		"limb.New":        {{limb.Power2, limb.SquareRoot}, {[]float64{0.6, 0.7}}},
		"limb.FromSquare": {{limb.Quadratic, limb.Power2}, {0.2, 0.7}, {0.3, 0.6}},
		"limb.FromRoot":   {{limb.SquareRoot, limb.Power2}, {0.2, 0.7}, {0.3, 0.6}},
		"limb.ToSquare":   {{limb.Logarithmic, limb.Power2}, {0.4, 0.7}, {0.3, 0.6}},
		"limb.FromHalf":   {{}, {0.4, 0.7}, {0.1, 0.3}},

		"sample.NUTS":       {{parameters}, {target}, {starts[:2]}, {sample.NUTSSettings{Seed: 1, WarmUp: 30, Draws: 20, Evaluations: 20000}}},
		"sample.Ensemble":   {{parameters}, {density}, {starts}, {sample.EnsembleSettings{Seed: 1, WarmUp: 10, Draws: 20, Differential: 0.3}}},
		"sample.Nested":     {{parameters}, {prior}, {density}, {sample.NestedSettings{Seed: 1, Live: 25, Evaluations: 20000}}},
		"sample.Importance": {{parameters}, {density}, {proposal}, {100}},
		"sample.Around":     {{parameters}, {proposal.Mean}, {[]float64{0.1, 2}}, {2, 10}},

		"chain.RHat":                {{column}, {1, 2, 4}},
		"chain.NestedRHat":          {{column}, {2, 4}, {1, 2}},
		"chain.BulkESS":             {{column}, {1, 2, 4}},
		"chain.TailESS":             {{column}, {1, 2, 4}},
		"chain.MeanESS":             {{column}, {1, 2, 4}},
		"chain.MeanError":           {{column}, {1, 2, 4}},
		"chain.SDError":             {{column}, {1, 2, 4}},
		"chain.AutocorrelationTime": {{column}, {1, 2, 4}},
		"chain.EnergyFraction":      {{column}, {1, 2, 4}},
		"chain.QuantileESS":         {{column}, {1, 2, 4}, {0.05, 0.5}},
		"chain.QuantileError":       {{column}, {1, 2, 4}, {0.05, 0.5}},
		"chain.ParetoSmooth":        {{column}},
		"chain.WeightESS":           {{column}},
		"chain.LogMeanWeight":       {{column}},
		"chain.WeightedQuantile":    {{column}, {column}, {0.5, 0.975}},
		"chain.Resample":            {{weighted}, {1, 50}},
		"chain.Draws.Column":        {{draws}, {"a", "b"}},
		"chain.Weighted.Column":     {{weighted}, {"a", "b"}},

		"noise.New":                     {noiseModels, {noiseData}},
		"noise.NewTerm":                 {{"red", "b"}, {noise.Exponential, noise.Oscillator}, {[]string(nil), []string{"time"}}},
		"noise.FromCurve":               {{white, curves[0]}, {1.0, 3.0}},
		"noise.Model.Parameters":        {noiseModels},
		"noise.Process.LogLikelihood":   {noiseProcesses, allOf(values), {residual}},
		"noise.Process.Gradient":        {noiseProcesses, allOf(values), {residual}},
		"noise.Process.GradientInto":    {noiseProcesses, {&noise.Gradient{}}, allOf(values), {residual}},
		"noise.Process.At":              {noiseProcesses, allOf(values)},
		"noise.Covariance.Whiten":       {noiseCovariances, {[][]float64{residual, noiseData.Time}}},
		"noise.Covariance.Colour":       {noiseCovariances, {[][]float64{residual, noiseData.Time}}},
		"noise.Covariance.Solve":        {noiseCovariances, {[][]float64{residual, noiseData.Time}}},
		"noise.Covariance.Draw":         {noiseCovariances},
		"noise.Covariance.Predict":      {noiseCovariances, {residual}, {noiseData}, {"", "red", "gp"}},
		"noise.Covariance.LeastSquares": {noiseCovariances, {[][]float64{residual, noiseData.Time}}, {residual}},
		"noise.AverageTable":            {{noiseData.Time}, {residual}},
		"noise.TimeAveraging":           {{noiseData.Time}, {residual}, {5.0, 10.0}, {30.0, 60.0}},
		"noise.Inflate":                 {{noiseData.Time}, {residual}, {noiseData.Err}, {0, 3}, {5.0, 10.0}, {30.0, 60.0}},
		"noise.Shift":                   {{residual}, {residual}},
		"noise.Shifts":                  {{24, 50}, {0, 7}},
		"noise.Wavelet.Gradient":        {{noise.Wavelet{Red: 1, White: 2}}, {evenly}},
		"noise.Wavelet.LogLikelihood":   {{noise.Wavelet{Red: 1, White: 2}}, {evenly}},
		"noise.Detector.Expected":       {{detector}, {1e4, 100.0}},
		"noise.Detector.Above":          {{detector}, {1e4, 100.0}, {residual}},

		"lightcurve.Exclude":     {{}, {scenario.Start, scenario.Start + 0.1}, {scenario.MidTransit, scenario.MidTransit + 1}},
		"lightcurve.SkipStart":   {{}, {0.0, 10.0, 60.0}},
		"diagnose.TimeAveraging": {{whiteFit, curveFits[0]}, {5.0, 10.0}, {30.0, 60.0}},
		"spectrum.Assemble":      {{points}, {[][]float64(nil), fit.SharedCovariance(points, posterior)}},
		"figure.Detrended":       {{summaries}},
		"simulate.Make":          {{scenario, settled}},

		"lightcurve.ReadFITS":           {{fitsFile, withComparison}},
		"lightcurve.ReadFITSComparison": {{withComparison}},
		"lightcurve.ReadCSV":            {{series}, {channels}},
		"limbtable.Read":                {{[]byte(limbCSV), limbFITS.Bytes()}},
		"limbtable.ReadIntensities":     {{[]byte(intensityCSV)}},
		"limbtable.ReadThroughput":      {{[]byte(throughputCSV)}},
		"limbtable.Band":                {{intensities}, {throughput, limbtable.Throughput{}}, {1.0, 1.5}, {2.0, 3.0}, {limbtable.Photons, limbtable.Energy}},
		"limbtable.SteepestEdge":        {{profile}},
		"limbtable.Table.LawAt":         {{limbs}, {1.0, 1.5}, {2.0, 3.0}},
		"limbtable.FitLaw":              {{profile}, {limbtable.Choice{}, choice}},
		"limbtable.Coefficients":        {{intensities}, {throughput}, {channelsOf}, {limbtable.Photons}, {limbtable.Choice{}, choice}},
		"spectrum.ReadCSV":              {{spectrum.CSV(spec)}},
	}}
	for _, v := range []any{
		limb.Law{Name: limb.Power2, Coefficients: []float64{0.6, 0.7}}, limb.Law{Name: limb.FourParameter, Coefficients: []float64{0.5, 0.3, -0.4, 0.2}},
		elements, ephemeris, intensities, throughput, profile, choice,
		cube, clean, curves, white, truth, scenario, simulate.Scenario{}, columns, lightcurve.Columns{}, lightcurve.Columns(nil),
		lightcurve.RunningMedian{Window: 11, Sigma: 4}, binning, limbs, model, settling, whitePriors, channelPriors,
		posterior, whiteFit, curveFits, summaries, points, spec, fig, path, spec.Summary(), spectrum.Table(spec), table.Table{},
		transit.Params{Orbit: path, RadiusRatio: 0.12, Law: limb.Law{Name: limb.Quadratic, Coefficients: []float64{0.3, 0.2}}, Exposure: 280},
		diagnose.FitChecks("white light", posterior), []check.Check{},
		[]spectrum.Note{{Name: "title", Text: "An invented planet"}, {Name: "by", Text: "no one"}},
		fitsFile, series, spectrum.CSV(spec),
		draws, []chain.Draws{draws, draws}, weighted, sample.Evidence{LogZ: -3, Err: 0.1, Live: 25, RankP: 0.3},
		noiseData, detector, noiseModels[0], noiseProcesses[0], noiseCovariances[1], noise.Averages{}, noise.Beta{Value: 1.2},
		times, times.Sin(), vector.Of(white.Flux), times.Less(0.1), vector.Used(white.Mask),
	} {
		s.add(reflect.ValueOf(v), 0)
	}
	return s
}

// newDraws makes two chains of two parameters, weighted draws of the same, and a
// column that can be cut in up to four chains.
func newDraws(rng *rand.Rand) (chain.Draws, chain.Weighted, []float64) {
	d := chain.Draws{Names: []string{"a", "b"}, Units: []string{"d", ""}, Chains: 2, Length: 24}
	w := chain.Weighted{Names: d.Names, Units: d.Units}
	var column []float64
	for range d.Chains * d.Length {
		a, b := rng.NormFloat64(), rng.NormFloat64()
		d.X, w.X = append(d.X, a, a+b), append(w.X, a, a+b)
		d.LogDensity, w.LogWeight = append(d.LogDensity, -a*a-b*b), append(w.LogWeight, a)
		d.Energy, d.Divergent, d.Steps = append(d.Energy, a*a+b*b), append(d.Divergent, a > 2), append(d.Steps, 7)
		column = append(column, b)
	}
	return d, w, column
}

// add keeps v and the values of composed types inside it, a few of each type.
func (s *samples) add(v reflect.Value, depth int) {
	if depth > 4 {
		return
	}
	kind := v.Kind()
	if kind != reflect.Struct && kind != reflect.Slice || depth > 0 && len(s.byType[v.Type()]) >= 12 {
		return
	}
	s.byType[v.Type()] = append(s.byType[v.Type()], v)
	if kind == reflect.Struct {
		for i := range v.NumField() {
			s.add(v.Field(i), depth+1)
		}
		return
	}
	for i := range min(v.Len(), 4) {
		s.add(v.Index(i), depth+1)
	}
}

func must(err error) {
	if err != nil {
		panic("samples: " + err.Error())
	}
}
