package fit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
)

// How an optimisation ended. All but statusConverged are reported with the fit.
const (
	statusConverged = "converged"
	statusLimit     = "stopped at the limit of iterations"
	statusStalled   = "stalled: no step lowers chi-square further"
	statusInvalid   = "failed: the model is not finite at the start"
)

// Tuning of the optimiser.
const (
	// defaultTolerance ends the search when the chi-square that a step promises
	// and that it brings are both below this share of chi-square: of 1e4 samples,
	// 1e-7 of the change that moves a parameter by one standard deviation.
	defaultTolerance = 1e-11
	defaultSteps     = 100
	firstDamping     = 1e-3 // relative to the squared column lengths (Marquardt 1963)
	quickest         = 0.1  // least factor from one damping to the next
	leastDamping     = 1e-15
	mostDamping      = 1e15
)

// A leastSquares is a problem for the Levenberg-Marquardt method (Levenberg
// 1944, Marquardt 1963): minimise the sum of squared residuals within a box.
type leastSquares struct {
	rows int // residuals, Gaussian priors included

	// residuals fills res (length rows) at x and, unless jac is nil, jac[k] with
	// the derivative of the residuals in x[k]. It reports whether all is finite.
	residuals func(x, res []float64, jac [][]float64) bool

	lo, hi    []float64 // the box, lo <= hi; infinite where there is no limit
	tolerance float64   // relative change of the sum that ends the search; 0 means defaultTolerance
	absolute  float64   // change of the sum that ends it as well
	rough     bool      // end without the last, undamped step
	steps     int       // limit of iterations; 0 means defaultSteps

	// together says that derivatives cost little beside the residuals, so that both
	// are computed at once for a step that is tried.
	together bool
}

// A minimum is where a search ended.
type minimum struct {
	x      []float64
	sum    float64     // of squared residuals
	res    []float64   // residuals at x
	jac    [][]float64 // their derivatives at x
	atEdge []bool      // parameters held at an end of the box that the sum falls towards
	steps  int         // iterations
	status string
}

// solve searches from start, which is first moved into the box.
//
// Each iteration factorises the Jacobian once (Householder QR of the columns
// scaled to unit length) and then works with its triangle. Damping follows
// Nielsen (1999): it falls smoothly with the ratio of gained to promised
// reduction, and rises ever faster while steps fail. Parameters at an end of the box
// that the sum falls towards are held for that iteration, and steps are cut off
// at the box.
func (p *leastSquares) solve(start []float64) minimum {
	n := len(start)
	tolerance, limit := p.tolerance, p.steps
	if tolerance == 0 {
		tolerance = defaultTolerance
	}
	if limit == 0 {
		limit = defaultSteps
	}
	m := minimum{
		x:      slices.Clone(start),
		res:    make([]float64, p.rows),
		jac:    columns(n, p.rows),
		atEdge: make([]bool, n),
	}
	for k := range m.x {
		m.x[k] = min(max(m.x[k], p.lo[k]), p.hi[k])
	}
	if !p.residuals(m.x, m.res, m.jac) {
		m.status, m.sum = statusInvalid, math.Inf(1)
		return m
	}
	m.sum = floats.Dot(m.res, m.res)
	trial, trialRes := make([]float64, n), make([]float64, p.rows)
	var trialJac [][]float64
	if p.together {
		trialJac = columns(n, p.rows)
	}
	damping, growth := firstDamping, 2.0
	work := columns(n, p.rows)
	for m.steps = 1; m.steps <= limit; m.steps++ {
		p.markEdges(&m)
		q := factorise(m.jac, m.res, m.atEdge, work)
		for {
			step, ok := q.dampedStep(damping)
			moved := false
			for k := range trial {
				trial[k] = min(max(m.x[k]+step[k], p.lo[k]), p.hi[k])
				step[k] = trial[k] - m.x[k]
				moved = moved || step[k] != 0
			}
			promised := q.reduction(step)
			small := max(tolerance*m.sum, p.absolute)
			if ok && (!moved || promised <= small && q.fullReduction() <= 10*small) {
				// Nothing is left to gain, with or without damping.
				p.finish(&m, q, trial, trialRes)
				return m
			}
			sum := math.Inf(1)
			if ok && promised > 0 && p.residuals(trial, trialRes, trialJac) {
				sum = floats.Dot(trialRes, trialRes)
			}
			if gain := m.sum - sum; gain > 0 {
				ratio := gain / promised
				damping = max(leastDamping, damping*max(quickest, 1-math.Pow(2*ratio-1, 3)))
				growth = 2
				copy(m.x, trial)
				if p.together {
					m.res, trialRes = trialRes, m.res
					m.jac, trialJac = trialJac, m.jac
				} else if !p.residuals(m.x, m.res, m.jac) {
					m.status = statusStalled
					return m
				}
				m.sum = floats.Dot(m.res, m.res)
				if gain <= small && promised <= small {
					p.markEdges(&m)
					p.finish(&m, factorise(m.jac, m.res, m.atEdge, work), trial, trialRes)
					return m
				}
				break
			}
			damping *= growth
			growth *= 2
			if damping > mostDamping {
				// Rounding hides any further descent.
				m.status = statusStalled
				if q.fullReduction() <= max(1e-6*m.sum, 1e4*p.absolute) {
					m.status = statusConverged
				}
				return m
			}
		}
	}
	m.steps = limit
	m.status = statusLimit
	p.markEdges(&m)
	return m
}

// finish ends a converged search with a step next to undamped, which takes out
// what the damping of the last steps left; it is kept if it does no harm.
func (p *leastSquares) finish(m *minimum, q *triangle, trial, trialRes []float64) {
	m.status = statusConverged
	if p.rough {
		return
	}
	step, ok := q.dampedStep(leastDamping)
	if !ok {
		return
	}
	for k := range trial {
		trial[k] = min(max(m.x[k]+step[k], p.lo[k]), p.hi[k])
	}
	if !p.residuals(trial, trialRes, nil) {
		return
	}
	if sum := floats.Dot(trialRes, trialRes); sum <= m.sum {
		copy(m.x, trial)
		m.sum = sum
		p.residuals(m.x, m.res, m.jac)
		p.markEdges(m)
	}
}

// markEdges finds the parameters at an end of the box towards which the sum
// falls.
func (p *leastSquares) markEdges(m *minimum) {
	for k, x := range m.x {
		m.atEdge[k] = false
		if x <= p.lo[k] || x >= p.hi[k] {
			slope := floats.Dot(m.jac[k], m.res)
			m.atEdge[k] = p.lo[k] == p.hi[k] || x <= p.lo[k] && slope >= 0 || x >= p.hi[k] && slope <= 0
		}
	}
}

// columns allocates n columns of the given length in one piece.
func columns(n, rows int) [][]float64 {
	all := make([]float64, n*rows)
	out := make([][]float64, n)
	for k := range out {
		out[k] = all[k*rows : (k+1)*rows : (k+1)*rows]
	}
	return out
}
