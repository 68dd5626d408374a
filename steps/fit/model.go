package fit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/lightcurve"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// smallChi2 is a change of chi-square not worth another iteration: it goes with a
// change of 3e-4 standard deviations in a parameter, before the last step.
const smallChi2 = 1e-7

// A model is a light curve, the usable samples only, with what is to be fitted
// to it: transit times trend. The vector of the fit is the space's free
// coordinates followed by the coefficients of the trend.
type model struct {
	space  *space
	design systematics.Design
	level  float64 // median flux, by which fluxes and errors are divided
	used   []int   // indices of the usable samples in the curve

	times   []float64
	flux    []float64
	weight  []float64   // one over the error
	columns [][]float64 // of the design

	scale  float64        // the errors of the fit are those of the curve times this
	coords [slots]float64 // scratch
	normal []int          // free slots with Gaussian priors
	err    error          // the first error of the transit model
	trend  []float64      // scratch
	slope  []float64      // scratch, derivative of the settling term
}

// newModel checks a curve and collects its usable samples.
func newModel(curve lightcurve.Curve, setup Setup, s *space) (*model, error) {
	n := len(curve.Time)
	if len(curve.Flux) != n || len(curve.Err) != n || len(curve.Mask) != n {
		return nil, fmt.Errorf("the curve has %d fluxes, %d errors and %d flags; expected one of each for %d times",
			len(curve.Flux), len(curve.Err), len(curve.Mask), n)
	}
	trend := setup.Trend
	trend.SettlingTime = math.Exp(s.value[slotSettling]) // of a prior or a white fit, where there is one
	design, err := trend.Design(curve)
	if err != nil {
		return nil, err
	}
	m := &model{space: s, design: design, scale: 1, columns: make([][]float64, len(design.Columns))}
	var level []float64
	for i, flag := range curve.Mask {
		ok := flag == 0 && finite(curve.Time[i]) && finite(curve.Flux[i]) && curve.Err[i] > 0 && finite(curve.Err[i])
		for _, column := range design.Columns {
			ok = ok && finite(column[i])
		}
		if ok {
			m.used = append(m.used, i)
			level = append(level, curve.Flux[i])
		}
	}
	m.level = median(level)
	for _, i := range m.used {
		m.times = append(m.times, curve.Time[i])
		m.flux = append(m.flux, curve.Flux[i]/m.level)
		m.weight = append(m.weight, m.level/curve.Err[i])
		for k, column := range design.Columns {
			m.columns[k] = append(m.columns[k], column[i])
		}
	}
	m.trend, m.slope = make([]float64, len(m.used)), make([]float64, len(m.used))
	for _, slot := range s.free {
		if s.prior[slot].normal() {
			m.normal = append(m.normal, slot)
		}
	}
	return m, nil
}

func finite(x float64) bool { return x-x == 0 }

// size is the length of the vector of the fit.
func (m *model) size() int { return len(m.space.free) + len(m.columns) }

// rows is the number of residuals: samples and Gaussian priors.
func (m *model) rows() int { return len(m.used) + len(m.normal) }

// unpack splits a vector of the fit into all coordinates and the coefficients.
func (m *model) unpack(x []float64) (v *[slots]float64, coefficients []float64) {
	m.coords = m.space.value
	for k, slot := range m.space.free {
		m.coords[slot] = x[k]
	}
	return &m.coords, x[len(m.space.free):]
}

// problem poses the fit as a least-squares problem.
func (m *model) problem() *leastSquares {
	p := &leastSquares{rows: m.rows(), residuals: m.residuals, absolute: smallChi2}
	for _, slot := range m.space.free {
		lo, hi := m.space.limits(slot)
		p.lo, p.hi = append(p.lo, lo), append(p.hi, hi)
	}
	for range m.columns {
		p.lo, p.hi = append(p.lo, math.Inf(-1)), append(p.hi, math.Inf(1))
	}
	return p
}

