package figure

import (
	"math"
	"slices"
)

// bins holds averages of a series over equal intervals of x; intervals without a
// value are left out.
type bins struct {
	x, y  []float64 // means
	count []int
	width float64 // of an interval
}

// binned averages the finite values of y in n equal intervals between the least
// and the greatest finite x.
func binned(x, y []float64, n int) bins {
	lo, hi := extent(x)
	if !(hi > lo) || n < 1 || math.IsInf(hi-lo, 0) {
		n, hi = 1, lo
	}
	sumX, sumY, count := make([]float64, n), make([]float64, n), make([]int, n)
	for i := range x {
		if !finite(x[i]) || !finite(y[i]) {
			continue
		}
		k := 0
		if hi > lo {
			k = min(int(float64(n)*((x[i]-lo)/(hi-lo))), n-1)
		}
		sumX[k] += x[i]
		sumY[k] += y[i]
		count[k]++
	}
	out := bins{width: (hi - lo) / float64(n)}
	for k, c := range count {
		if c > 0 {
			out.x = append(out.x, sumX[k]/float64(c))
			out.y = append(out.y, sumY[k]/float64(c))
			out.count = append(out.count, c)
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

// simplified returns the indices of a subset of points, in order, between which a
// line leaves none of the others out by more than tolerance in y (the method of
// Douglas & Peucker 1973, with the distance taken along y). Points that are not
// finite are passed over.
func simplified(x, y []float64, tolerance float64) []int {
	var all []int
	for i := range x {
		if finite(x[i]) && finite(y[i]) {
			all = append(all, i)
		}
	}
	if len(all) < 3 {
		return all
	}
	keep := make([]bool, len(all))
	keep[0], keep[len(all)-1] = true, true
	todo := [][2]int{{0, len(all) - 1}}
	for len(todo) > 0 {
		from, to := todo[len(todo)-1][0], todo[len(todo)-1][1]
		todo = todo[:len(todo)-1]
		a, b := all[from], all[to]
		worst, at := tolerance, -1
		for k := from + 1; k < to; k++ {
			i := all[k]
			onLine := y[a]
			if x[b] != x[a] {
				onLine += (y[b] - y[a]) * ((x[i] - x[a]) / (x[b] - x[a]))
			}
			if off := math.Abs(y[i] - onLine); off > worst {
				worst, at = off, k
			}
		}
		if at >= 0 {
			keep[at] = true
			todo = append(todo, [2]int{from, at}, [2]int{at, to})
		}
	}
	out := all[:0]
	for k, i := range all {
		if keep[k] {
			out = append(out, i)
		}
	}
	return out
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
