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
	objective  *objective
	v          [slots]float64 // all coordinates at the minimum
	own        []float64      // the same of the recipe's function
	cov        [][]float64    // of the vector of the fit
	noiseCov   [][]float64    // of the free coordinates of the noise
	determined []bool
	triangle   *triangle
	chi2       float64 // of the samples, with the errors as given
	dof        int
	inflation  float64 // what errors were multiplied by
	warnings   []string
}

// optimise searches from the elements before the coefficients, by variable
// projection, and returns the minimum in all elements.
func (m *objective) optimise(start []float64, rough bool) minimum {
	p := m.projected()
	if rough {
		p.absolute, p.rough = roughChi2, true
	}
	got := p.solve(start)
	if got.status == statusInvalid {
		return got
	}
	v, own := m.unpack(got.x)
	if !m.evaluate(v, own, false) {
		got.status, got.sum = statusInvalid, math.Inf(1)
		return got
	}
	coefficients, _ := m.coefficientsNow()
	got.x = append(got.x, coefficients...)
	got.atEdge = append(got.atEdge, make([]bool, len(coefficients))...)
	if rough {
		return got
	}
	got.jac = columns(m.size(), m.rows())
	if !m.residuals(got.x, got.res, got.jac) {
		got.status, got.sum = statusInvalid, math.Inf(1)
	}
	return got
}

