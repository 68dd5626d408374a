package fit

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/lightcurve"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

const (
	// smallChi2 is a change of chi-square not worth another iteration: it goes with
	// a change of 3e-4 standard deviations in a parameter, before the last step.
	smallChi2 = 1e-7
	// roughChi2 is one that tells minima apart.
	roughChi2 = 1e-2
)

// A model is a light curve, the usable samples only, with what is to be fitted
// to it: transit times trend. The trend is a linear combination of terms, times
// the recipe's own function where there is one. The vector of the fit is the
// space's free coordinates, followed by those of the function and by the
// coefficients of the trend.
type model struct {
	space  *space
	own    *function // nil without one
	alone  bool      // there is no transit: the function is the light curve
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
	linear []float64      // scratch, the linear combination
	factor []float64      // scratch, the function's values; 1 without one
	trend  []float64      // scratch, their product
}

// newModel checks a curve and collects its usable samples. own may be nil.
func newModel(curve lightcurve.Curve, setup Setup, s *space, own *function) (*model, error) {
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
	m := &model{space: s, own: own, design: design, scale: 1, columns: make([][]float64, len(design.Columns))}
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
	m.linear, m.factor = make([]float64, len(m.used)), make([]float64, len(m.used))
	m.trend = make([]float64, len(m.used))
	floats.AddConst(1, m.factor)
	if own != nil {
		own.bind(n, m.used)
	}
	for _, slot := range s.free {
		if s.prior[slot].normal() {
			m.normal = append(m.normal, slot)
		}
	}
	return m, nil
}

func finite(x float64) bool { return x-x == 0 }

// leading is the number of elements before the coefficients in the vector of the
// fit.
func (m *model) leading() int {
	if m.own == nil {
		return len(m.space.free)
	}
	return len(m.space.free) + len(m.own.free)
}

// size is the length of the vector of the fit.
func (m *model) size() int { return m.leading() + len(m.columns) }

// rows is the number of residuals: samples and Gaussian priors.
func (m *model) rows() int {
	rows := len(m.used) + len(m.normal)
	if m.own != nil {
		rows += len(m.own.normal())
	}
	return rows
}

// unpack splits a vector of the fit into all coordinates of transit and function,
// and the coefficients.
func (m *model) unpack(x []float64) (v *[slots]float64, own, coefficients []float64) {
	m.coords = m.space.value
	for k, slot := range m.space.free {
		m.coords[slot] = x[k]
	}
	if m.own != nil {
		own = m.own.with(x[len(m.space.free):m.leading()])
	}
	return &m.coords, own, x[m.leading():]
}

// limits is the range of element k of the vector of the fit.
func (m *model) limits(k int) (lo, hi float64) {
	switch slots := len(m.space.free); {
	case k < slots:
		return m.space.limits(m.space.free[k])
	case k < m.leading():
		return m.own.limits(m.own.free[k-slots])
	}
	return math.Inf(-1), math.Inf(1)
}

// problem poses the fit as a least-squares problem.
func (m *model) problem() *leastSquares {
	p := &leastSquares{rows: m.rows(), residuals: m.residuals, absolute: smallChi2, together: m.own == nil}
	for k := range m.size() {
		lo, hi := m.limits(k)
		p.lo, p.hi = append(p.lo, lo), append(p.hi, hi)
	}
	return p
}

// residuals are (model - flux)/error, then (parameter - mean)/sd of the Gaussian
// priors.
func (m *model) residuals(x, res []float64, jac [][]float64) bool {
	v, own, coefficients := m.unpack(x)
	var flux []float64
	var gradient [][]float64
	var err error
	if jac == nil {
		flux, err = m.transit(v)
	} else {
		flux, gradient, err = m.transitGradient(v)
	}
	if err != nil {
		if m.err == nil {
			m.err = err
		}
		return false
	}
	if !m.setTrend(v, own, coefficients) {
		return false
	}
	samples := len(m.used)
	for i, f := range flux {
		res[i] = (f*m.trend[i] - m.flux[i]) * m.weight[i] / m.scale
	}
	for r, slot := range m.normal {
		value, _ := m.space.named(slot, v[slot])
		prior := m.space.prior[slot]
		res[samples+r] = (value - prior.A) / prior.B
	}
	if m.own != nil {
		for r, k := range m.own.normal() {
			prior := m.own.prior[k]
			res[samples+len(m.normal)+r] = (own[k] - prior.A) / prior.B
		}
	}
	if jac != nil && !m.fillJacobian(v, own, coefficients, flux, gradient, jac) {
		return false
	}
	sum := floats.Sum(res)
	return finite(sum)
}

