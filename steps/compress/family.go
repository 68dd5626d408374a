package compress

import (
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"rimlight/steps/systematics"
)

// rare is the norm of a column of a family, relative to the largest, below which it is
// left out: exponentials of a thousandth of the flux are then right to a few parts in
// 10⁹.
const rare = 3e-6

// mostShapes bounds the polynomials in ln τ, which the widest range of times needs.
const mostShapes = 64

// A family is exponentials of all e-folding times between two limits as combinations
// of a few columns: exp(-age/τ) = Σ c_m(ln τ) S_m, the columns orthogonal and of mean
// square 1 over the integrations.
type family struct {
	lo, hi  float64 // of ln τ, τ in days
	columns [][]float64
	shape   [][]float64 // of each column: Chebyshev coefficients of c_m between lo and hi
	t       int         // how many of those
}

// newFamily makes a family of exponentials from a start, for ln τ from lo to hi.
func newFamily(times []float64, start, lo, hi float64) *family {
	points := int(math.Min(mostShapes, math.Max(12, math.Ceil(12*(hi-lo)))))
	raw := make([][]float64, points)
	f := &family{lo: lo, hi: hi, t: points}
	for i, x := range chebyshevNodes(points) {
		raw[i] = systematics.Settle(times, start, math.Exp(f.at(x)))
	}
	f.settle(raw, math.Sqrt(float64(len(times))), rare)
	return f
}

// at is ln τ at x, from -1 to 1.
func (f *family) at(x float64) float64 { return (f.lo+f.hi)/2 + x*(f.hi-f.lo)/2 }

// settle finds columns and shapes from exponentials at the nodes; unit is the norm that
// columns get, rare the relative norm below which they are left out.
func (f *family) settle(raw [][]float64, unit, rare float64) {
	n := len(raw)
	norm, vectors := decompose(raw)
	transform := chebyshevTransform(n)
	for m := range norm {
		if !(norm[m] > rare*norm[0]) {
			break
		}
		column := make([]float64, len(raw[0]))
		shape := make([]float64, n)
		for i := range n {
			floats.AddScaled(column, vectors.At(i, m)*unit/norm[m], raw[i])
			for k := range n {
				shape[k] += transform[k][i] * vectors.At(i, m) * norm[m] / unit
			}
		}
		f.columns, f.shape = append(f.columns, column), append(f.shape, shape)
	}
}

// decompose gives roots of the eigenvalues of the matrix of products of functions of
// time, decreasing, and the eigenvectors in that order; nothing for numbers that are not
// finite.
func decompose(raw [][]float64) (norm []float64, vectors *mat.Dense) {
	n := len(raw)
	products := mat.NewSymDense(n, nil)
	for a := range n {
		for b := range a + 1 {
			products.SetSym(a, b, floats.Dot(raw[a], raw[b]))
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(products, true) {
		return nil, nil
	}
	square := eigen.Values(nil) // increasing
	var increasing mat.Dense
	eigen.VectorsTo(&increasing)
	vectors = mat.NewDense(n, n, nil)
	for a := range n {
		norm = append(norm, math.Sqrt(math.Max(0, square[n-1-a])))
		for i := range n {
			vectors.Set(i, a, increasing.At(i, n-1-a))
		}
	}
	return norm, vectors
}

// combine sets c to the coefficients at ln τ.
func (f *family) combine(logTau float64, c []float64) {
	x := (2*logTau - f.lo - f.hi) / (f.hi - f.lo)
	var room [mostShapes]float64
	t := room[:f.t]
	chebyshev(math.Min(1, math.Max(-1, x)), t, nil)
	for m, shape := range f.shape {
		c[m] = floats.Dot(shape, t)
	}
}

// narrow is the family for a part of the range, which takes fewer columns, and fewer
// still where exponentials need not be as right as rare says by default.
func (f *family) narrow(lo, hi, rare float64) *family {
	const points = 12
	out := &family{lo: lo, hi: hi, t: points}
	k := len(f.columns)
	raw := make([][]float64, points) // in terms of the columns, which are orthogonal
	for i, x := range chebyshevNodes(points) {
		raw[i] = make([]float64, k)
		f.combine(out.at(x), raw[i])
	}
	out.settle(raw, 1, rare)
	for m, mix := range out.columns {
		column := make([]float64, len(f.columns[0]))
		for j, share := range mix {
			floats.AddScaled(column, share, f.columns[j])
		}
		out.columns[m] = column
	}
	return out
}
