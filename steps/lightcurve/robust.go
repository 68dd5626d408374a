package lightcurve

import (
	"math"
	"slices"
)

// madToSigma turns the median absolute deviation of a normal distribution into
// its standard deviation: 1/Φ⁻¹(3/4).
const madToSigma = 1.482602218505602

// medianInPlace returns the median of x, which it sorts; NaN when x is empty.
func medianInPlace(x []float64) float64 {
	n := len(x)
	if n == 0 {
		return math.NaN()
	}
	slices.Sort(x)
	if n%2 == 1 {
		return x[n/2]
	}
	return x[n/2-1] + (x[n/2]-x[n/2-1])/2
}

// robustScatter returns the median of x and its standard deviation estimated
// from the median absolute deviation about that median. It reorders and
// overwrites x.
func robustScatter(x []float64) (center, sigma float64) {
	center = medianInPlace(x)
	for i, v := range x {
		x[i] = math.Abs(v - center)
	}
	return center, madToSigma * medianInPlace(x)
}

// pointToPoint estimates the standard deviation of the noise of one sample
// from the differences of neighbours, for samples i where use(i) holds. A
// transit or a slow trend shifts few of the differences, and those by little,
// so the median absolute deviation does not see them. It returns NaN with fewer
// than two pairs of neighbours.
func pointToPoint(flux []float64, use func(i int) bool) float64 {
	diff := make([]float64, 0, len(flux))
	for i := 1; i < len(flux); i++ {
		if use(i-1) && use(i) {
			diff = append(diff, flux[i]-flux[i-1])
		}
	}
	if len(diff) < 2 {
		return math.NaN()
	}
	_, sigma := robustScatter(diff)
	return sigma / math.Sqrt2
}

// finite reports whether x is neither NaN nor infinite.
func finite(x float64) bool { return x-x == 0 }