// transit is the transit's light curve at the usable samples; 1 in a model
// without.
func (m *model) transit(v *[slots]float64) ([]float64, error) {
	if m.alone {
		flux := make([]float64, len(m.used))
		floats.AddConst(1, flux)
		return flux, nil
	}
	return transit.Curve(m.times, m.space.physical(v))
}

// transitGradient is transit with its derivatives in the transit model's
// arguments.
func (m *model) transitGradient(v *[slots]float64) (flux []float64, gradient [][]float64, err error) {
	if m.alone {
		flux, err = m.transit(v)
		return flux, nil, err
	}
	return transit.CurveGradient(m.times, m.space.physical(v))
}

// setTrend evaluates the trend at the usable samples into m.linear, m.factor and
// m.trend. It reports whether the recipe's function is finite there.
func (m *model) setTrend(v *[slots]float64, own, coefficients []float64) bool {
	m.sumTrend(v, coefficients)
	if m.own != nil && !m.own.evaluate(own, m.factor) {
		return false
	}
	floats.MulTo(m.trend, m.linear, m.factor)
	return true
}

// sumTrend evaluates the linear combination at the usable samples into m.linear,
// and the settling column at the current settling time into the design's.
func (m *model) sumTrend(v *[slots]float64, coefficients []float64) {
	if k := m.design.Settling; k >= 0 && m.space.isFree(slotSettling) {
		copy(m.columns[k], systematics.Settle(m.times, m.design.Start, math.Exp(v[slotSettling])))
	}
	clear(m.linear)
	for k, column := range m.columns {
		floats.AddScaled(m.linear, coefficients[k], column)
	}
}

func (m *model) fillJacobian(v *[slots]float64, own, coefficients, flux []float64, gradient, jac [][]float64) bool {
	samples := len(m.used)
	shape := floats.MulTo(make([]float64, samples), flux, m.factor) // what the terms of the trend multiply
	for k, slot := range m.space.free {
		if slot == slotSettling {
			tau := math.Exp(v[slotSettling])
			c := coefficients[m.design.Settling] * tau
			for i, d := range systematics.SettleDerivative(m.times, m.design.Start, tau) {
				jac[k][i] = shape[i] * c * d
			}
		} else {
			m.transitColumn(m.space.chain(v, slot), gradient, jac[k][:samples])
		}
	}
	if m.own != nil {
		rest := floats.MulTo(make([]float64, samples), flux, m.linear) // what the function multiplies
		weight := floats.MulTo(make([]float64, samples), rest, m.weight)
		floats.Scale(1/m.scale, weight)
		for r, k := range m.own.free {
			column := jac[len(m.space.free)+r][:samples]
			if !m.own.derivative(k, own, weight, column) {
				return false
			}
			floats.Mul(column, rest)
		}
	}
	for k, column := range m.columns {
		floats.MulTo(jac[m.leading()+k][:samples], shape, column)
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
	if m.own != nil {
		for r, k := range m.own.normal() {
			column := jac[len(m.space.free)+slices.Index(m.own.free, k)]
			column[samples+len(m.normal)+r] = 1 / m.own.prior[k].B
		}
	}
	return true
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
// coordinates v and the function's start, and the sum of squared residuals of the
// samples there.
func (m *model) solveTrend(v *[slots]float64) (coefficients []float64, sum float64, err error) {
	flux, err := m.transit(v)
	if err != nil {
		return nil, 0, err
	}
	p := len(m.columns)
	m.sumTrend(v, make([]float64, p)) // brings the settling column up to date
	if m.own != nil && !m.own.evaluate(m.own.value, m.factor) {
		return nil, 0, m.own.fault()
	}
	floats.Mul(flux, m.factor)
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
