package noise

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// kernels are the terms of a model with the inputs they read.
type kernels struct {
	terms [][]kernel // factors of each term
}

type kernel struct {
	kind   string
	inputs [][]float64
}

func newKernels(m Model, d Data) *kernels {
	out := &kernels{terms: make([][]kernel, len(m.Terms))}
	for t, term := range m.Terms {
		for _, f := range term.Factors {
			k := kernel{kind: f.Kind}
			for _, name := range f.inputs() {
				x, _ := d.input(name) // checked before
				k.inputs = append(k.inputs, append([]float64(nil), x...))
			}
			out.terms[t] = append(out.terms[t], k)
		}
	}
	return out
}

// evaluate returns the kernel between place i of a and place j of k's own inputs,
// and writes its derivatives by the logarithms of the parameters, of which it
// returns the number, to by (unless that is nil).
func (k *kernel) evaluate(a [][]float64, i, j int, values, by []float64) (value float64, used int) {
	if k.kind == Oscillator {
		s := timescaleOf(Oscillator, values)
		τ := math.Abs(a[0][i] - k.inputs[0][j])
		var p propagator
		s.propagate(&p, τ)
		if by != nil {
			by[0] = -p.byRate(s, s.rate*τ)[0]
			by[1] = -p.byDamping(s, s.rate*τ)[0]
		}
		return p.phi[0], 2
	}
	sum := 0.0
	for c, x := range k.inputs {
		d := (a[c][i] - x[j]) / values[c]
		sum += d * d
	}
	value, slope := radial(k.kind, sum)
	if by != nil {
		for c, x := range k.inputs {
			d := (a[c][i] - x[j]) / values[c]
			by[c] = slope * d * d
		}
	}
	return value, len(k.inputs)
}

// radial returns a kernel at the squared distance, and minus twice its derivative
// by that: times the square of one input's difference, it is the derivative by the
// logarithm of that input's scale.
func radial(kind string, square float64) (value, slope float64) {
	if math.IsInf(square, 1) {
		return 0, 0
	}
	d := math.Sqrt(square)
	switch kind {
	case SquaredExponential:
		value = math.Exp(-square / 2)
		return value, value
	case Matern32:
		e := math.Exp(-math.Sqrt(3) * d)
		return (1 + math.Sqrt(3)*d) * e, 3 * e
	case Matern52:
		x := math.Sqrt(5) * d
		e := math.Exp(-x)
		return (1 + x + x*x/3) * e, 5. / 3 * (1 + x) * e
	}
	value = math.Exp(-d)
	if d == 0 {
		return value, 0
	}
	return value, value / d
}

// covariance returns that of place i of inputs a, ordered as the kernels are, with
// sample j, from the terms' values. only is the term that counts, -1 for all.
// Derivatives go to by, unless that is nil.
func (k *kernels) covariance(a [][][][]float64, i, j int, values, by []float64, only int) float64 {
	sum := 0.0
	for t, factors := range k.terms {
		product := values[0] * values[0]
		used := 1
		for f := range factors {
			var into []float64
			if by != nil {
				into = by[used:]
			}
			v, n := factors[f].evaluate(a[t][f], i, j, values[used:], into)
			if by != nil {
				// What was found before is multiplied by v, what is new by what was before.
				for p := 1; p < used; p++ {
					by[p] *= v
				}
				for p := used; p < used+n; p++ {
					by[p] *= product
				}
			}
			product *= v
			used += n
		}
		if by != nil {
			by[0] = 2 * product
			by = by[used:]
		}
		if only < 0 || only == t {
			sum += product
		}
		values = values[used:]
	}
	return sum
}

// own is the inputs of the kernels as [kernels.covariance] wants them.
func (k *kernels) own() [][][][]float64 {
	out := make([][][][]float64, len(k.terms))
	for t, factors := range k.terms {
		for _, f := range factors {
			out[t] = append(out[t], f.inputs)
		}
	}
	return out
}

// A factor is the Cholesky factor of a dense covariance.
type factor struct {
	lower blas64.Triangular
}

