package fit

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/lightcurve"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// degenerate is the correlation of two parameters above which a warning is
// given.
const degenerate = 0.999

// A solution is a fitted model with the errors of its parameters, all in
// coordinates.
type solution struct {
	minimum
	model      *model
	v          [slots]float64 // all coordinates at the minimum
	own        []float64      // the same of the recipe's function
	cov        [][]float64    // of the vector of the fit
	determined []bool
	triangle   *triangle
	chi2       float64 // of the samples, with the errors as given
	dof        int
	inflation  float64 // what errors were multiplied by
	warnings   []string
}

// best fits the model from each start, roughly if there are several, and returns
// the best minimum.
func (m *model) best(starts [][slots]float64) (minimum, error) {
	var best minimum
	found := false
	for _, v := range starts {
		m.space.value = v
		coefficients, _, err := m.solveTrend(&v)
		if err != nil {
			return minimum{}, err
		}
		x := make([]float64, 0, m.size())
		for _, slot := range m.space.free {
			x = append(x, v[slot])
		}
		if m.own != nil {
			x = append(x, m.own.at()...)
		}
		p := m.problem()
		if len(starts) > 1 {
			p.absolute, p.rough = roughChi2, true
		}
		got := p.solve(append(x, coefficients...))
		if got.status != statusInvalid && (!found || got.sum < best.sum*(1-1e-9)) {
			best, found = got, true
		}
	}
	if m.own != nil && m.own.err != nil {
		return minimum{}, m.own.err
	}
	switch {
	case found && len(starts) > 1 && best.status == statusConverged:
		got := m.problem().solve(best.x)
		got.steps += best.steps
		return got, nil
	case found:
		return best, nil
	case m.err != nil:
		return minimum{}, fmt.Errorf("the transit model cannot be computed at the start values: %w", m.err)
	}
	return minimum{}, errors.New("the model is not finite at the start values")
}

// solve fits the model and works out the errors.
func (m *model) solve(starts [][slots]float64, inflate bool) (*solution, error) {
	got, err := m.best(starts)
	if err != nil {
		return nil, err
	}
	s := &solution{minimum: got, model: m, dof: len(m.used) - m.size(), inflation: 1}
	s.chi2 = m.sampleSum(got.res)
	if reduced := s.chi2 / float64(s.dof); inflate && s.dof > 0 && reduced > 1 {
		s.inflation = math.Sqrt(reduced)
		m.scale = s.inflation
		s.minimum = m.problem().solve(got.x)
		s.chi2 = m.sampleSum(s.res) * m.scale * m.scale
	}
	v, own, coefficients := m.unpack(s.x)
	s.v, s.own = *v, own
	m.setTrend(v, own, coefficients) // the last evaluation may have been of a rejected step
	if m.own != nil && m.own.err != nil {
		return nil, m.own.err
	}
	none := make([]bool, m.size())
	s.triangle = factorise(s.jac, s.res, none, columns(m.size(), m.rows()))
	s.cov, s.determined = s.triangle.covariance()
	s.widen()
	s.warn()
	return s, nil
}

func (m *model) sampleSum(res []float64) float64 {
	sum := 0.0
	for _, r := range res[:len(m.used)] {
		sum += r * r
	}
	return sum
}

// widen gives parameters that the data do not determine the variance of their
// prior range, or infinity where that is unlimited.
func (s *solution) widen() {
	for k, ok := range s.determined {
		if ok {
			continue
		}
		s.cov[k][k] = math.Inf(1)
		if k < s.model.leading() {
			lo, hi := s.model.limits(k)
			s.cov[k][k] = (hi - lo) * (hi - lo) / 12
		}
	}
}

// name is what element k of the vector of the fit is called.
func (s *solution) name(k int) string {
	free, leading := s.model.space.free, s.model.leading()
	switch {
	case k < len(free):
		return s.model.space.name[free[k]]
	case k < leading:
		own := s.model.own
		return own.names[own.free[k-len(free)]]
	}
	return trendPrefix + s.model.design.Names[k-leading]
}

// value is element k of the vector of the fit as a named value, and its
// derivative in the element.
func (s *solution) value(k int) (value, slope float64) {
	free := s.model.space.free
	switch {
	case k < len(free):
		return s.model.space.named(free[k], s.x[k])
	case k < s.model.leading():
		return s.model.own.named(s.model.own.free[k-len(free)], s.x[k])
	}
	return s.x[k], 1
}

