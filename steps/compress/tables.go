package compress

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// Tables are the likelihood of one light curve for one interval of radius ratios, with
// the columns of the systematics given (one settling time).
//
// The model is columns X - f Y, of which the last is the residual. Matrices are packed,
// as pairs of the columns.
type tables struct {
	deficits  *Deficits
	functions int       // of the deficits that matter for this light curve
	size      int       // columns of systematics
	flat      []float64 // G0
	first     []float64 // G1 of each function
	second    []float64 // G2 of each pair of functions, twice that where they differ

	square, cross []float64 // scratch
}

// A mixing says which columns a model has: columns 0 to fixed-1 as they are and, with a
// family, one that is a combination of the others. star says of each whether it
// multiplies the star.
type mixing struct {
	fixed   int
	combine []float64
	star    []bool
	priors  []Coefficient
}

// size is how many columns there are.
func (m *mixing) size() int {
	if m.combine == nil {
		return m.fixed
	}
	return m.fixed + 1
}

// set makes tables from sums, in the space of those there were.
func (t *tables) set(s *sums, d *Deficits, m *mixing) {
	p := m.size()
	n := pairs(p + 1)
	t.deficits, t.functions, t.size = d, s.functions, p
	t.flat, t.first, t.second = resized(t.flat, n), resized(t.first, s.functions*n), resized(t.second, pairs(s.functions)*n)
	t.square, t.cross = resized(t.square, pairs(p)), resized(t.cross, p)
	square, cross := t.square, t.cross
	last := pairs(p) // where the row of the residual begins
	// In the flat part, columns are whole.
	m.mixSquare(s.block(0), square)
	m.mixRow(s.cross[:s.columns], cross)
	copy(t.flat, square)
	copy(t.flat[last:], cross)
	t.flat[last+p] = s.rest
	for _, prior := range m.priors {
		j, w := prior.Column, 1/(prior.SD*prior.SD)
		mean := prior.Mean
		if j == 0 {
			mean-- // coefficients are relative to a flat curve of 1
		}
		t.flat[pairs(j)+j] += w
		t.flat[last+j] += w * mean
		t.flat[last+p] += w * mean * mean
	}
	share := func(j int) float64 {
		if m.star[j] {
			return 1
		}
		return 0
	}
	for a := range s.functions {
		out := t.first[a*n : (a+1)*n]
		m.mixSquare(s.block(1+a), square)
		m.mixRow(s.cross[(1+a)*s.columns:(2+a)*s.columns], cross)
		for j := range p {
			for k := range j + 1 {
				out[pairs(j)+k] = (share(j) + share(k)) * square[pairs(j)+k]
			}
			out[last+j] = share(j)*cross[j] - square[pairs(j)]
		}
		out[last+p] = -2 * cross[0]
	}
	x := 0
	for a := range s.functions {
		for b := range a + 1 {
			out := t.second[x*n : (x+1)*n]
			m.mixSquare(s.block(1+s.functions+x), square)
			twice := 1.0
			if a != b {
				twice = 2
			}
			for j := range p {
				for k := range j + 1 {
					out[pairs(j)+k] = twice * share(j) * share(k) * square[pairs(j)+k]
				}
				out[last+j] = -twice * share(j) * square[pairs(j)]
			}
			out[last+p] = twice * square[0]
			x++
		}
	}
}

// resized is a slice of n numbers, x if it has the room.
func resized(x []float64, n int) []float64 {
	if cap(x) >= n {
		return x[:n]
	}
	return make([]float64, n)
}

// mixSquare turns products of all columns into those of the model's.
func (m *mixing) mixSquare(in, out []float64) {
	f := m.fixed
	copy(out, in[:pairs(f)])
	if m.combine == nil {
		return
	}
	row := out[pairs(f):]
	clear(row[:f+1])
	for a, c := range m.combine {
		from := in[pairs(f+a):]
		floats.AddScaled(row[:f], c, from[:f])
		sum := 0.5 * c * from[f+a]
		for b, other := range m.combine[:a] {
			sum += other * from[f+b]
		}
		row[f] += 2 * c * sum
	}
}

// mixRow turns products of all columns with something into those of the model's.
func (m *mixing) mixRow(in, out []float64) {
	copy(out, in[:m.fixed])
	if m.combine != nil {
		out[m.fixed] = floats.Dot(m.combine, in[m.fixed:])
	}
}

// fill sets g to the matrix for the shares of the functions.
func (t *tables) fill(phi, g []float64) {
	n := len(t.flat)
	copy(g, t.flat)
	x := 0
	for a, pa := range phi[:t.functions] {
		floats.AddScaled(g, -pa, t.first[a*n:(a+1)*n])
		for _, pb := range phi[:a+1] {
			floats.AddScaled(g, pa*pb, t.second[x:x+n])
			x += n
		}
	}
}

// factorise replaces a packed matrix of the columns and the residual by its Cholesky
// factor, and returns the chi-square and the logarithm of the determinant of the
// columns' part; ok is false where that is not positive definite.
func factorise(g []float64, size int) (chi2, logDet float64, ok bool) {
	product := 1.0
	i := 0
	for j := range size + 1 {
		row := g[i : i+j+1]
		at := 0
		for k := range j {
			other := g[at : at+k+1]
			sum := row[k]
			for l, x := range other[:k] {
				sum -= row[l] * x
			}
			row[k] = sum * other[k] // the diagonal holds reciprocals
			at += k + 1
		}
		sum := row[j]
		for _, x := range row[:j] {
			sum -= x * x
		}
		if j == size {
			if product != 1 {
				logDet += math.Log(product)
			}
			return sum, logDet, !(sum < 0) && sum-sum == 0
		}
		if !(sum > 1e-13*math.Abs(row[j])) || math.IsInf(sum, 1) {
			return 0, 0, false
		}
		if product *= sum; product > 1e200 || product < 1e-200 {
			logDet += math.Log(product)
			product = 1
		}
		row[j] = 1 / math.Sqrt(sum)
		i += j + 1
	}
	return 0, 0, false
}

// solved turns a factor into the coefficients (relative to a flat curve of 1) and, if
// inverse is not nil, into the inverse of the columns' part, packed.
func solved(g []float64, size int, s, inverse []float64) {
	last := g[pairs(size):]
	for j := size - 1; j >= 0; j-- {
		sum := last[j]
		for k := j + 1; k < size; k++ {
			sum -= g[pairs(k)+j] * s[k]
		}
		s[j] = sum * g[pairs(j)+j]
	}
	if inverse == nil {
		return
	}
	// Rows of the inverse of the factor, then their products.
	lower := make([]float64, pairs(size))
	for j := range size {
		row := lower[pairs(j):]
		for k := j; k >= 0; k-- {
			if k == j {
				row[k] = g[pairs(j)+j]
				continue
			}
			sum := 0.0
			for l := k; l < j; l++ {
				sum -= g[pairs(j)+l] * lower[pairs(l)+k]
			}
			row[k] = sum * g[pairs(j)+j]
		}
	}
	for j := range size {
		for k := range j + 1 {
			sum := 0.0
			for l := j; l < size; l++ {
				sum += lower[pairs(l)+j] * lower[pairs(l)+k]
			}
			inverse[pairs(j)+k] = sum
		}
	}
}
