package fit

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// undetermined is the relative length of what is left of a Jacobian column after
// the columns before it are projected out, below which the parameter counts as
// not determined by the data.
const undetermined = 1e-11

// A triangle is the QR factorisation of a Jacobian with columns scaled to unit
// length, with columns of held parameters left out. Columns are taken in the order
// of what is left of them (pivoting), so that undetermined ones come last.
type triangle struct {
	n     int         // parameters, held ones included
	order []int       // parameter of each column of r
	scale []float64   // length of each of those parameters' Jacobian columns
	r     [][]float64 // upper triangle by rows: r[i][j], j >= i
	qres  []float64   // first len(order) elements of Qᵀ residuals
}

// factorise builds the triangle of the columns jac[k] with !held[k]. work holds
// as many columns as jac and is overwritten; jac and res are left alone.
func factorise(jac [][]float64, res []float64, held []bool, work [][]float64) *triangle {
	t := &triangle{n: len(jac)}
	var col [][]float64
	for k := range jac {
		if held[k] {
			continue
		}
		length := floats.Norm(jac[k], 2)
		if length == 0 || math.IsInf(length, 0) {
			length = 1
		}
		floats.ScaleTo(work[k], 1/length, jac[k])
		t.order = append(t.order, k)
		t.scale = append(t.scale, length)
		col = append(col, work[k])
	}
	m := len(col)
	t.r = columns(m, m)
	t.qres = make([]float64, m)
	rhs := append([]float64(nil), res...)
	for j := 0; j < m && j < len(res); j++ {
		// Bring the column with most left to position j.
		best, most := j, -1.0
		for l := j; l < m; l++ {
			if left := floats.Dot(col[l][j:], col[l][j:]); left > most {
				best, most = l, left
			}
		}
		col[j], col[best] = col[best], col[j]
		t.order[j], t.order[best] = t.order[best], t.order[j]
		t.scale[j], t.scale[best] = t.scale[best], t.scale[j]
		for i := range j {
			t.r[i][j], t.r[i][best] = t.r[i][best], t.r[i][j]
		}
		// Householder reflection that clears col[j] below j.
		v := col[j][j:]
		norm := math.Sqrt(most)
		if norm > 0 {
			if v[0] > 0 {
				norm = -norm
			}
			v[0] -= norm
			half := -norm * v[0] // vᵀv/2
			for l := j + 1; l < m; l++ {
				floats.AddScaled(col[l][j:], -floats.Dot(v, col[l][j:])/half, v)
			}
			floats.AddScaled(rhs[j:], -floats.Dot(v, rhs[j:])/half, v)
			t.r[j][j] = norm
		}
		for l := j + 1; l < m; l++ {
			t.r[j][l] = col[l][j]
		}
		t.qres[j] = rhs[j]
	}
	return t
}

// dampedStep returns the step that minimises the linearised sum of squares plus
// damping times the squared scaled step; ok is false when it is not finite.
func (t *triangle) dampedStep(damping float64) (step []float64, ok bool) {
	m := len(t.order)
	// Rotate the rows √damping·I into a copy of the triangle (Givens).
	r := columns(m, m)
	b := append([]float64(nil), t.qres...)
	for i := range m {
		copy(r[i], t.r[i])
	}
	row := make([]float64, m)
	for k := range m {
		clear(row)
		row[k] = math.Sqrt(damping)
		extra := 0.0
		for i := k; i < m; i++ {
			if row[i] == 0 {
				continue
			}
			h := math.Hypot(r[i][i], row[i])
			c, s := r[i][i]/h, row[i]/h
			for j := i; j < m; j++ {
				r[i][j], row[j] = c*r[i][j]+s*row[j], c*row[j]-s*r[i][j]
			}
			b[i], extra = c*b[i]+s*extra, c*extra-s*b[i]
		}
	}
	step = make([]float64, t.n)
	ok = true
	y := backSubstitute(r, b)
	for j, k := range t.order {
		step[k] = -y[j] / t.scale[j]
		ok = ok && step[k]-step[k] == 0
	}
	return step, ok
}

// reduction is by how much the linearised sum of squares falls with a step.
func (t *triangle) reduction(step []float64) float64 {
	m := len(t.order)
	fall := 0.0
	for i := range m {
		rs := 0.0
		for j := i; j < m; j++ {
			rs += t.r[i][j] * step[t.order[j]] * t.scale[j]
		}
		fall -= rs * (2*t.qres[i] + rs)
	}
	return fall
}

// fullReduction is by how much the linearised sum of squares falls with the
// undamped step.
func (t *triangle) fullReduction() float64 {
	fall := 0.0
	for i, q := range t.qres {
		if math.Abs(t.r[i][i]) > undetermined {
			fall += q * q
		}
	}
	return fall
}

// covariance returns the inverse of JᵀJ over the determined parameters. Rows and
// columns of held and undetermined parameters are zero; determined says which
// are neither.
func (t *triangle) covariance() (cov [][]float64, determined []bool) {
	rank := t.rank()
	cov = columns(t.n, t.n)
	determined = make([]bool, t.n)
	inverse := columns(rank, rank) // inverse[c] is column c of r⁻¹
	for c := range rank {
		determined[t.order[c]] = true
		e := make([]float64, rank)
		e[c] = 1
		copy(inverse[c], backSubstitute(t.r[:rank], e))
	}
	for a := range rank {
		for b := range rank {
			sum := 0.0
			for c := max(a, b); c < rank; c++ {
				sum += inverse[c][a] * inverse[c][b]
			}
			cov[t.order[a]][t.order[b]] = sum / (t.scale[a] * t.scale[b])
		}
	}
	return cov, determined
}

func (t *triangle) rank() int {
	rank := 0
	for rank < len(t.order) && math.Abs(t.r[rank][rank]) > undetermined {
		rank++
	}
	return rank
}

// backSubstitute solves r y = b for the upper triangle r of order len(b).
func backSubstitute(r [][]float64, b []float64) []float64 {
	y := append([]float64(nil), b...)
	for i := len(y) - 1; i >= 0; i-- {
		for j := i + 1; j < len(y); j++ {
			y[i] -= r[i][j] * y[j]
		}
		y[i] /= r[i][i]
	}
	return y
}
