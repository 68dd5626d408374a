package vector

import (
	"fmt"
	"math"
)

// each applies f to every element.
func (v V) each(f func(float64) float64) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	out := make([]float64, len(v.X))
	for i, x := range v.X {
		out[i] = f(x)
	}
	return V{X: out}
}

// Exp returns e to the power of each element.
func (v V) Exp() V { return v.each(math.Exp) }

// Log returns the natural logarithm of each element; NaN below 0.
func (v V) Log() V { return v.each(math.Log) }

// Sqrt returns the square root of each element; NaN below 0.
func (v V) Sqrt() V { return v.each(math.Sqrt) }

// Sin returns the sine of each element, in radians; NaN of an infinite one.
func (v V) Sin() V { return v.each(math.Sin) }

// Cos returns the cosine of each element, in radians; NaN of an infinite one.
func (v V) Cos() V { return v.each(math.Cos) }

// Abs returns the absolute value of each element.
func (v V) Abs() V { return v.each(math.Abs) }

// Floor returns the greatest integer not above each element.
func (v V) Floor() V { return v.each(math.Floor) }

// Neg returns -v.
func (v V) Neg() V { return v.each(func(x float64) float64 { return -x }) }

// Reciprocal returns 1 / v; infinite where an element is 0.
func (v V) Reciprocal() V { return v.each(func(x float64) float64 { return 1 / x }) }

// Pow returns each element to the power of y, with the special cases of
// [math.Pow]: NaN of a negative element unless y is an integer.
func (v V) Pow(y float64) V { return v.each(func(x float64) float64 { return math.Pow(x, y) }) }

// Clamp returns v with elements below lo replaced by lo and above hi by hi, for
// lo <= hi; infinite limits are no limits. NaN stays NaN.
func (v V) Clamp(lo, hi float64) V {
	if v.Fault == "" && !(lo <= hi) {
		return V{Fault: fmt.Sprintf("Clamp to [%g, %g]; expected the lower limit first", lo, hi)}
	}
	return v.each(func(x float64) float64 { return min(max(x, lo), hi) })
}
