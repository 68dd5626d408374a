package noise

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// A LinearFit is a linear model fitted by generalised least squares.
type LinearFit struct {
	Value         []float64   // coefficient of each column
	Err           []float64   // standard deviations
	Cov           [][]float64 // covariance of the coefficients
	Chi2          float64     // of whitened residuals
	Dof           int
	LogLikelihood float64   // at the best coefficients
	Residual      []float64 // data less model
}

// mostColumns bounds a linear model.
const mostColumns = 200

// LeastSquares fits y, one number for each time, by a linear combination of
// columns (Aitken 1935): the least squares of whitened columns and data. Errors are
// those that the covariance implies; nothing is inflated. It is an error when there
// are more columns than times, or columns depend on each other.
func (c Covariance) LeastSquares(columns [][]float64, y []float64) (LinearFit, error) {
	if c.c == nil {
		return LinearFit{}, errNoCovariance
	}
	n, p := len(c.c.q.data.Time), len(columns)
	if p == 0 || p > n || p > mostColumns {
		return LinearFit{}, fmt.Errorf("generalised least squares: %d columns for %d times; expected 1 to %d, and no more than times", p, n, mostColumns)
	}
	white, err := c.Whiten(append(append([][]float64(nil), columns...), y))
	if err != nil {
		return LinearFit{}, fmt.Errorf("generalised least squares: %w", err)
	}
	design, norm := mat.NewDense(n, p, nil), make([]float64, p)
	for k, column := range white[:p] {
		if norm[k] = mat.Norm(mat.NewVecDense(n, column), 2); !(norm[k] > 0) || math.IsInf(norm[k], 0) {
			return LinearFit{}, fmt.Errorf("generalised least squares: column %d is 0, or too large or too small to compute with", k)
		}
		for i, x := range column {
			design.Set(i, k, x/norm[k])
		}
	}
	var qr mat.QR
	qr.Factorize(design)
	if cond := qr.Cond(); !(cond < 1e13) {
		return LinearFit{}, fmt.Errorf("generalised least squares: columns depend on each other (condition number %.3g)", cond)
	}
	var x, r, inverse mat.Dense
	if err := qr.SolveTo(&x, false, mat.NewVecDense(n, white[p])); err != nil {
		return LinearFit{}, fmt.Errorf("generalised least squares: %w", err)
	}
	qr.RTo(&r)
	identity := mat.NewDiagDense(p, nil)
	for k := range p {
		identity.SetDiag(k, 1)
	}
	if err := inverse.Solve(r.Slice(0, p, 0, p), identity); err != nil {
		return LinearFit{}, fmt.Errorf("generalised least squares: %w", err)
	}
	out := LinearFit{Dof: n - p, Value: make([]float64, p), Err: make([]float64, p), Residual: append([]float64(nil), y...)}
	for k := range p {
		out.Value[k] = x.At(k, 0) / norm[k]
		row := make([]float64, p)
		for l := range p {
			row[l] = mat.Dot(inverse.RowView(k), inverse.RowView(l)) / norm[k] / norm[l]
		}
		out.Cov = append(out.Cov, row)
		out.Err[k] = math.Sqrt(row[k])
		if !finite(out.Value[k]) || !finite(out.Err[k]) {
			return LinearFit{}, errRange
		}
	}
	for i := range n {
		z := white[p][i]
		for k := range p {
			z -= design.At(i, k) * x.At(k, 0)
			out.Residual[i] -= columns[k][i] * out.Value[k]
		}
		out.Chi2 += z * z
	}
	out.LogLikelihood = -(out.Chi2 + c.LogDet() + float64(n)*math.Log(2*math.Pi)) / 2
	if !finite(out.LogLikelihood) {
		return LinearFit{}, errRange
	}
	return out, nil
}
