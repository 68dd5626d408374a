package compress

import "math"

const (
	// newtonSteps bounds the search for a mode.
	newtonSteps = 40
	// closeEnough is the rise of the log density that the next step of the search is
	// expected to bring at which it ends: a shift of a hundredth of a standard deviation.
	closeEnough = 5e-5
)

// search moves from z to the mode of a node, by Newton's method with damping, and
// describes the density there; ok is false when there is none to be found.
func (t *target) search(n *node, z []float64) (ok bool) {
	m := len(t.free)
	n.mode = append(n.mode[:0], z...)
	gradient, curvature := make([]float64, m), make([]float64, pairs(m))
	factor, step, next := make([]float64, pairs(m)), make([]float64, m), make([]float64, m)
	value := t.slopes(n, n.mode, gradient, curvature)
	if math.IsInf(value, -1) || math.IsNaN(value) {
		return false
	}
	damping := 0.0
	for range newtonSteps {
		for damped(factor, curvature, damping, m) != nil {
			damping = math.Max(1e-3, 10*damping)
			if damping > 1e6 {
				return false
			}
		}
		solveLower(factor, m, gradient, step)
		rise := 0.0
		for _, x := range step {
			rise += x * x
		}
		solveUpper(factor, m, step)
		if rise/2 < closeEnough && damping == 0 {
			break
		}
		longest := 0.0
		for _, x := range step {
			longest = math.Max(longest, math.Abs(x))
		}
		shrink := math.Min(1, 2/longest) // coordinates are of the size of 1
		moved := false
		for range 12 {
			for k := range next {
				next[k] = n.mode[k] + shrink*step[k]
			}
			if v := t.value(n, next); v > value {
				moved = true
				break
			}
			shrink /= 3
		}
		if !moved {
			if damping > 1e3 || rise/2 < 1e-3 {
				break
			}
			damping = math.Max(0.1, 10*damping)
			continue
		}
		damping = math.Max(0, damping/10)
		if damping < 1e-3 {
			damping = 0
		}
		copy(n.mode, next)
		value = t.slopes(n, n.mode, gradient, curvature)
	}
	for damped(factor, curvature, damping, m) != nil {
		if damping = math.Max(1e-3, 10*damping); damping > 1e6 {
			return false
		}
	}
	n.describe(factor, m, value)
	return true
}

// describe sets what follows from the factor of the curvature at the mode.
func (n *node) describe(factor []float64, m int, value float64) {
	n.factor = append(n.factor[:0], factor...)
	n.logPeak = value
	n.logMass = value + n.logWeight
	for k := range m {
		n.logMass -= math.Log(factor[pairs(k)+k])
	}
	n.variance = n.variance[:0]
	column := make([]float64, m)
	for k := range m {
		clear(column)
		column[k] = 1
		solveLower(factor, m, column, column)
		sum := 0.0
		for _, x := range column {
			sum += x * x
		}
		n.variance = append(n.variance, sum)
	}
}

// damped sets factor to the Cholesky factor of a packed matrix whose diagonal is raised
// by a share of itself, and returns an error for one that is not positive definite.
func damped(factor, matrix []float64, damping float64, m int) error {
	for j := range m {
		for k := range j + 1 {
			sum := matrix[pairs(j)+k]
			if j == k {
				sum += damping * (math.Abs(sum) + 1)
			}
			for l := range k {
				sum -= factor[pairs(j)+l] * factor[pairs(k)+l]
			}
			if j == k {
				if !(sum > 1e-12) || math.IsInf(sum, 1) {
					return errIndefinite
				}
				factor[pairs(j)+j] = math.Sqrt(sum)
			} else {
				factor[pairs(j)+k] = sum / factor[pairs(k)+k]
			}
		}
	}
	return nil
}

// solveLower solves L x = b for a packed lower triangle; x may be b.
func solveLower(factor []float64, m int, b, x []float64) {
	for j := range m {
		sum := b[j]
		for k := range j {
			sum -= factor[pairs(j)+k] * x[k]
		}
		x[j] = sum / factor[pairs(j)+j]
	}
}

// solveUpper solves Lᵀ x = x in place.
func solveUpper(factor []float64, m int, x []float64) {
	for j := m - 1; j >= 0; j-- {
		sum := x[j]
		for k := j + 1; k < m; k++ {
			sum -= factor[pairs(k)+j] * x[k]
		}
		x[j] = sum / factor[pairs(j)+j]
	}
}
