package noise

import (
	"fmt"
	"math"
)

// An Inflation lists factors by which errors may be multiplied. None is applied
// here: which one is, is for the analysis to choose and to state.
type Inflation struct {
	Scatter float64 // root of the reduced χ² of the residuals
	Beta    float64 // β of the time-averaging test, at least 1
	Both    float64 // the larger of Scatter and 1, times Beta: neither makes errors smaller
}

// Inflate returns the factors that residuals with errors ask for, of a fit with so
// many free parameters, with bins of lo to hi minutes for β. Residuals that are not
// finite are left out, as are those whose error is not above 0. It is an error when
// lengths differ, no degree of freedom remains, or [TimeAveraging] has one.
func Inflate(time, residual, sigma []float64, free int, lo, hi float64) (Inflation, error) {
	if len(residual) != len(sigma) {
		return Inflation{}, fmt.Errorf("inflation: %d residuals and %d errors; expected equal numbers", len(residual), len(sigma))
	}
	beta, err := TimeAveraging(time, residual, lo, hi)
	if err != nil {
		return Inflation{}, fmt.Errorf("inflation: %w", err)
	}
	chi2, n := 0.0, 0
	for i, r := range residual {
		if z := r / sigma[i]; sigma[i] > 0 && finite(z) {
			chi2 += z * z
			n++
		}
	}
	if free < 0 || free >= n {
		return Inflation{}, fmt.Errorf("inflation: %d free parameters and %d residuals; expected at least 0, and fewer than residuals", free, n)
	}
	out := Inflation{Scatter: math.Sqrt(chi2 / float64(n-free)), Beta: beta.Factor()}
	out.Both = math.Max(out.Scatter, 1) * out.Beta
	if !finite(out.Both) {
		return Inflation{}, errRange
	}
	return out, nil
}
