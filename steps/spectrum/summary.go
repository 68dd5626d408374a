package spectrum

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// A Summary describes a spectrum in a few numbers. Depths are pure numbers;
// what cannot be computed is NaN.
type Summary struct {
	Channels     int     // all channels
	Good         int     // channels with a depth
	Flagged      int     // channels with a flag, with or without a depth
	Lo           float64 // lower edge of the first channel with a depth, um
	Hi           float64 // upper edge of the last channel with a depth, um
	MedianErr    float64 // median error of a depth, shared part included
	MeanDepth    float64 // generalised-least-squares mean of the depths
	MeanDepthErr float64 // its standard deviation
	FlatChi2     float64 // chi-square of the depths about MeanDepth, with their covariance
	FlatDof      int     // its degrees of freedom, Good - 1
}

// Summary condenses the spectrum. The mean is the one of least variance given
// the whole covariance, and FlatChi2 tests whether the spectrum is flat: a part
// of the covariance that shifts all depths alike widens the error of the mean but
// does not hide a slope (Aitken 1936 for the estimator, cited from memory). A
// covariance of another size than the points counts as none.
func (s Spectrum) Summary() Summary {
	nan := math.NaN()
	out := Summary{Channels: len(s.Points), Lo: nan, Hi: nan, MedianErr: nan, MeanDepth: nan, MeanDepthErr: nan, FlatChi2: nan}
	sigma := s.Errors()
	var good []int
	var errs []float64
	for i, p := range s.Points {
		if p.Flag != "" {
			out.Flagged++
		}
		if finite(sigma[i]) && finite(p.Depth) {
			good = append(good, i)
			errs = append(errs, sigma[i])
		}
	}
	out.Good = len(good)
	if out.Good == 0 {
		return out
	}
	out.Lo, out.Hi = s.Points[good[0]].Channel.Lo, s.Points[good[len(good)-1]].Channel.Hi
	out.MedianErr = median(slices.Clone(errs))
	out.FlatDof = out.Good - 1
	if s.correlated() {
		s.fitCorrelated(&out, good, errs)
	} else {
		s.fitIndependent(&out, good, errs)
	}
	return out
}

// fitIndependent sets the mean and its chi-square from the points good, which
// have errors sigma and nothing in common.
func (s Spectrum) fitIndependent(out *Summary, good []int, sigma []float64) {
	var information, sum, chi2 float64
	for k, i := range good {
		weight := 1 / (sigma[k] * sigma[k])
		information += weight
		sum += weight * s.Points[i].Depth
	}
	mean := sum / information
	for k, i := range good {
		pull := (s.Points[i].Depth - mean) / sigma[k]
		chi2 += pull * pull
	}
	out.MeanDepth, out.MeanDepthErr, out.FlatChi2 = mean, 1/math.Sqrt(information), chi2
}

// fitCorrelated does the same with the whole covariance. It leaves out as it is
// when that is not positive definite.
func (s Spectrum) fitCorrelated(out *Summary, good []int, sigma []float64) {
	var factor mat.Cholesky
	if !factor.Factorize(s.covariance(good, sigma)) {
		return
	}
	ones, depth := mat.NewVecDense(len(good), nil), mat.NewVecDense(len(good), nil)
	for k, i := range good {
		ones.SetVec(k, 1)
		depth.SetVec(k, s.Points[i].Depth)
	}
	var weight, solved mat.VecDense
	// A badly conditioned covariance is reported as an error beside the solution;
	// the solution is the best there is, so it is used.
	_ = factor.SolveVecTo(&weight, ones)
	information := mat.Dot(ones, &weight)
	mean := mat.Dot(depth, &weight) / information
	out.MeanDepth, out.MeanDepthErr = mean, 1/math.Sqrt(information)
	residual := mat.NewVecDense(len(good), nil)
	residual.AddScaledVec(depth, -mean, ones)
	_ = factor.SolveVecTo(&solved, residual)
	out.FlatChi2 = mat.Dot(residual, &solved)
}

// covariance returns the covariance of the points good, which have errors
// sigma. Elements that are not finite count as zero.
func (s Spectrum) covariance(good []int, sigma []float64) *mat.SymDense {
	cov := mat.NewSymDense(len(good), nil)
	for a, i := range good {
		for b := 0; b < a; b++ {
			if c := s.Cov[i][good[b]]; finite(c) {
				cov.SetSym(a, b, c)
			}
		}
		cov.SetSym(a, a, sigma[a]*sigma[a])
	}
	return cov
}

// median returns the median of x, which it sorts; NaN when x is empty.
func median(x []float64) float64 {
	n := len(x)
	if n == 0 {
		return math.NaN()
	}
	slices.Sort(x)
	return x[(n-1)/2] + (x[n/2]-x[(n-1)/2])/2
}
