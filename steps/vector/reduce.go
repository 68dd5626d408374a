package vector

import (
	"math"
	"slices"
)

// run is the number of elements that a pairwise sum adds from left to right.
const run = 64

// sum adds the elements of x pairwise.
func sum(x []float64) float64 {
	if len(x) <= run {
		s := 0.0
		for _, a := range x {
			s += a
		}
		return s
	}
	half := len(x) / 2
	return sum(x[:half]) + sum(x[half:])
}

// dot is the pairwise sum of products; x and y have the same length.
func dot(x, y []float64) float64 {
	if len(x) <= run {
		s := 0.0
		for i, a := range x {
			s += float64(a * y[i])
		}
		return s
	}
	half := len(x) / 2
	return dot(x[:half], y[:half]) + dot(x[half:], y[half:])
}

// norm is the root of the sum of squares, of elements divided by the largest,
// so that squares do not overflow.
func norm(x []float64) float64 {
	largest := 0.0
	for _, a := range x {
		largest = max(largest, math.Abs(a))
	}
	if largest == 0 || largest-largest != 0 { // zeros, infinities or NaN
		return largest
	}
	scaled := make([]float64, len(x))
	for i, a := range x {
		scaled[i] = a / largest
	}
	return largest * math.Sqrt(dot(scaled, scaled))
}

// middle is the median of x, which it sorts; NaN when x is empty or holds NaN.
func middle(x []float64) float64 {
	n := len(x)
	if n == 0 {
		return math.NaN()
	}
	slices.Sort(x) // NaN comes first
	if math.IsNaN(x[0]) {
		return math.NaN()
	}
	a, b := x[(n-1)/2], x[n/2]
	if a == b {
		return a
	}
	return a/2 + b/2
}

// whole returns the elements, or NaN alone when there is a fault.
func (v V) whole() []float64 {
	if v.Fault != "" {
		return []float64{math.NaN()}
	}
	return v.X
}

// Sum returns the sum of all elements, added pairwise; 0 of an empty column.
func (v V) Sum() float64 { return sum(v.whole()) }

// Mean returns the arithmetic mean; NaN of an empty column.
func (v V) Mean() float64 {
	x := v.whole()
	return sum(x) / float64(len(x))
}

// StdDev returns the standard deviation of the sample, the root of the sum of
// squared deviations from the mean divided by n-1; NaN of fewer than two
// elements.
func (v V) StdDev() float64 {
	x := v.whole()
	n := float64(len(x))
	if n < 2 {
		return math.NaN()
	}
	mean := sum(x) / n
	deviation := make([]float64, len(x))
	for i, a := range x {
		deviation[i] = a - mean
	}
	return norm(deviation) / math.Sqrt(n-1)
}

// Median returns the middle element, or the mean of the two middle ones; NaN of
// an empty column.
func (v V) Median() float64 { return middle(slices.Clone(v.whole())) }

// MAD returns the median absolute deviation from the median; NaN of an empty
// column. Times 1.4826 it estimates the standard deviation of normal noise.
func (v V) MAD() float64 {
	x := slices.Clone(v.whole())
	center := middle(x)
	for i, a := range x {
		x[i] = math.Abs(a - center)
	}
	return middle(x)
}

// Min returns the smallest element; NaN of an empty column.
func (v V) Min() float64 {
	x := v.whole()
	if len(x) == 0 {
		return math.NaN()
	}
	return slices.Min(x)
}

// Max returns the largest element; NaN of an empty column.
func (v V) Max() float64 {
	x := v.whole()
	if len(x) == 0 {
		return math.NaN()
	}
	return slices.Max(x)
}

// Dot returns the sum of the products of v and u, added pairwise; NaN when they
// have different lengths or one carries a fault.
func (v V) Dot(u V) float64 {
	if pair("Dot", v, u) != "" {
		return math.NaN()
	}
	return dot(v.X, u.X)
}

// Norm returns the root of the sum of squares; 0 of an empty column.
func (v V) Norm() float64 { return norm(v.whole()) }
