package sample

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// UniformQuantile is the quantile at p of a flat distribution between lo and hi:
// a prior of [Nested].
func UniformQuantile(p, lo, hi float64) float64 {
	return lo*(1-p) + hi*p
}

// LogUniformQuantile is the quantile at p of a distribution flat in the logarithm
// between lo > 0 and hi; NaN for other limits.
func LogUniformQuantile(p, lo, hi float64) float64 {
	if !(lo > 0 && hi > 0) {
		return math.NaN()
	}
	return math.Exp(UniformQuantile(p, math.Log(lo), math.Log(hi)))
}

// NormalQuantile is the quantile at p of a normal distribution; NaN for p outside
// 0 to 1.
func NormalQuantile(p, mean, sd float64) float64 {
	if !(p >= 0 && p <= 1) {
		return math.NaN()
	}
	return mean + sd*mathext.NormalQuantile(p)
}

// TruncatedNormalQuantile is the quantile at p of a normal distribution cut to lo
// to hi, either of which may be infinite; NaN for p outside 0 to 1, and for limits
// out of order.
func TruncatedNormalQuantile(p, mean, sd, lo, hi float64) float64 {
	if !(p >= 0 && p <= 1 && lo < hi && sd > 0) {
		return math.NaN()
	}
	a, b := (lo-mean)/sd, (hi-mean)/sd
	// The upper tail is computed as a lower one, for its digits.
	mirrored := a > 0
	if mirrored {
		a, b, p = -b, -a, 1-p
	}
	below, above := normal(a), normal(b)
	z := mathext.NormalQuantile(UniformQuantile(p, below, above))
	if math.IsInf(z, -1) { // farther out than 37 standard deviations, where it is at the near limit
		z = b
	}
	if mirrored {
		z = -z
	}
	return min(max(mean+sd*z, lo), hi)
}

// normal is the distribution function of the standard normal distribution.
func normal(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }
