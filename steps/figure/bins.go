package figure

import (
	"math"
	"slices"

	"rimlight/steps/lightcurve"
)

// bins holds averages of a series over equal intervals of time; intervals without
// a value are left out.
type bins struct {
	x, y  []float64 // means; hours, and the unit of the series
	count []int
	width float64 // of an interval, hours
}

// newBins joins every so many intervals of averages to one; hours count from
// zero.
func newBins(a lightcurve.Averages, every int, zero float64) bins {
	out := bins{width: (a.End - a.Begin) * hours * float64(every) / float64(len(a.Value))}
	for from := 0; from < len(a.Value); from += every {
		x, y, count := 0.0, 0.0, 0
		for k := from; k < min(from+every, len(a.Value)); k++ {
			if n := a.Used[k]; n > 0 {
				x += (a.Time[k] - zero) * hours * float64(n)
				y += a.Value[k] * float64(n)
				count += n
			}
		}
		if count > 0 {
			out.x = append(out.x, x/float64(count))
			out.y = append(out.y, y/float64(count))
			out.count = append(out.count, count)
		}
	}
	return out
}

// extent returns the least and the greatest finite value, NaN without any.
func extent(x []float64) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, v := range x {
		if finite(v) {
			lo, hi = min(lo, v), max(hi, v)
		}
	}
	if lo > hi {
		return math.NaN(), math.NaN()
	}
	return lo, hi
}

// finites returns the finite values of x, sorted.
func finites(x []float64) []float64 {
	out := make([]float64, 0, len(x))
	for _, v := range x {
		if finite(v) {
			out = append(out, v)
		}
	}
	slices.Sort(out)
	return out
}

// quantile returns the value below which the share q of the sorted values lies,
// interpolated; NaN without values.
func quantile(sorted []float64, q float64) float64 {
	if len(sorted) == 0 {
		return math.NaN()
	}
	at := q * float64(len(sorted)-1)
	k := min(int(at), len(sorted)-1)
	if k == len(sorted)-1 {
		return sorted[k]
	}
	return sorted[k] + (at-float64(k))*(sorted[k+1]-sorted[k])
}

// median returns the median of the finite values of x, NaN without any.
func median(x []float64) float64 { return quantile(finites(x), 0.5) }

// rms returns the root mean square of the finite values of x, NaN without any.
func rms(x []float64) float64 {
	sum, n := 0.0, 0
	for _, v := range x {
		if finite(v) {
			sum += v * v
			n++
		}
	}
	return math.Sqrt(sum / float64(n))
}

// thin returns every k-th index of n, with k such that at most limit are left.
func thin(n, limit int) (index []int, every int) {
	every = max(1, (n+limit-1)/limit)
	for i := 0; i < n; i += every {
		index = append(index, i)
	}
	return index, every
}

// spread returns at most count indices below n, first and last among them, as
// evenly as they can be.
func spread(n, count int) []int {
	count = min(n, count)
	out := make([]int, 0, count)
	for k := range count {
		at := 0
		if count > 1 {
			at = int(math.Round(float64(k) * float64(n-1) / float64(count-1)))
		}
		out = append(out, at)
	}
	return out
}

// pick returns the elements of x at the indices.
func pick(x []float64, index []int) []float64 {
	out := make([]float64, len(index))
	for k, i := range index {
		out[k] = x[i]
	}
	return out
}
