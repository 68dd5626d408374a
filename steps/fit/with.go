package fit

import (
	"fmt"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/vector"
)

// WhiteWith fits a white light curve as [White] does, with a systematics model
// of the recipe's own: the flux is transit times f times the linear combination
// of the terms of setup.Trend.
//
// f gets the values of the parameters called names, in this order, and returns a
// value for each integration of the curve, in the order of curve.Time. The
// level of the flux is the trend's constant, so that f is relative and needs no
// factor of its own. It must depend on nothing but p and what stands fixed
// around it, such as the times. Parameters have rows in priors like any other,
// in any unit; of kind "=" they are held. Their names are not those of a
// parameter of the transit or the trend. In the posterior they come after
// those of the transit.
//
//	t := vector.Of(white.Time).Shift(-white.Time[0])
//	ramp := func(p []float64) vector.V {
//		return t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
//	}
//	geometry, whiteFit, err = fit.WhiteWith(white, setup, priors, []string{"hook", "hookTime"}, ramp)
//
// The search starts from the best of 64 points spread over the ranges of the
// function's priors (four standard deviations of normal ones). Derivatives are
// taken by central differences, over steps that change the model by a few
// hundredths of a standard deviation; log-uniform parameters are fitted as
// logarithms. A function with jumps, in time, is all right, but not one with
// jumps in its parameters.
//
// Errors: those of White; a name that is empty, repeated or taken; a parameter
// without a prior; a function that returns a fault, or another number of values
// than there are integrations, or NaN or infinities at usable samples (while the
// search goes on, such parameters are only avoided).
func WhiteWith(curve lightcurve.Curve, setup Setup, priors Priors, names []string, f func(p []float64) vector.V) (Posterior, CurveFit, error) {
	own, rest, err := withFunction(names, f, priors, nil)
	if err != nil {
		return Posterior{}, CurveFit{}, fmt.Errorf("%s: %w", whatWhite, err)
	}
	return white(curve, setup, rest, own)
}

// ChannelWith fits a spectroscopic channel as [Channel] does, with a systematics
// model of the recipe's own as in [WhiteWith]. Parameters of f that have a row in
// priors are the channel's own; they start from the white fit's values where it
// has them. Those without a row are held at the white fit's values, and what
// these leave uncertain of the depth is part of the point's ShiftGeometry.
//
// Errors: those of Channel, and of WhiteWith.
func ChannelWith(curve lightcurve.Curve, white Posterior, setup Setup, priors Priors, names []string, f func(p []float64) vector.V) (spectrum.Point, CurveFit, error) {
	own, rest, err := withFunction(names, f, priors, &white)
	if err != nil {
		return spectrum.Point{}, CurveFit{}, fmt.Errorf("%s: %w", whatChannel(curve.Channel), err)
	}
	return channel(curve, white, setup, rest, own)
}

// withFunction is newFunction beside a transit, whose names are taken.
func withFunction(names []string, f func(p []float64) vector.V, priors Priors, white *Posterior) (*function, Priors, error) {
	var known []string
	for _, p := range parameterNames {
		known = append(known, p.name)
	}
	for _, name := range names {
		if _, err := findName(name); err == nil {
			return nil, nil, fmt.Errorf("%s is a parameter of the transit or the trend; call that of the function otherwise", name)
		}
	}
	own, rest, err := newFunction(names, f, priors, white)
	if err != nil {
		return nil, nil, err
	}
	for _, p := range rest {
		if _, err := findName(p.Name); err != nil {
			return nil, nil, own.strange(p.Name, known)
		}
	}
	return own, rest, nil
}

// Function fits a light curve that is wholly the recipe's own, such as a
// transit of another shape, times a trend: the flux is f times the linear
// combination of the terms of trend. f and names are as in [WhiteWith], but any
// name will do, "settlingTime" apart where the trend has a settling term (which a
// row in priors leaves free).
//
// Where f is 1 out of transit, the curve fit's Transit is f and its Trend the
// rest, as with [White]; Mid is the parameter called midTransit, and NaN without
// one. The posterior has nothing derived. Errors are not multiplied.
//
// Errors: those of WhiteWith, as far as they apply; a row in priors for a
// parameter that is not among names.
func Function(curve lightcurve.Curve, trend systematics.Trend, priors Priors, names []string, f func(p []float64) vector.V) (Posterior, CurveFit, error) {
	const what = "fit of a function"
	fail := func(err error) (Posterior, CurveFit, error) {
		return Posterior{}, CurveFit{}, fmt.Errorf("%s: %w", what, err)
	}
	setup := Setup{Period: 1, AxisRatio: 10, Inclination: 90, RadiusRatio: 0.1, Trend: trend} // there is no transit; any will do
	if err := setup.check(what); err != nil {
		return Posterior{}, CurveFit{}, err
	}
	var known []string
	if trend.Settling {
		known = []string{"settlingTime"}
	}
	own, rest, err := newFunction(names, f, priors, nil)
	if err != nil {
		return fail(err)
	}
	for _, p := range rest {
		if p.Name != "settlingTime" || !trend.Settling {
			return fail(own.strange(p.Name, known))
		}
	}
	for _, name := range names {
		if name == "settlingTime" && trend.Settling {
			return fail(fmt.Errorf("settlingTime is a parameter of the trend; call that of the function otherwise"))
		}
	}
	space := newSpace(setup)
	if _, err := space.apply(rest, trend.Settling); err != nil {
		return fail(err)
	}
	m, err := newModel(curve, setup, space, own)
	if err != nil {
		return fail(err)
	}
	m.alone = true
	if len(m.used) < leastSamples {
		return fail(fmt.Errorf("%d usable samples of %d; expected at least %d", len(m.used), len(curve.Time), leastSamples))
	}
	if err := m.usableLevel(); err != nil {
		return fail(err)
	}
	if err := m.search(); err != nil {
		return fail(err)
	}
	s, err := m.solve([][slots]float64{space.value}, false)
	if err != nil {
		return fail(err)
	}
	curveFit, err := s.curveFit(curve)
	if err != nil {
		return fail(err)
	}
	return s.posterior(setup), curveFit, nil
}
