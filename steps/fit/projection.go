package fit

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// dependent is the relative length of what is left of a term after the terms
// before it are projected out, below which its coefficient is taken to be zero.
const dependent = 1e-12

// A projection takes what linear terms explain out of residuals: an orthonormal
// basis of the terms, over the errors, and the triangle that makes them from it.
//
// It is the heart of variable projection (Golub & Pereyra 1973): for any other
// parameters, the best coefficients are known, and the search need not look for
// them.
type projection struct {
	terms [][]float64 // over the errors, as many rows as residuals
	basis [][]float64 // orthonormal
	r     [][]float64 // upper triangle by rows, terms = basis · r
}

func newProjection(terms, rows int) *projection {
	return &projection{terms: columns(terms, rows), basis: columns(terms, rows), r: columns(terms, terms)}
}

// factorise makes the basis of the terms by the Gram-Schmidt method, repeated
// where much cancels. It reports whether the terms are independent.
func (p *projection) factorise() bool {
	independent := true
	for k, term := range p.terms {
		b := p.basis[k]
		copy(b, term)
		row := make([]float64, k)
		length := floats.Norm(b, 2)
		left := length
		for range 3 {
			for j, q := range p.basis[:k] {
				d := floats.Dot(q, b)
				row[j] += d
				floats.AddScaled(b, -d, q)
			}
			before := left
			if left = floats.Norm(b, 2); left > before/2 {
				break
			}
		}
		for j, d := range row {
			p.r[j][k] = d
		}
		if !(left > dependent*length) {
			independent = false
			p.r[k][k] = 0
			clear(b)
			continue
		}
		p.r[k][k] = left
		floats.Scale(1/left, b)
	}
	return independent
}

// coefficients are those of the terms that come nearest to target.
func (p *projection) coefficients(target []float64) []float64 {
	c := make([]float64, len(p.basis))
	for k := len(c) - 1; k >= 0; k-- {
		if p.r[k][k] == 0 {
			continue
		}
		c[k] = floats.Dot(p.basis[k], target)
		for j := k + 1; j < len(c); j++ {
			c[k] -= p.r[k][j] * c[j]
		}
		c[k] /= p.r[k][k]
	}
	return c
}

// remove takes out of x what the terms explain of it.
func (p *projection) remove(x []float64) {
	for _, q := range p.basis {
		floats.AddScaled(x, -floats.Dot(q, x), q)
	}
}

// logDeterminant is that of the product of the terms with one another, over which
// a density of the coefficients integrates to its square root's inverse.
func (p *projection) logDeterminant() float64 {
	sum := 0.0
	for k, row := range p.r {
		sum += 2 * math.Log(row[k])
	}
	return sum
}

// coefficientsNow are the best coefficients where the model was evaluated.
func (m *objective) coefficientsNow() (coefficients []float64, independent bool) {
	m.fillTerms(m.terms.terms)
	independent = m.terms.factorise()
	target := make([]float64, m.rows())
	for i, w := range m.weight {
		target[i] = m.flux[i] * w
	}
	for i := range m.trended {
		prior := m.space.trend[i]
		target[m.firstTrended()+i] = prior.A / prior.B
	}
	return m.terms.coefficients(target), independent
}

// projected poses the fit as a least-squares problem of the elements before the
// coefficients. Derivatives leave out a term that is small where residuals are
// (Kaufman 1975).
func (m *objective) projected() *leastSquares { return m.problem(m.leading(), m.projectedResiduals) }

func (m *objective) projectedResiduals(x, res []float64, jac [][]float64) bool {
	v, own := m.unpack(x)
	if !m.evaluate(v, own, jac != nil) {
		return false
	}
	coefficients, _ := m.coefficientsNow()
	m.combine(coefficients)
	m.fillResiduals(v, own, coefficients, res)
	if jac != nil {
		if !m.fillLeading(v, own, coefficients, jac) {
			return false
		}
		for _, column := range jac {
			m.terms.remove(column)
		}
	}
	return finite(floats.Sum(res))
}
