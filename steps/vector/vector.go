package vector

import (
	"fmt"
	"slices"
)

// MaxLength is the greatest number of elements that a function of this package
// makes out of fewer: 80 MB, and more than any light curve has.
const MaxLength = 10_000_000

// A V is a column of numbers, or the first fault met on the way to it. The zero
// value is an empty column.
type V struct {
	X     []float64 // the elements; not to be changed while the column is in use
	Fault string    // why there are none; "" when there are
}

// Of makes a column of the elements of x, which it does not copy.
func Of(x []float64) V { return V{X: x} }

// Full makes a column of n elements x, for n from 0 to [MaxLength].
func Full(n int, x float64) V {
	if fault := lengthFault("Full", n); fault != "" {
		return V{Fault: fault}
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = x
	}
	return V{X: out}
}

// Linspace makes a column of n evenly spaced numbers, the first from and, when
// there are at least two, the last to. n runs from 0 to [MaxLength].
func Linspace(from, to float64, n int) V {
	if fault := lengthFault("Linspace", n); fault != "" {
		return V{Fault: fault}
	}
	out := make([]float64, n)
	step := (to - from) / float64(max(1, n-1))
	for i := range out {
		out[i] = from + float64(float64(i)*step)
	}
	if n > 1 {
		out[n-1] = to
	}
	return V{X: out}
}

// Concat joins columns end to end, up to [MaxLength] elements.
func Concat(parts ...V) V {
	n := 0
	for _, p := range parts {
		if p.Fault != "" {
			return V{Fault: p.Fault}
		}
		n = min(n+len(p.X), MaxLength+1)
	}
	if fault := lengthFault("Concat", n); fault != "" {
		return V{Fault: fault}
	}
	out := make([]float64, 0, n)
	for _, p := range parts {
		out = append(out, p.X...)
	}
	return V{X: out}
}

// Repeat joins times copies of the column end to end, up to [MaxLength]
// elements; times is at least 0.
func (v V) Repeat(times int) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	if times < 0 {
		return V{Fault: fmt.Sprintf("Repeat of %d times; expected a number from 0 up", times)}
	}
	if n := len(v.X); n > 0 && times > MaxLength/n {
		return V{Fault: fmt.Sprintf("Repeat of %d elements %d times; expected at most %d elements altogether", n, times, MaxLength)}
	}
	if len(v.X) == 0 {
		times = 0
	}
	return V{X: slices.Repeat(v.X, times)}
}

// Values returns the elements, or the fault as an error.
func (v V) Values() ([]float64, error) {
	if v.Fault != "" {
		return nil, fmt.Errorf("vector: %.300s", v.Fault)
	}
	return v.X, nil
}

func lengthFault(name string, n int) string {
	switch {
	case n < 0:
		return fmt.Sprintf("%s of %d elements; expected a number from 0 up", name, n)
	case n > MaxLength:
		return fmt.Sprintf("%s of more than %d elements; expected at most as many", name, MaxLength)
	}
	return ""
}

// pair returns the fault that keeps v and u from being combined, or "".
func pair(name string, v, u V) string {
	switch {
	case v.Fault != "":
		return v.Fault
	case u.Fault != "":
		return u.Fault
	case len(v.X) != len(u.X):
		return fmt.Sprintf("%s of columns of %d and %d elements; expected the same length", name, len(v.X), len(u.X))
	}
	return ""
}
