package compress

import "math"

// chebyshevNodes returns the n roots of the Chebyshev polynomial of degree n on (-1, 1).
func chebyshevNodes(n int) []float64 {
	x := make([]float64, n)
	for q := range x {
		x[q] = math.Cos(math.Pi * (float64(q) + 0.5) / float64(n))
	}
	return x
}

// chebyshevTransform returns the matrix that turns values at the n nodes into the
// coefficients of T_0 to T_(n-1): row k has the weights of coefficient k.
func chebyshevTransform(n int) [][]float64 {
	rows := make([][]float64, n)
	for k := range rows {
		rows[k] = make([]float64, n)
		scale := 2 / float64(n)
		if k == 0 {
			scale = 1 / float64(n)
		}
		for q := range n {
			rows[k][q] = scale * math.Cos(math.Pi*float64(k)*(float64(q)+0.5)/float64(n))
		}
	}
	return rows
}

// chebyshev sets t to T_0(x), T_1(x), ... and, where d is not nil, d to their
// derivatives.
func chebyshev(x float64, t, d []float64) {
	for k := range t {
		switch k {
		case 0:
			t[0] = 1
		case 1:
			t[1] = x
		default:
			t[k] = 2*x*t[k-1] - t[k-2]
		}
	}
	if d == nil {
		return
	}
	for k := range d {
		switch k {
		case 0:
			d[0] = 0
		case 1:
			d[1] = 1
		default:
			d[k] = 2*t[k-1] + 2*x*d[k-1] - d[k-2]
		}
	}
}