// residuals are (model - flux)/error, then (parameter - mean)/sd of the Gaussian
// priors.
func (m *model) residuals(x, res []float64, jac [][]float64) bool {
	v, coefficients := m.unpack(x)
	params := m.space.physical(v)
	var flux []float64
	var gradient [][]float64
	var err error
	if jac == nil {
		flux, err = transit.Curve(m.times, params)
	} else {
		flux, gradient, err = transit.CurveGradient(m.times, params)
	}
	if err != nil {
		if m.err == nil {
			m.err = err
		}
		return false
	}
	m.sumTrend(v, coefficients)
	samples := len(m.used)
	for i, f := range flux {
		res[i] = (f*m.trend[i] - m.flux[i]) * m.weight[i] / m.scale
	}
	for r, slot := range m.normal {
		value, _ := m.space.named(slot, v[slot])
		prior := m.space.prior[slot]
		res[samples+r] = (value - prior.A) / prior.B
	}
	if jac != nil {
		m.fillJacobian(v, coefficients, flux, gradient, jac)
	}
	sum := floats.Sum(res)
	return finite(sum)
}

// sumTrend evaluates the trend at the usable samples into m.trend, and the
// settling column at the current settling time into the design's.
func (m *model) sumTrend(v *[slots]float64, coefficients []float64) {
	if k := m.design.Settling; k >= 0 && m.space.isFree(slotSettling) {
		copy(m.columns[k], systematics.Settle(m.times, m.design.Start, math.Exp(v[slotSettling])))
	}
	clear(m.trend)
	for k, column := range m.columns {
		floats.AddScaled(m.trend, coefficients[k], column)
	}
}

func (m *model) fillJacobian(v *[slots]float64, coefficients, flux []float64, gradient, jac [][]float64) {
	samples := len(m.used)
	for k, slot := range m.space.free {
		if slot == slotSettling {
			tau := math.Exp(v[slotSettling])
			c := coefficients[m.design.Settling] * tau
			for i, d := range systematics.SettleDerivative(m.times, m.design.Start, tau) {
				jac[k][i] = flux[i] * c * d
			}
		} else {
			m.transitColumn(m.space.chain(v, slot), gradient, jac[k][:samples])
		}
	}
	for k, column := range m.columns {
		floats.MulTo(jac[len(m.space.free)+k][:samples], flux, column)
	}
	for _, column := range jac {
		for i := range samples {
			column[i] *= m.weight[i] / m.scale
		}
		clear(column[samples:])
	}
	for r, slot := range m.normal {
		for k, free := range m.space.free {
			if free == slot {
				_, slope := m.space.named(slot, v[slot])
				jac[k][samples+r] = slope / m.space.prior[slot].B
			}
		}
	}
}

// transitColumn sets column to the trend times the weighted sum of the transit's
// derivatives.
func (m *model) transitColumn(weight [9]float64, gradient [][]float64, column []float64) {
	clear(column)
	for a, w := range weight {
		if w != 0 {
			floats.AddScaled(column, w, gradient[a])
		}
	}
	floats.Mul(column, m.trend)
}

// solveTrend returns the coefficients of the trend that fit best at the
// coordinates v, and the sum of squared residuals of the samples there.
func (m *model) solveTrend(v *[slots]float64) (coefficients []float64, sum float64, err error) {
	flux, err := transit.Curve(m.times, m.space.physical(v))
	if err != nil {
		return nil, 0, err
	}
	p := len(m.columns)
	m.sumTrend(v, make([]float64, p)) // brings the settling column up to date
	jac, res := columns(p, len(m.used)), make([]float64, len(m.used))
	for i := range m.used {
		w := m.weight[i] / m.scale
		res[i] = -m.flux[i] * w
		for k, column := range m.columns {
			jac[k][i] = flux[i] * column[i] * w
		}
	}
	q := factorise(jac, res, make([]bool, p), columns(p, len(m.used)))
	coefficients, ok := q.dampedStep(0)
	if !ok {
		return nil, 0, fmt.Errorf("the terms of the trend cannot be told apart with %d usable samples", len(m.used))
	}
	sum = floats.Dot(res, res) - q.fullReduction()
	return coefficients, sum, nil
}
