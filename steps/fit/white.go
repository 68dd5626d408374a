package fit

import (
	"errors"
	"fmt"

	"rimlight/steps/lightcurve"
)

// whatWhite starts the messages of a white fit.
const whatWhite = "white fit"

// Least numbers of usable samples of a fit.
const (
	leastSamples   = 50 // altogether
	leastInTransit = 10 // in transit, and as many out of it
)

// White fits transit and systematics to a white light curve of n integrations.
//
// Every parameter that priors names with a kind other than "=" is free; the
// others are held at the priors' or else the model's values. Names are period
// (d), midTransit (BJD_TDB, d) or midTransitOffset (d, from model.MidTransit),
// axisRatio, inclination (deg) or impact, eccentricity, periastron (deg),
// radiusRatio, u1 and u2 or q1 and q2 (the unit square of limb.FromSquare), and
// settlingTime (d). The coefficients of the trend are always free and come last
// in the posterior, under names such as "trend.constant", in units of the curve's
// median flux. Limb darkening follows the priors where they name it, and
// otherwise model.LimbPolicy.
//
// The maximum of the posterior is found by the Levenberg-Marquardt method from
// several starts, after a scan in mid-transit time over its prior range (0.05 d
// to either side at most). Normal priors are further residuals; uniform and
// log-uniform ones are limits. The covariance is the inverse of the curvature
// there, limits left out of account; a parameter that the data do not determine
// has the variance of its prior range, and a warning. Inclinations are reported
// at or below 90 deg. Chi2 is that of the samples with the errors as given;
// where model.Inflate applies, the errors of the curve fit and the covariance
// are the multiplied ones.
//
// Errors: settings or priors out of range, unknown or contradictory names, a
// trend that does not fit the curve (see systematics.Trend.Design), fewer than
// 50 usable samples.
func White(curve lightcurve.Curve, model Model) (Posterior, CurveFit, error) {
	if err := model.plain(); err != nil {
		return Posterior{}, CurveFit{}, fmt.Errorf("%s: %w", whatWhite, err)
	}
	return white(curve, model, nil)
}

// white is White with a function of the recipe, or nil.
func white(curve lightcurve.Curve, model Model, own *function) (Posterior, CurveFit, error) {
	s, err := solveWhite(curve, &model, own)
	if err != nil {
		return Posterior{}, CurveFit{}, fmt.Errorf("%s: %w", whatWhite, err)
	}
	curveFit, err := s.curveFit(curve)
	if err != nil {
		return Posterior{}, CurveFit{}, fmt.Errorf("%s: %w", whatWhite, err)
	}
	return s.posterior(model), curveFit, nil
}

// solveWhite fits a single curve, after filling the defaults of the model.
func solveWhite(curve lightcurve.Curve, model *Model, own *function) (*solution, error) {
	if err := model.check(); err != nil {
		return nil, err
	}
	rows, warnings := without(model.White, own), []string(nil)
	if !model.Alone {
		var err error
		if rows, warnings, err = limbRows(rows, *model, curve.Channel, false); err != nil {
			return nil, err
		}
	}
	space := newSpace(*model)
	unused, err := space.apply(rows, model.Trend.Settling)
	if err != nil {
		return nil, err
	}
	m, err := newObjective(curve, *model, space, own)
	if err != nil {
		return nil, err
	}
	if len(m.used) < leastSamples {
		return nil, fmt.Errorf("%d usable samples of %d; expected at least %d", len(m.used), len(curve.Time), leastSamples)
	}
	if err := m.usableLevel(); err != nil {
		return nil, err
	}
	if err := m.search(); err != nil {
		return nil, err
	}
	starts := [][slots]float64{space.value}
	if !model.Alone {
		starts = m.starts()
	}
	s, err := m.solve(starts, model.Inflate)
	if err != nil {
		return nil, err
	}
	s.warnings = append(append(warnings, unused...), s.warnings...)
	if reason, err := m.coverage(&s.v); err != nil {
		return nil, err
	} else if reason != "" {
		s.warnings = append(s.warnings, reason)
	}
	return s, nil
}

// usableLevel reports a median flux that cannot be divided by.
func (m *objective) usableLevel() error {
	if !(m.level > 0) {
		return errors.New("the median flux is not above zero; there is no starlight to fit")
	}
	return nil
}

// coverage says what is wrong with the usable samples' cover of transit and
// baseline, or "".
func (m *objective) coverage(v *[slots]float64) (string, error) {
	if m.alone {
		return "", nil
	}
	flux, err := m.transit(v)
	if err != nil {
		return "", err
	}
	in := 0
	for _, f := range flux {
		if f < 1 {
			in++
		}
	}
	if in < leastInTransit {
		return fmt.Sprintf("only %d usable samples in transit; at least %d are needed", in, leastInTransit), nil
	}
	if out := len(flux) - in; out < leastInTransit {
		return fmt.Sprintf("only %d usable samples out of transit; at least %d are needed", out, leastInTransit), nil
	}
	return "", nil
}
