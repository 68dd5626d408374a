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

// An objective is a light curve, the usable samples only, with the model that is
// to be fitted to it:
//
//	flux = transit × function × linear + added
//
// linear and added are linear combinations of the terms of the trend. The vector
// of the fit is the space's free coordinates, followed by those of the function
// and by the coefficients of the trend, added ones last.
type objective struct {
	space  *space
	own    *function // nil without one
	alone  bool      // there is no transit: the function is the light curve
	design systematics.Design
	level  float64 // median flux, by which fluxes and errors are divided
	used   []int   // indices of the usable samples in the curve

	times   []float64
	flux    []float64
	sigma   []float64   // errors as given
	columns [][]float64 // of the design
	normal  []int       // free slots with Gaussian priors
	trended []int       // terms with Gaussian priors, in the order of space.trend

	scale  float64   // what errors are multiplied by
	jitter float64   // what is added to them in quadrature
	weight []float64 // one over the error of the fit

	// The model where it was evaluated last.
	coords   [slots]float64
	dip      []float64   // the transit
	gradient [][]float64 // its derivatives in the transit model's arguments
	chain    *chainRule  // and what makes them those in coordinates
	factor   []float64   // the function; 1 without one
	linear   []float64
	trend    []float64 // factor × linear
	added    []float64
	terms    *projection
	err      error // the first error of the transit model
}

// newObjective checks a curve and collects its usable samples. own may be nil.
func newObjective(curve lightcurve.Curve, model Model, s *space, own *function) (*objective, error) {
	n := len(curve.Time)
	if len(curve.Flux) != n || len(curve.Err) != n || len(curve.Mask) != n {
		return nil, fmt.Errorf("the curve has %d fluxes, %d errors and %d flags; expected one of each for %d times",
			len(curve.Flux), len(curve.Err), len(curve.Mask), n)
	}
	trend := model.Trend
	trend.SettlingTime = math.Exp(s.value[slotSettling]) // of a prior or a white fit, where there is one
	design, err := trend.Design(curve)
	if err != nil {
		return nil, err
	}
	m := &objective{space: s, own: own, alone: model.Alone, design: design, columns: make([][]float64, len(design.Columns))}
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
		m.sigma = append(m.sigma, curve.Err[i]/m.level)
		for k, column := range design.Columns {
			m.columns[k] = append(m.columns[k], column[i])
		}
	}
	scratch := columns(5, len(m.used))
	m.weight, m.factor, m.linear, m.trend, m.added = scratch[0], scratch[1], scratch[2], scratch[3], scratch[4]
	floats.AddConst(1, m.factor)
	m.setNoise(s.noiseOf(&s.value))
	if own != nil {
		own.bind(n, m.used)
	}
	for _, slot := range s.free {
		if s.prior[slot].normal() {
			m.normal = append(m.normal, slot)
		}
	}
	for _, p := range s.trend {
		k := slices.Index(design.Names, p.Name[len(trendPrefix):])
		if k < 0 {
			return nil, fmt.Errorf("a prior is of %.40s, but the trend has no such term; its terms are %.200v", p.Name, design.Names)
		}
		m.trended = append(m.trended, k)
	}
	m.terms = newProjection(len(m.columns), m.rows())
	return m, nil
}

func finite(x float64) bool { return x-x == 0 }

// setNoise makes the weights: errors are those given times scale, with jitter
// added in quadrature.
func (m *objective) setNoise(scale, jitter float64) {
	m.scale, m.jitter = scale, jitter
	for i, e := range m.sigma {
		if jitter == 0 {
			m.weight[i] = 1 / (scale * e)
		} else {
			m.weight[i] = 1 / math.Hypot(scale*e, jitter)
		}
	}
}

// leading is the number of elements before the coefficients in the vector of the
// fit.
func (m *objective) leading() int {
	if m.own == nil {
		return len(m.space.free)
	}
	return len(m.space.free) + len(m.own.free)
}

// size is the length of the vector of the fit.
func (m *objective) size() int { return m.leading() + len(m.columns) }

