package diagnose

import "math"

// Bounds on how a model is drawn: how far the line may lie from it, in units of
// its depth and at least, and from how many points.
const (
	bend       = 5e-4
	leastBend  = 1e-9
	mostPoints = 500
)

// A stretch is a run of points that a straight line from the first to the last
// one stands for; at is the one that lies farthest from it, and off how far.
type stretch struct {
	from, to int
	at       int
	off      float64
}

// polyline returns the indices of a subset of points, in order, between which a
// line leaves none of the others out by more than tolerance in y (the method of
// Douglas & Peucker 1973, with the distance taken along y), or of as many points as
// allowed, those that matter most. Points that are not finite are passed over.
func polyline(x, y []float64, tolerance float64, most int) []int {
	var all []int
	for i := range x {
		if finite(x[i]) && finite(y[i]) {
			all = append(all, i)
		}
	}
	if len(all) < 3 {
		return all
	}
	measure := func(from, to int) stretch {
		s := stretch{from: from, to: to}
		a, b := all[from], all[to]
		for k := from + 1; k < to; k++ {
			i := all[k]
			onLine := y[a]
			if x[b] != x[a] {
				onLine += (y[b] - y[a]) * ((x[i] - x[a]) / (x[b] - x[a]))
			}
			if off := math.Abs(y[i] - onLine); off > s.off {
				s.at, s.off = k, off
			}
		}
		return s
	}
	stretches := []stretch{measure(0, len(all)-1)}
	for len(stretches)+1 < most {
		worst := 0
		for k := range stretches {
			if stretches[k].off > stretches[worst].off {
				worst = k
			}
		}
		s := stretches[worst]
		if !(s.off > tolerance) {
			break
		}
		stretches[worst] = measure(s.from, s.at)
		stretches = append(stretches, measure(s.at, s.to))
	}
	keep := make([]bool, len(all))
	keep[0] = true
	for _, s := range stretches {
		keep[s.to] = true
	}
	out := all[:0]
	for k, i := range all {
		if keep[k] {
			out = append(out, i)
		}
	}
	return out
}