// factorise builds and factorises the covariance.
func (q *process) factorise(values []float64) (factor, error) {
	n := len(q.data.Time)
	k := blas64.Symmetric{N: n, Stride: n, Data: make([]float64, n*n), Uplo: blas.Lower}
	white := make([]float64, n)
	q.whiteVariance(white, values)
	own, terms := q.dense.own(), values[q.whiteCount():]
	for i := range n {
		row := k.Data[i*n:]
		for j := range i + 1 {
			row[j] = q.dense.covariance(own, i, j, terms, nil, -1)
		}
		row[i] += white[i]
		if !finite(row[i]) {
			return factor{}, errRange
		}
	}
	lower, ok := lapack64.Potrf(k)
	if !ok {
		return factor{}, errors.New("noise: the covariance is singular in double precision; expected errors, or a jitter, that do not vanish beside the correlated noise")
	}
	return factor{lower}, nil
}

func (f factor) logDet() float64 {
	sum := newLogSum()
	for i := range f.lower.N {
		sum.multiply(f.lower.Data[i*f.lower.Stride+i])
	}
	return 2 * sum.log()
}

func (f factor) whiten(v []float64) {
	blas64.Trsv(blas.NoTrans, f.lower, blas64.Vector{N: len(v), Inc: 1, Data: v})
}

func (f factor) colour(v []float64) {
	blas64.Trmv(blas.NoTrans, f.lower, blas64.Vector{N: len(v), Inc: 1, Data: v})
}

func (f factor) solve(v []float64) {
	f.whiten(v)
	blas64.Trsv(blas.Trans, f.lower, blas64.Vector{N: len(v), Inc: 1, Data: v})
}

func (f factor) logLikelihood(residual []float64) (float64, error) {
	z := append([]float64(nil), residual...)
	f.whiten(z)
	chi2 := 0.0
	for _, x := range z {
		chi2 += x * x
	}
	value := -(chi2 + f.logDet() + float64(len(z))*math.Log(2*math.Pi)) / 2
	if !finite(value) {
		return math.NaN(), errRange
	}
	return value, nil
}

// denseGradient is the gradient by the terms' parameters, residuals and variances:
// tr((ααᵀ - K⁻¹) ∂K)/2 with α = K⁻¹r (Rasmussen & Williams 2006, equation 5.9).
func (q *process) denseGradient(out *Gradient, values, residual []float64) error {
	f, err := q.factorise(values)
	if err != nil {
		return err
	}
	if out.LogLikelihood, err = f.logLikelihood(residual); err != nil {
		return err
	}
	α := append([]float64(nil), residual...)
	f.solve(α)
	inverse, ok := lapack64.Potri(f.lower)
	if !ok {
		return errRange
	}
	own, white := q.dense.own(), q.whiteCount()
	terms, byLog := values[white:], out.ByLog[white:]
	by, row := make([]float64, len(terms)), make([]float64, len(terms))
	for i, a := range α {
		clear(row)
		for j := range i {
			q.dense.covariance(own, i, j, terms, by, -1)
			weight := a*α[j] - inverse.Data[i*inverse.Stride+j]
			for p, b := range by {
				row[p] += weight * b
			}
		}
		q.dense.covariance(own, i, i, terms, by, -1)
		half := (a*a - inverse.Data[i*inverse.Stride+i]) / 2
		for p, b := range by {
			byLog[p] += row[p] + half*b
		}
		out.ByVariance[i] = half
		out.ByResidual[i] = -a
	}
	return nil
}

// predictDense predicts at other inputs.
func (c *covariance) predictDense(out *Prediction, residual []float64, at Data, which int) {
	q := c.q
	n := len(q.data.Time)
	there := newKernels(q.model, at)
	places, terms := there.own(), c.values[q.whiteCount():]
	α := append([]float64(nil), residual...)
	c.dense.solve(α)
	v := make([]float64, n)
	for i := range at.Time {
		for j := range v {
			v[j] = q.dense.covariance(places, i, j, terms, nil, which)
			out.Mean[i] += v[j] * α[j]
		}
		out.Variance[i] = there.covariance(places, i, i, terms, nil, which)
		c.dense.whiten(v)
		for _, x := range v {
			out.Variance[i] -= x * x
		}
	}
}