// rows is the number of residuals: samples and Gaussian priors.
func (m *objective) rows() int {
	rows := len(m.used) + len(m.normal) + len(m.trended)
	if m.own != nil {
		rows += len(m.own.normal())
	}
	return rows
}

// firstTrended is the row of the first prior of a coefficient.
func (m *objective) firstTrended() int { return m.rows() - len(m.trended) }

// unpack splits the elements before the coefficients into all coordinates of
// transit and function.
func (m *objective) unpack(x []float64) (v *[slots]float64, own []float64) {
	m.coords = m.space.value
	for k, slot := range m.space.free {
		m.coords[slot] = x[k]
	}
	if m.own != nil {
		own = m.own.with(x[len(m.space.free):m.leading()])
	}
	return &m.coords, own
}

// limits is the range of element k of the vector of the fit.
func (m *objective) limits(k int) (lo, hi float64) {
	switch slots := len(m.space.free); {
	case k < slots:
		return m.space.limits(m.space.free[k])
	case k < m.leading():
		return m.own.limits(m.own.free[k-slots])
	}
	return math.Inf(-1), math.Inf(1)
}

// problem poses the fit of the first n elements.
func (m *objective) problem(n int, residuals func(x, res []float64, jac [][]float64) bool) *leastSquares {
	p := &leastSquares{rows: m.rows(), residuals: residuals, absolute: smallChi2, together: m.own == nil}
	for k := range n {
		lo, hi := m.limits(k)
		p.lo, p.hi = append(p.lo, lo), append(p.hi, hi)
	}
	return p
}

// residuals are (model - flux)/error, then (parameter - mean)/sd of the Gaussian
// priors; of all elements.
func (m *objective) residuals(x, res []float64, jac [][]float64) bool {
	v, own := m.unpack(x)
	if !m.evaluate(v, own, jac != nil) {
		return false
	}
	coefficients := x[m.leading():]
	m.combine(coefficients)
	m.fillResiduals(v, own, coefficients, res)
	if jac != nil {
		if !m.fillLeading(v, own, coefficients, jac) {
			return false
		}
		m.fillTerms(jac[m.leading():])
	}
	return finite(floats.Sum(res))
}

// evaluate computes transit and function, with the transit's derivatives if asked
// for, and the settling term. It reports whether all is finite.
func (m *objective) evaluate(v *[slots]float64, own []float64, gradient bool) bool {
	var err error
	if gradient {
		m.dip, m.gradient, err = m.transitGradient(v)
	} else {
		m.dip, err = m.transit(v)
	}
	if err != nil {
		if m.err == nil {
			m.err = err
		}
		return false
	}
	if m.own != nil && !m.own.evaluate(own, m.factor) {
		return false
	}
	m.settle(v)
	return true
}

// settle brings the settling term up to date.
func (m *objective) settle(v *[slots]float64) {
	if k := m.design.Settling; k >= 0 && m.space.isFree(slotSettling) {
		copy(m.columns[k], systematics.Settle(m.times, m.design.Start, math.Exp(v[slotSettling])))
	}
}

// transit is the transit's light curve at the usable samples; 1 in a model
// without.
func (m *objective) transit(v *[slots]float64) ([]float64, error) {
	if m.alone {
		flux := make([]float64, len(m.used))
		floats.AddConst(1, flux)
		return flux, nil
	}
	params, err := m.space.physical(v)
	if err != nil {
		return nil, err
	}
	return transit.Curve(m.times, params)
}

// transitGradient is transit with its derivatives in the transit model's
// arguments.
func (m *objective) transitGradient(v *[slots]float64) (flux []float64, gradient [][]float64, err error) {
	if m.alone {
		flux, err = m.transit(v)
		return flux, nil, err
	}
	params, chain, err := m.space.physicalChain(v)
	if err != nil {
		return nil, nil, err
	}
	m.chain = chain
	return transit.CurveGradient(m.times, params)
}

// combine evaluates the linear combinations where the model was evaluated.
func (m *objective) combine(coefficients []float64) {
	clear(m.linear)
	clear(m.added)
	for k, column := range m.columns {
		if k < m.design.Added {
			floats.AddScaled(m.linear, coefficients[k], column)
		} else {
			floats.AddScaled(m.added, coefficients[k], column)
		}
	}
	floats.MulTo(m.trend, m.linear, m.factor)
}