// warn collects what a reader should know of the fit.
func (s *solution) warn() {
	s.warnings = append(s.warnings, s.model.design.Warnings...)
	for k := range s.model.leading() {
		lo, hi := s.model.limits(k)
		if s.x[k] <= lo || s.x[k] >= hi {
			value, _ := s.value(k)
			s.warnings = append(s.warnings, fmt.Sprintf("%s is at the end of its range, %.6g", s.name(k), value))
		}
	}
	for k, ok := range s.determined {
		if !ok {
			s.warnings = append(s.warnings, s.name(k)+" is not determined by the data")
		}
		for l := range k {
			if r := s.cov[k][l] / math.Sqrt(s.cov[k][k]*s.cov[l][l]); math.Abs(r) > degenerate {
				s.warnings = append(s.warnings, fmt.Sprintf("%s and %s have correlation %.5f: the data hardly tell them apart", s.name(l), s.name(k), r))
			}
		}
	}
	if s.inflation > 1 {
		s.warnings = append(s.warnings, fmt.Sprintf("errors were multiplied by %.4f, the root of the reduced chi-square", s.inflation))
	}
	if s.status != statusConverged {
		s.warnings = append(s.warnings, "the fit did not converge: "+s.status)
	}
}

// curveFit evaluates the solution at every integration of the curve.
func (s *solution) curveFit(curve lightcurve.Curve) (CurveFit, error) {
	m := s.model
	params := m.space.physical(&s.v)
	coefficients := s.x[m.leading():]
	level := m.level * coefficients[0]
	n := len(curve.Time)
	out := CurveFit{
		Channel: curve.Channel,
		Time:    slices.Clone(curve.Time),
		Flux:    make([]float64, n),
		Err:     make([]float64, n),
		Mask:    slices.Clone(curve.Mask),
		Trend:   make([]float64, n),
		Level:   level,
		Mid:     params.Orbit.MidTransit,
	}
	for k, column := range m.design.Columns {
		if k == m.design.Settling {
			column = systematics.Settle(curve.Time, m.design.Start, math.Exp(s.v[slotSettling]))
		}
		for i, b := range column {
			out.Trend[i] += coefficients[k] / coefficients[0] * b
		}
	}
	var err error
	if out.Transit, err = s.shape(curve.Time, out.Trend); err != nil {
		return CurveFit{}, err
	}
	if m.alone {
		out.Mid = m.own.midTransit(s.own)
	}
	for i := range n {
		out.Flux[i] = curve.Flux[i] / level
		out.Err[i] = curve.Err[i] * s.inflation / level
	}
	next := 0 // samples that could not be used although not masked get a reason
	for i := range out.Mask {
		if next < len(m.used) && m.used[next] == i {
			next++
		} else if out.Mask[i] == 0 {
			out.Mask[i] = lightcurve.Missing
		}
	}
	return out, nil
}

// shape returns the transit, and multiplies the trend by the recipe's function;
// where that is alone, it stands in for the transit.
func (s *solution) shape(times, trend []float64) (flux []float64, err error) {
	m := s.model
	var factor []float64
	if m.own != nil {
		if factor = m.own.whole(s.own); factor == nil {
			return nil, m.own.fault()
		}
	}
	if m.alone {
		return slices.Clone(factor), nil
	}
	if m.own != nil {
		floats.Mul(trend, factor)
	}
	return transit.Curve(times, m.space.physical(&s.v))
}

// scatter is the standard deviation of the relative residuals.
func (s *solution) scatter() float64 {
	c0 := s.x[s.model.leading()]
	sum := 0.0
	for i := range s.model.used {
		r := s.res[i] * s.model.scale / s.model.weight[i] / c0
		sum += r * r
	}
	return math.Sqrt(sum / float64(max(1, s.dof)))
}

// median returns the median of x, which it sorts; NaN when x is empty.
func median(x []float64) float64 {
	if len(x) == 0 {
		return math.NaN()
	}
	slices.Sort(x)
	n := len(x)
	return (x[(n-1)/2] + x[n/2]) / 2
}
