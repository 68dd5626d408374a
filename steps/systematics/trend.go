// Package systematics describes what the instrument and the atmosphere do to a
// light curve: a trend that multiplies the transit.
//
// A [Trend] says which terms the trend has; its [Design] is the matrix of those
// terms for one light curve, one column per term, so that the trend is a linear
// combination of columns. Terms may also be added to the light of the star instead. The coefficients are found by the fit, jointly with
// the transit. Only the e-folding time of the settling term enters nonlinearly.
package systematics

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"rimlight/steps/lightcurve"
	"rimlight/steps/nearest"
)

// MaxPolynomial is the highest order of the polynomial in time.
const MaxPolynomial = 4

// maxRegressors is far above what any light curve can tell apart.
const maxRegressors = 64

// listed is how many names a message lists.
const listed = 20

// A Trend is a model of the systematics: a constant, a polynomial in time, an
// exponential settling after the start of the observation, and terms linear in
// auxiliary columns. The zero value is a constant. That such terms describe
// detector and pointing effects is common practice, no source.
type Trend struct {
	Polynomial   int      // order in time, 0 to 4
	Settling     bool     // whether there is a term exp(-(t-t0)/SettlingTime), t0 the first time of the curve
	SettlingTime float64  // e-folding time in days, above 0; the start value where the fit leaves it free
	Regressors   []string // names of auxiliary columns, each a linear term; at most 64
	Added        []string // names of auxiliary columns that add to the flux, such as that of the background, rather than multiply it; at most 64
}

// check reports settings outside their range.
func (t Trend) check() error {
	if t.Polynomial < 0 || t.Polynomial > MaxPolynomial {
		return fmt.Errorf("systematics: polynomial of order %d in time; expected 0 to %d", t.Polynomial, MaxPolynomial)
	}
	if t.Settling && !(t.SettlingTime > 0 && t.SettlingTime < math.Inf(1)) {
		return fmt.Errorf("systematics: settling time %g d; expected a number above 0, for example 0.01", t.SettlingTime)
	}
	for _, names := range [][]string{t.Regressors, t.Added} {
		if n := len(names); n > maxRegressors {
			return fmt.Errorf("systematics: %d regressors; expected at most %d", n, maxRegressors)
		}
		for i, name := range names {
			if slices.Contains(names[:i], name) {
				return fmt.Errorf("systematics: regressor %.40s is listed twice; list it once", name)
			}
		}
	}
	return nil
}

// aux finds the auxiliary column of the given name.
func aux(curve lightcurve.Curve, name string) ([]float64, error) {
	var known []string
	for _, s := range curve.Aux {
		if s.Name == name {
			if len(s.Value) != len(curve.Time) {
				return nil, fmt.Errorf("systematics: regressor %.40s has %d values; expected one for each of %d times", name, len(s.Value), len(curve.Time))
			}
			return s.Value, nil
		}
		known = append(known, fmt.Sprintf("%.40s", s.Name))
	}
	if len(known) == 0 {
		return nil, fmt.Errorf("systematics: no auxiliary column %.40s: the light curve has none; leave the list of regressors empty", name)
	}
	list := known
	if len(list) > listed {
		list = append(slices.Clone(list[:listed]), "...")
	}
	return nil, fmt.Errorf("systematics: no auxiliary column %.40s; expected one of %s%s", name,
		strings.Join(list, ", "), nearest.Hint(name, known))
}
