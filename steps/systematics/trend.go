// Package systematics describes what the instrument and the atmosphere do to a
// light curve: a trend that multiplies the transit.
//
// A [Trend] says which terms the trend has; its [Design] is the matrix of those
// terms for one light curve, one column per term, so that the trend is a linear
// combination of columns. The coefficients are found by the fit, jointly with
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
}

// check reports settings outside their range.
func (t Trend) check() error {
	if t.Polynomial < 0 || t.Polynomial > MaxPolynomial {
		return fmt.Errorf("systematics: polynomial of order %d in time; expected 0 to %d", t.Polynomial, MaxPolynomial)
	}
	if t.Settling && !(t.SettlingTime > 0 && t.SettlingTime < math.Inf(1)) {
		return fmt.Errorf("systematics: settling time %g d; expected a number above 0, for example 0.01", t.SettlingTime)
	}
	if n := len(t.Regressors); n > maxRegressors {
		return fmt.Errorf("systematics: %d regressors; expected at most %d", n, maxRegressors)
	}
	for i, name := range t.Regressors {
		if slices.Contains(t.Regressors[:i], name) {
			return fmt.Errorf("systematics: regressor %.40s is listed twice; list it once", name)
		}
	}
	return nil
}

// Formula writes the trend as an equation in words and symbols. Of a trend that
// [Trend.Design] refuses, it leaves out the orders and regressors that are too
// many.
func (t Trend) Formula() string {
	terms := []string{"c0"}
	for k := 1; k <= min(t.Polynomial, MaxPolynomial); k++ {
		if k == 1 {
			terms = append(terms, "c1 x")
		} else {
			terms = append(terms, fmt.Sprintf("c%d x^%d", k, k))
		}
	}
	if t.Settling {
		terms = append(terms, "s exp(-(t - t0)/settlingTime)")
	}
	for _, name := range t.Regressors[:min(len(t.Regressors), maxRegressors)] {
		terms = append(terms, "k_"+name+" z("+name+")")
	}
	text := strings.Join(terms, " + ")
	var where []string
	if t.Polynomial > 0 {
		where = append(where, "x is time scaled to [-1, 1]")
	}
	if t.Settling {
		where = append(where, "t0 is the first time")
	}
	if len(t.Regressors) > 0 {
		where = append(where, "z() is standardised to mean 0 and standard deviation 1")
	}
	if len(where) > 0 {
		text += ", where " + strings.Join(where, ", ")
	}
	return text
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
