package fit

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/spectrum"
)

// SharedCovariance returns the covariance that the depths of channels have in
// common because the same uncertain orbit was held in all of their fits: S C Sᵀ,
// with row i of S the ShiftGeometry of point i and C the covariance of the white
// posterior. The full covariance of the depths is this plus the squares of
// DepthErr on the diagonal: the white fit's errors in the orbit are, to first
// order, independent of the channels' own, as the estimate of the orbit does not
// change with a signal of the shape that a depth, limb darkening or the trend has.
//
// The result has one row and column per point; those of points without a depth,
// or without a ShiftGeometry that fits the posterior, are NaN. It is nil for more
// points than a spectrum can have, spectrum.MaxPoints.
func SharedCovariance(points []spectrum.Point, white Posterior) [][]float64 {
	n, size := len(points), len(white.Names)
	if n > spectrum.MaxPoints {
		return nil
	}
	out := make([][]float64, n)
	spread := make([][]float64, n) // C Sᵀ
	known := make([]bool, n)
	for i, p := range points {
		out[i] = make([]float64, n)
		known[i] = p.Good() && len(p.ShiftGeometry) == size && len(white.Cov) == size
		if !known[i] {
			continue
		}
		spread[i] = make([]float64, size)
		for g, shift := range p.ShiftGeometry {
			if shift != 0 && len(white.Cov[g]) == size { // 0 leaves out parameters not held, whose variance may be infinite
				floats.AddScaled(spread[i], shift, white.Cov[g])
			}
		}
	}
	for i := range n {
		for j := range n {
			out[i][j] = math.NaN()
			if !known[i] || !known[j] {
				continue
			}
			sum := 0.0
			for g, shift := range points[i].ShiftGeometry {
				if shift != 0 {
					sum += shift * spread[j][g]
				}
			}
			out[i][j] = sum
		}
	}
	return out
}
