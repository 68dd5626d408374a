package fit

import (
	"errors"
	"fmt"
	"slices"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/vector"
)

// WhiteWith fits a white light curve as [White] does, with a systematics model
// of the recipe's own: the flux is transit times f times the linear combination
// of the terms of model.Trend.
//
// f gets the values of the parameters that model.Function names, in this order, and returns a
// value for each integration of the curve, in the order of curve.Time. The
// level of the flux is the trend's constant, so that f is relative and needs no
// factor of its own. It must depend on nothing but p and what stands fixed
// around it, such as the times. Parameters have rows in model.White like any other,
// in any unit; of kind "=" they are held. Their names are not those of a
// parameter of the transit or the trend. In the posterior they come after
// those of the transit.
//
//	t := vector.Of(white.Time).Shift(-white.Time[0])
//	ramp := func(p []float64) vector.V {
//		return t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
//	}
//	geometry, whiteFit, err = fit.WhiteWith(white, model, priors, []string{"hook", "hookTime"}, ramp)
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
func WhiteWith(curve lightcurve.Curve, model Model, f func(p []float64) vector.V) (Posterior, CurveFit, error) {
	own, err := withFunction(model, model.White, f, nil)
	if err != nil {
		return Posterior{}, CurveFit{}, fmt.Errorf("%s: %w", whatWhite, err)
	}
	return white(curve, model, own)
}

// ChannelWith fits a spectroscopic channel as [Channel] does, with a systematics
// model of the recipe's own as in [WhiteWith]. Parameters of f that have a row in
// model.Channel are the channel's own; they start from the white fit's values where it
// has them. Those without a row are held at the white fit's values, and what
// these leave uncertain of the depth is part of the point's ShiftGeometry.
//
// Errors: those of Channel, and of WhiteWith.
func ChannelWith(curve lightcurve.Curve, white Posterior, model Model, f func(p []float64) vector.V) (spectrum.Point, CurveFit, error) {
	own, err := withFunction(model, model.Channel, f, &white)
	if err != nil {
		return spectrum.Point{}, CurveFit{}, fmt.Errorf("%s: %w", whatChannel(curve.Channel), err)
	}
	return channel(curve, white, model, own)
}

// withFunction is newFunction with the names of the model, of which those of
// transit and noise are taken.
func withFunction(model Model, priors Priors, f func(p []float64) vector.V, white *Posterior) (*function, error) {
	if model.Alone {
		return nil, errors.New("the model has no transit; fit it with Function")
	}
	var known []string
	for _, p := range parameterNames {
		known = append(known, p.name)
	}
	for _, name := range model.Function {
		if _, err := findName(name); err == nil {
			return nil, fmt.Errorf("%s is a parameter of the transit, the trend or the noise; call that of the function otherwise", name)
		}
	}
	own, rest, err := newFunction(model.Function, f, priors, white)
	if err != nil {
		return nil, err
	}
	for _, p := range rest {
		if _, err := findName(p.Name); err != nil && !isTrend(p.Name) {
			return nil, own.strange(p.Name, known)
		}
	}
	return own, nil
}

// Function fits a light curve that is wholly the recipe's own, such as a
// transit of another shape, times a trend. Of the model, Trend, Function, Inflate
// and the priors White count; f is as in [WhiteWith], and any name will do for its
// parameters, but for those of trend and noise (settlingTime, errorScale, jitter).
//
// Where f is 1 out of transit, the curve fit's Transit is f and its Trend the
// rest, as with [White]; Mid is the parameter called midTransit, and NaN without
// one. The posterior has nothing derived.
//
// Errors: those of WhiteWith, as far as they apply; a row in the priors for a
// parameter that is neither the function's nor the noise's.
func Function(curve lightcurve.Curve, model Model, f func(p []float64) vector.V) (Posterior, CurveFit, error) {
	fail := func(err error) (Posterior, CurveFit, error) {
		return Posterior{}, CurveFit{}, fmt.Errorf("fit of a function: %w", err)
	}
	model, own, err := aloneFunction(model, f)
	if err != nil {
		return fail(err)
	}
	s, err := solveWhite(curve, &model, own)
	if err != nil {
		return fail(err)
	}
	curveFit, err := s.curveFit(curve)
	if err != nil {
		return fail(err)
	}
	return s.posterior(model), curveFit, nil
}

// aloneFunction is the function of a model without a transit, and that model with
// what is not used of it taken out.
func aloneFunction(model Model, f func(p []float64) vector.V) (Model, *function, error) {
	model = Model{
		Period: 1, AxisRatio: 10, Inclination: 90, RadiusRatio: 0.1, // there is no transit; any will do
		Trend: model.Trend, Function: model.Function, Alone: true, Inflate: model.Inflate, White: model.White,
	}
	known := []string{"errorScale", "jitter"}
	if model.Trend.Settling {
		known = append(known, "settlingTime")
	}
	for _, name := range model.Function {
		if slices.Contains(known, name) {
			return Model{}, nil, fmt.Errorf("%s is a parameter of the trend or the noise; call that of the function otherwise", name)
		}
	}
	own, rest, err := newFunction(model.Function, f, model.White, nil)
	if err != nil {
		return Model{}, nil, err
	}
	for _, p := range rest {
		if !slices.Contains(known, p.Name) && !isTrend(p.Name) {
			return Model{}, nil, own.strange(p.Name, known)
		}
	}
	return model, own, nil
}
