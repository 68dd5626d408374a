package vector

import "fmt"

// Add returns v + u, element by element.
func (v V) Add(u V) V {
	if fault := pair("Add", v, u); fault != "" {
		return V{Fault: fault}
	}
	out, b := make([]float64, len(v.X)), u.X
	for i, a := range v.X {
		out[i] = a + b[i]
	}
	return V{X: out}
}

// Sub returns v - u, element by element.
func (v V) Sub(u V) V {
	if fault := pair("Sub", v, u); fault != "" {
		return V{Fault: fault}
	}
	out, b := make([]float64, len(v.X)), u.X
	for i, a := range v.X {
		out[i] = a - b[i]
	}
	return V{X: out}
}

// Mul returns the product of v and u, element by element.
func (v V) Mul(u V) V {
	if fault := pair("Mul", v, u); fault != "" {
		return V{Fault: fault}
	}
	out, b := make([]float64, len(v.X)), u.X
	for i, a := range v.X {
		out[i] = a * b[i]
	}
	return V{X: out}
}

// Div returns v / u, element by element.
func (v V) Div(u V) V {
	if fault := pair("Div", v, u); fault != "" {
		return V{Fault: fault}
	}
	out, b := make([]float64, len(v.X)), u.X
	for i, a := range v.X {
		out[i] = a / b[i]
	}
	return V{X: out}
}

// AddScaled returns v + s u, element by element.
func (v V) AddScaled(s float64, u V) V {
	if fault := pair("AddScaled", v, u); fault != "" {
		return V{Fault: fault}
	}
	out, b := make([]float64, len(v.X)), u.X
	for i, a := range v.X {
		out[i] = a + float64(s*b[i])
	}
	return V{X: out}
}

// Scale returns s v.
func (v V) Scale(s float64) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	out := make([]float64, len(v.X))
	for i, a := range v.X {
		out[i] = s * a
	}
	return V{X: out}
}

// Shift returns v + s.
func (v V) Shift(s float64) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	out := make([]float64, len(v.X))
	for i, a := range v.X {
		out[i] = a + s
	}
	return V{X: out}
}

// Combine returns the linear combination of columns of the same length,
// coefficients[0] columns[0] + coefficients[1] columns[1] + …, added in this
// order. There is one coefficient for each of at least one column.
func Combine(coefficients []float64, columns ...V) V {
	if len(columns) == 0 || len(coefficients) != len(columns) {
		return V{Fault: fmt.Sprintf("Combine of %d columns with %d coefficients; expected one for each of at least one column", len(columns), len(coefficients))}
	}
	for _, c := range columns {
		if fault := pair("Combine", columns[0], c); fault != "" {
			return V{Fault: fault}
		}
	}
	out := make([]float64, len(columns[0].X))
	for i, a := range columns[0].X {
		out[i] = coefficients[0] * a
	}
	for k, c := range columns[1:] {
		s := coefficients[k+1]
		for i, a := range c.X {
			out[i] += float64(s * a)
		}
	}
	return V{X: out}
}

// maxCoefficients bounds the work of a polynomial.
const maxCoefficients = 100

// Polynomial returns c[0] + c[1] v + c[2] v² + …, by Horner's rule, of up to 100
// coefficients; 0 without any.
func (v V) Polynomial(c []float64) V {
	if v.Fault != "" {
		return V{Fault: v.Fault}
	}
	if len(c) > maxCoefficients {
		return V{Fault: fmt.Sprintf("Polynomial of %d coefficients; expected at most %d", len(c), maxCoefficients)}
	}
	out := make([]float64, len(v.X))
	if len(c) == 0 {
		return V{X: out}
	}
	last := len(c) - 1
	for i, x := range v.X {
		sum := c[last]
		for k := last - 1; k >= 0; k-- {
			sum = float64(sum*x) + c[k]
		}
		out[i] = sum
	}
	return V{X: out}
}