// fillResiduals sets res where the model was evaluated and combined.
func (m *objective) fillResiduals(v *[slots]float64, own, coefficients, res []float64) {
	for i, f := range m.dip {
		res[i] = (f*m.trend[i] + m.added[i] - m.flux[i]) * m.weight[i]
	}
	r := len(m.used)
	for _, slot := range m.normal {
		value, _ := m.space.named(slot, v[slot])
		prior := m.space.prior[slot]
		res[r] = (value - prior.A) / prior.B
		r++
	}
	if m.own != nil {
		for _, k := range m.own.normal() {
			prior := m.own.prior[k]
			res[r] = (own[k] - prior.A) / prior.B
			r++
		}
	}
	for i, k := range m.trended {
		prior := m.space.trend[i]
		res[r+i] = (coefficients[k] - prior.A) / prior.B
	}
}

// fillLeading sets the derivatives of the residuals in all elements before the
// coefficients.
func (m *objective) fillLeading(v *[slots]float64, own, coefficients []float64, jac [][]float64) bool {
	samples := len(m.used)
	shape := floats.MulTo(make([]float64, samples), m.dip, m.factor) // what the terms of the trend multiply
	for k, slot := range m.space.free {
		if slot == slotSettling {
			m.settlingColumn(v, coefficients, shape, jac[k][:samples])
		} else {
			m.transitColumn(&m.chain[slot], jac[k][:samples])
		}
	}
	if m.own != nil {
		rest := floats.MulTo(make([]float64, samples), m.dip, m.linear) // what the function multiplies
		weight := floats.MulTo(make([]float64, samples), rest, m.weight)
		for r, k := range m.own.free {
			column := jac[len(m.space.free)+r][:samples]
			if !m.own.derivative(k, own, weight, column) {
				return false
			}
			floats.Mul(column, rest)
		}
	}
	for _, column := range jac[:m.leading()] {
		floats.Mul(column[:samples], m.weight)
		clear(column[samples:])
	}
	r := samples
	for _, slot := range m.normal {
		_, slope := m.space.named(slot, v[slot])
		jac[slices.Index(m.space.free, slot)][r] = slope / m.space.prior[slot].B
		r++
	}
	if m.own != nil {
		for _, k := range m.own.normal() {
			jac[len(m.space.free)+slices.Index(m.own.free, k)][r] = 1 / m.own.prior[k].B
			r++
		}
	}
	return true
}

// fillTerms sets the derivatives of the residuals in the coefficients: the terms
// of the trend times what they multiply, over the errors.
func (m *objective) fillTerms(jac [][]float64) {
	samples := len(m.used)
	shape := floats.MulTo(make([]float64, samples), m.dip, m.factor)
	floats.Mul(shape, m.weight)
	for k, column := range m.columns {
		if k < m.design.Added {
			floats.MulTo(jac[k][:samples], shape, column)
		} else {
			floats.MulTo(jac[k][:samples], m.weight, column)
		}
		clear(jac[k][samples:])
	}
	for i, k := range m.trended {
		jac[k][m.firstTrended()+i] = 1 / m.space.trend[i].B
	}
}

// settlingColumn sets column to the derivative of the model in the logarithm of
// the settling time.
func (m *objective) settlingColumn(v *[slots]float64, coefficients, shape, column []float64) {
	tau := math.Exp(v[slotSettling])
	c := coefficients[m.design.Settling] * tau
	for i, d := range systematics.SettleDerivative(m.times, m.design.Start, tau) {
		column[i] = shape[i] * c * d
	}
}

// transitColumn sets column to the trend times the weighted sum of the transit's
// derivatives.
func (m *objective) transitColumn(weight *[arguments]float64, column []float64) {
	clear(column)
	for a, w := range weight {
		if w != 0 {
			floats.AddScaled(column, w, m.gradient[a])
		}
	}
	floats.Mul(column, m.trend)
}
