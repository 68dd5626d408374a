package fit

import (
	"fmt"
	"math"
	"slices"

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
	cov        [][]float64    // of the vector of the fit
	determined []bool
	triangle   *triangle
	chi2       float64 // of the samples, with the errors as given
	dof        int
	inflation  float64 // what errors were multiplied by
	warnings   []string
}

// best fits the model from each start and returns the best minimum.
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
		got := m.problem().solve(append(x, coefficients...))
		if got.status != statusInvalid && (!found || got.sum < best.sum*(1-1e-9)) {
			best, found = got, true
		}
	}
	if !found {
		return minimum{}, fmt.Errorf("the transit model cannot be computed at the start values: %w", m.err)
	}
	return best, nil
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
	v, coefficients := m.unpack(s.x)
	s.v = *v
	m.sumTrend(v, coefficients) // the last evaluation may have been of a rejected step
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
		if k < len(s.model.space.free) {
			lo, hi := s.model.space.limits(s.model.space.free[k])
			s.cov[k][k] = (hi - lo) * (hi - lo) / 12
		}
	}
}

// name is what element k of the vector of the fit is called.
func (s *solution) name(k int) string {
	free := s.model.space.free
	if k < len(free) {
		return s.model.space.name[free[k]]
	}
	return trendPrefix + s.model.design.Names[k-len(free)]
}

// warn collects what a reader should know of the fit.
func (s *solution) warn() {
	s.warnings = append(s.warnings, s.model.design.Warnings...)
	for k, slot := range s.model.space.free {
		lo, hi := s.model.space.limits(slot)
		if s.x[k] <= lo || s.x[k] >= hi {
			value, _ := s.model.space.named(slot, s.x[k])
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
	flux, err := transit.Curve(curve.Time, params)
	if err != nil {
		return CurveFit{}, err
	}
	coefficients := s.x[len(m.space.free):]
	level := m.level * coefficients[0]
	out := CurveFit{
		Channel: curve.Channel,
		Time:    slices.Clone(curve.Time),
		Flux:    make([]float64, len(flux)),
		Err:     make([]float64, len(flux)),
		Mask:    slices.Clone(curve.Mask),
		Transit: flux,
		Trend:   make([]float64, len(flux)),
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
	for i := range flux {
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

// scatter is the standard deviation of the relative residuals.
func (s *solution) scatter() float64 {
	c0 := s.x[len(s.model.space.free)]
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
