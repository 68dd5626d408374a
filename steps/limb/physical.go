package limb

import "math"

// bisections reduce a bracket in (0, 1) to neighbouring numbers.
const bisections = 60

// Physical reports whether the intensity is nowhere negative and nowhere
// increases from the centre of the disc to its edge. It is false for a law that
// is not valid. Boundaries are included; the conditions are
//
//	linear           0 ≤ u1 ≤ 1
//	quadratic        u1+u2 ≤ 1, u1 ≥ 0, u1+2 u2 ≥ 0 (Kipping 2013, MNRAS 435, 2152, eq. 8)
//	square-root      u1+u2 ≤ 1, u2 ≥ 0, 2 u1+u2 ≥ 0
//	logarithmic      u1 ≤ 1, 0 ≤ u2 ≤ u1
//	power-2          0 ≤ u1 ≤ 1
//
// and for the laws of three and four coefficients that their sum is at most 1
// and that the derivative of the intensity, a polynomial in √mu, is not negative
// at its ends and turning points, within 1e-15 of the largest coefficient.
func (l Law) Physical() bool {
	if l.Validate() != nil {
		return false
	}
	return l.Intensity(0) >= 0 && l.Decreasing()
}

// Decreasing reports whether the intensity nowhere increases from the centre of
// the disc to its edge, whatever its sign, see [Law.Physical]. It is false for a
// law that is not valid in name or number of coefficients.
func (l Law) Decreasing() bool {
	if !l.known() {
		return false
	}
	u := l.Coefficients
	switch l.Name {
	case Linear:
		return u[0] >= 0
	case Quadratic:
		return u[0] >= 0 && u[0]+2*u[1] >= 0
	case SquareRoot:
		return u[1] >= 0 && 2*u[0]+u[1] >= 0
	case Logarithmic:
		return u[1] >= 0 && u[0] >= u[1]
	case Power2:
		return u[0]*u[1] >= 0
	case ThreeParameter, FourParameter:
		slope := l.slope()
		size := 0.0
		for _, s := range slope {
			size = max(size, math.Abs(s))
		}
		return least(slope) >= -1e-15*size
	}
	return true
}

// Least returns the smallest intensity on the disc and the mu where that is. A
// star shines everywhere if it is above 0. Both are NaN for a law that is not
// valid in name or number of coefficients.
func (l Law) Least() (mu, intensity float64) {
	if !l.known() {
		return math.NaN(), math.NaN()
	}
	var turns []float64 // in mu
	u := l.Coefficients
	switch l.Name {
	case Quadratic:
		turns = []float64{1 + u[0]/(2*u[1])}
	case SquareRoot:
		if root := -u[1] / (2 * u[0]); root > 0 {
			turns = []float64{root * root}
		}
	case Logarithmic:
		turns = []float64{math.Exp(u[0]/u[1] - 1)}
	case ThreeParameter, FourParameter:
		for _, root := range roots(l.slope()) {
			turns = append(turns, root*root)
		}
	}
	mu, intensity = 1, 1
	for _, at := range append(turns, 0) {
		if i := l.Intensity(at); i < intensity { // false outside of the disc
			mu, intensity = at, i
		}
	}
	return mu, intensity
}

// slope returns the polynomial in x = √mu, constant first, whose sign is that of
// the derivative of the intensity by mu, of a law of three or four coefficients.
func (l Law) slope() []float64 {
	first := 1 + Most - len(l.Coefficients) // power of x of the first term
	slope := make([]float64, len(l.Coefficients))
	for i, u := range l.Coefficients {
		slope[i] = float64(first+i) * u
	}
	return slope
}

// least returns the smallest value of a polynomial on [0, 1].
func least(p []float64) float64 {
	value := math.Min(evaluate(p, 0), evaluate(p, 1))
	for _, x := range roots(derivative(p)) {
		value = math.Min(value, evaluate(p, x))
	}
	return value
}

// roots returns the places in (0, 1) where a polynomial changes its sign, in
// increasing order: at most one between neighbouring ones of its derivative.
func roots(p []float64) []float64 {
	if len(p) < 2 {
		return nil
	}
	var all []float64
	low := 0.0
	for _, high := range append(roots(derivative(p)), 1) {
		if a, b := evaluate(p, low), evaluate(p, high); a < 0 && b > 0 || a > 0 && b < 0 {
			x, end := low, high
			for range bisections {
				middle := (x + end) / 2
				if m := evaluate(p, middle); m < 0 == (a < 0) && m != 0 {
					x = middle
				} else {
					end = middle
				}
			}
			all = append(all, end)
		}
		low = high
	}
	return all
}

// evaluate returns the value of a polynomial, constant first.
func evaluate(p []float64, x float64) float64 {
	sum := 0.0
	for i := len(p) - 1; i >= 0; i-- {
		sum = sum*x + p[i]
	}
	return sum
}

// derivative returns the derivative of a polynomial, constant first.
func derivative(p []float64) []float64 {
	d := make([]float64, max(len(p)-1, 0))
	for i := range d {
		d[i] = float64(i+1) * p[i+1]
	}
	return d
}
