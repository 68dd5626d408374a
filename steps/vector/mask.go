package vector

import "fmt"

// A Mask is a column of yes (true) and no, or the first fault met on the way to
// it. The zero value is empty.
type Mask struct {
	On    []bool // the elements; not to be changed while the mask is in use
	Fault string // why there are none; "" when there are
}

// Used is the mask of the usable samples of a light curve: yes where a flag
// is 0.
func Used(flags []uint8) Mask {
	out := make([]bool, len(flags))
	for i, f := range flags {
		out[i] = f == 0
	}
	return Mask{On: out}
}

// test applies a test to every element.
func (v V) test(holds func(float64) bool) Mask {
	if v.Fault != "" {
		return Mask{Fault: v.Fault}
	}
	out := make([]bool, len(v.X))
	for i, x := range v.X {
		out[i] = holds(x)
	}
	return Mask{On: out}
}

// Less is yes where an element is below s.
func (v V) Less(s float64) Mask { return v.test(func(x float64) bool { return x < s }) }

// LessEqual is yes where an element is s or below.
func (v V) LessEqual(s float64) Mask { return v.test(func(x float64) bool { return x <= s }) }

// Greater is yes where an element is above s.
func (v V) Greater(s float64) Mask { return v.test(func(x float64) bool { return x > s }) }

// GreaterEqual is yes where an element is s or above.
func (v V) GreaterEqual(s float64) Mask { return v.test(func(x float64) bool { return x >= s }) }

// Equal is yes where an element is exactly s.
func (v V) Equal(s float64) Mask { return v.test(func(x float64) bool { return x == s }) }

// Within is yes where an element is lo or above and below hi.
func (v V) Within(lo, hi float64) Mask {
	return v.test(func(x float64) bool { return x >= lo && x < hi })
}

// Finite is yes where an element is neither NaN nor infinite.
func (v V) Finite() Mask { return v.test(func(x float64) bool { return x-x == 0 }) }

// And is yes where both m and n are.
func (m Mask) And(n Mask) Mask {
	return m.combine("And", n, func(a, b bool) bool { return a && b })
}

// Or is yes where m or n is.
func (m Mask) Or(n Mask) Mask {
	return m.combine("Or", n, func(a, b bool) bool { return a || b })
}

func (m Mask) combine(name string, n Mask, f func(a, b bool) bool) Mask {
	switch {
	case m.Fault != "":
		return Mask{Fault: m.Fault}
	case n.Fault != "":
		return Mask{Fault: n.Fault}
	case len(m.On) != len(n.On):
		return Mask{Fault: fmt.Sprintf("%s of masks of %d and %d elements; expected the same length", name, len(m.On), len(n.On))}
	}
	out := make([]bool, len(m.On))
	for i, a := range m.On {
		out[i] = f(a, n.On[i])
	}
	return Mask{On: out}
}

// Not is yes where m is no.
func (m Mask) Not() Mask {
	if m.Fault != "" {
		return Mask{Fault: m.Fault}
	}
	out := make([]bool, len(m.On))
	for i, a := range m.On {
		out[i] = !a
	}
	return Mask{On: out}
}

// Count is the number of elements that are yes; 0 when the mask carries a fault.
func (m Mask) Count() int {
	count := 0
	if m.Fault != "" {
		return count
	}
	for _, a := range m.On {
		if a {
			count++
		}
	}
	return count
}

// Select takes the elements of yes where m is yes, and those of no elsewhere.
// All three have the same length.
func (m Mask) Select(yes, no V) V {
	if fault := m.against("Select", yes); fault != "" {
		return V{Fault: fault}
	}
	if fault := m.against("Select", no); fault != "" {
		return V{Fault: fault}
	}
	out := make([]float64, len(m.On))
	for i, a := range m.On {
		if a {
			out[i] = yes.X[i]
		} else {
			out[i] = no.X[i]
		}
	}
	return V{X: out}
}

// Numbers is 1 where m is yes and 0 elsewhere: a step function to multiply
// with.
func (m Mask) Numbers() V {
	if m.Fault != "" {
		return V{Fault: m.Fault}
	}
	out := make([]float64, len(m.On))
	for i, a := range m.On {
		if a {
			out[i] = 1
		}
	}
	return V{X: out}
}

// Keep returns the elements where m is yes, in their order: a column as long as
// m.Count().
func (v V) Keep(m Mask) V {
	if fault := m.against("Keep", v); fault != "" {
		return V{Fault: fault}
	}
	out := make([]float64, 0, m.Count())
	for i, a := range m.On {
		if a {
			out = append(out, v.X[i])
		}
	}
	return V{X: out}
}

// against returns the fault that keeps m and v from being used together, or "".
func (m Mask) against(name string, v V) string {
	switch {
	case v.Fault != "":
		return v.Fault
	case m.Fault != "":
		return m.Fault
	case len(m.On) != len(v.X):
		return fmt.Sprintf("%s of a column of %d elements with a mask of %d; expected the same length", name, len(v.X), len(m.On))
	}
	return ""
}
