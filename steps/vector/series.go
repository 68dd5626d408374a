package vector

import (
	"fmt"
	"math"
	"sort"
)

// CumulativeSum returns the sums of the elements up to and including each one,
// added from left to right.
func (v V) CumulativeSum() V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	out := make([]float64, len(v.X))
	s := 0.0
	for i, x := range v.X {
		s += x
		out[i] = s
	}
	return V{X: out}
}

// Diff returns each element but the first less the one before it: a column
// shorter by one, or empty when v is.
func (v V) Diff() V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	out := make([]float64, max(0, len(v.X)-1))
	for i := range out {
		out[i] = v.X[i+1] - v.X[i]
	}
	return V{X: out}
}

// Gather returns the elements at the given indices, counted from 0: a column as
// long as indices.
func (v V) Gather(indices []int) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	out := make([]float64, len(indices))
	for k, i := range indices {
		if i < 0 || i >= len(v.X) {
			return V{Fault: fmt.Sprintf("Gather of element %d; expected indices from 0 to below %d", i, len(v.X))}
		}
		out[k] = v.X[i]
	}
	return V{X: out}
}

// Interpolate returns, for each element of v, the value of the piecewise linear
// function through the points (x, y); NaN outside the range of x. x has at least
// one element, is finite and strictly increasing, and y has its length.
func (v V) Interpolate(x, y V) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	if fault := pair("Interpolate", x, y); fault != "" {
		return V{Fault: fault}
	}
	n := len(x.X)
	if n == 0 {
		return V{Fault: "Interpolate between no points; expected at least one"}
	}
	for i, a := range x.X {
		if a-a != 0 || i > 0 && a <= x.X[i-1] {
			return V{Fault: fmt.Sprintf("Interpolate between points at x, whose element %d is %g; expected finite and increasing numbers", i, a)}
		}
	}
	out := make([]float64, len(v.X))
	at := 0 // the segment of the element before
	for i, t := range v.X {
		if !(t >= x.X[0] && t <= x.X[n-1]) {
			out[i] = math.NaN()
			continue
		}
		if !(x.X[at] <= t && (at+1 == n || t < x.X[at+1])) {
			at = sort.Search(n, func(k int) bool { return x.X[k] > t }) - 1
		}
		out[i] = y.X[at]
		if t > x.X[at] {
			share := (t - x.X[at]) / (x.X[at+1] - x.X[at])
			out[i] += float64(share * (y.X[at+1] - y.X[at]))
		}
	}
	return V{X: out}
}