// best fits the model from each start, roughly if there are several, and returns
// the best minimum.
func (m *objective) best(starts [][slots]float64) (minimum, error) {
	var best minimum
	found := false
	for _, v := range starts {
		m.space.value = v
		if _, _, err := m.solveTrend(&v); err != nil {
			return minimum{}, err
		}
		x := make([]float64, 0, m.size())
		for _, slot := range m.space.free {
			x = append(x, v[slot])
		}
		if m.own != nil {
			x = append(x, m.own.at()...)
		}
		got := m.optimise(x, len(starts) > 1)
		if got.status != statusInvalid && (!found || got.sum < best.sum*(1-1e-9)) {
			best, found = got, true
		}
	}
	if m.own != nil && m.own.err != nil {
		return minimum{}, m.own.err
	}
	switch {
	case found && len(starts) > 1:
		got := m.optimise(best.x[:m.leading()], false)
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
func (m *objective) solve(starts [][slots]float64, inflate bool) (*solution, error) {
	got, err := m.best(starts)
	if err != nil {
		return nil, err
	}
	for range noiseRounds {
		if len(m.space.noise) == 0 || m.fitNoise(got.res) < 1e-3 {
			break
		}
		steps := got.steps
		got = m.optimise(got.x[:m.leading()], false)
		got.steps += steps
	}
	s := &solution{minimum: got, objective: m, dof: len(m.used) - m.size(), inflation: 1}
	s.chi2 = m.sampleSum(got.res)
	if reduced := s.chi2 / float64(s.dof); inflate && s.dof > 0 && reduced > 1 {
		s.inflation = math.Sqrt(reduced)
		m.setNoise(m.scale*s.inflation, m.jitter*s.inflation)
		s.minimum = m.optimise(got.x[:m.leading()], false)
		s.chi2 = m.sampleSum(s.res)
	}
	v, own := m.unpack(s.x)
	s.v, s.own = *v, own
	m.evaluate(v, own, false) // the last evaluation may have been of a rejected step
	m.combine(s.x[m.leading():])
	if m.own != nil && m.own.err != nil {
		return nil, m.own.err
	}
	none := make([]bool, m.size())
	s.triangle = factorise(s.jac, s.res, none, columns(m.size(), m.rows()))
	s.cov, s.determined = s.triangle.covariance()
	s.widen()
	s.noiseCov = m.noiseCovariance(s.res)
	s.warn()
	return s, nil
}

// sampleSum is the sum of squared residuals of the samples in units of the errors
// as given.
func (m *objective) sampleSum(res []float64) float64 {
	sum := 0.0
	for i, r := range res[:len(m.used)] {
		z := r / (m.weight[i] * m.sigma[i])
		sum += z * z
	}
	return sum
}

// solveTrend returns the coefficients of the trend that fit best at the
// coordinates v and the function's start, and the sum of squared residuals of the
// samples there.
func (m *objective) solveTrend(v *[slots]float64) (coefficients []float64, sum float64, err error) {
	m.dip, err = m.transit(v)
	if err != nil {
		return nil, 0, err
	}
	m.settle(v)
	if m.own != nil && !m.own.evaluate(m.own.value, m.factor) {
		return nil, 0, m.own.fault()
	}
	coefficients, independent := m.coefficientsNow()
	if !independent {
		return nil, 0, fmt.Errorf("the terms of the trend cannot be told apart with %d usable samples", len(m.used))
	}
	m.combine(coefficients)
	for i, f := range m.dip {
		r := (f*m.trend[i] + m.added[i] - m.flux[i]) * m.weight[i]
		sum += r * r
	}
	return coefficients, sum, nil
}

// widen gives parameters that the data do not determine the variance of their
// prior range, or infinity where that is unlimited.
func (s *solution) widen() {
	for k, ok := range s.determined {
		if ok {
			continue
		}
		s.cov[k][k] = math.Inf(1)
		if k < s.objective.leading() {
			lo, hi := s.objective.limits(k)
			s.cov[k][k] = (hi - lo) * (hi - lo) / 12
		}
	}
}

// name is what element k of the vector of the fit is called.
func (s *solution) name(k int) string {
	free, leading := s.objective.space.free, s.objective.leading()
	switch {
	case k < len(free):
		return s.objective.space.name[free[k]]
	case k < leading:
		own := s.objective.own
		return own.names[own.free[k-len(free)]]
	}
	return trendPrefix + s.objective.design.Names[k-leading]
}

// value is element k of the vector of the fit as a named value, and its
// derivative in the element.
func (s *solution) value(k int) (value, slope float64) {
	free := s.objective.space.free
	switch {
	case k < len(free):
		return s.objective.space.named(free[k], s.x[k])
	case k < s.objective.leading():
		return s.objective.own.named(s.objective.own.free[k-len(free)], s.x[k])
	}
	return s.x[k], 1
}

// warn collects what a reader should know of the fit.
func (s *solution) warn() {
	s.warnings = append(s.warnings, s.objective.design.Warnings...)
	for k := range s.objective.leading() {
		lo, hi := s.objective.limits(k)
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
	for a, slot := range s.objective.space.noise {
		space := s.objective.space
		if lo, hi := space.limits(slot); space.value[slot] <= lo || space.value[slot] >= hi {
			value, _ := space.named(slot, space.value[slot])
			s.warnings = append(s.warnings, fmt.Sprintf("%s is at the end of its range, %.6g", space.name[slot], value))
		}
		if a > 0 {
			if r := s.noiseCov[0][1] / math.Sqrt(s.noiseCov[0][0]*s.noiseCov[1][1]); !(math.Abs(r) <= degenerate) {
				s.warnings = append(s.warnings, "errorScale and jitter act alike on errors that hardly differ: use one of them")
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
	m := s.objective
	params, err := m.space.physical(&s.v)
	if err != nil {
		return CurveFit{}, err
	}
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
		Added:   make([]float64, n),
		Level:   level,
		Mid:     params.Orbit.MidTransit,
	}
	for k, column := range m.design.Columns {
		if k == m.design.Settling {
			column = systematics.Settle(curve.Time, m.design.Start, math.Exp(s.v[slotSettling]))
		}
		to := out.Trend
		if k >= m.design.Added {
			to = out.Added
		}
		for i, b := range column {
			to[i] += coefficients[k] / coefficients[0] * b
		}
	}
	if out.Transit, err = s.shape(curve.Time, out.Trend); err != nil {
		return CurveFit{}, err
	}
	if m.alone {
		out.Mid = m.own.midTransit(s.own)
	}
	for i := range n {
		out.Flux[i] = curve.Flux[i]/level - out.Added[i]
		out.Err[i] = curve.Err[i] * m.scale / level
		if m.jitter > 0 {
			out.Err[i] = math.Hypot(out.Err[i], m.jitter/coefficients[0])
		}
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
	m := s.objective
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
	params, err := m.space.physical(&s.v)
	if err != nil {
		return nil, err
	}
	return transit.Curve(times, params)
}

// scatter is the standard deviation of the relative residuals.
func (s *solution) scatter() float64 {
	c0 := s.x[s.objective.leading()]
	sum := 0.0
	for i := range s.objective.used {
		r := s.res[i] / s.objective.weight[i] / c0
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
