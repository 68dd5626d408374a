package fit

import (
	"math"
	"slices"
)

// noiseRounds bounds the turns of fitting the flux and its noise: neither says
// much of the other, and two or three turns bring both to rest.
const noiseRounds = 20

// A noiseFit is what the residuals say of errorScale and jitter: the maximum of
//
//	Σ -ln σ - e²/(2 σ²),  σ² = scale² ε² + jitter²,
//
// e the residuals and ε the errors given, times the priors. Coordinates are the
// logarithm of the scale and the square of the jitter.
type noiseFit struct {
	m *objective
	e []float64 // residuals, in units of the median flux
}

// value is the logarithm of the density at coordinates v, and its gradient and
// Fisher information in those that are free.
func (f *noiseFit) value(v *[slots]float64) (sum float64, gradient []float64, information [][]float64) {
	s := f.m.space
	n := len(s.noise)
	gradient, information = make([]float64, n), columns(n, n)
	scale, jitter := s.noiseOf(v)
	by := make([]float64, n) // derivatives of ln σ²
	for i, e := range f.e {
		given := scale * scale * f.m.sigma[i] * f.m.sigma[i]
		variance := given + jitter*jitter
		z2 := e * e / variance
		sum -= (math.Log(variance) + z2) / 2
		for a, slot := range s.noise {
			if by[a] = 1 / variance; slot == slotErrorScale {
				by[a] *= 2 * given
			}
			gradient[a] += by[a] * (z2 - 1) / 2
			for b := range a + 1 {
				information[a][b] += by[a] * by[b] / 2
				information[b][a] = information[a][b]
			}
		}
	}
	for a, slot := range s.noise {
		prior := s.prior[slot]
		if !prior.normal() {
			continue
		}
		value, slope := s.named(slot, v[slot])
		z := (value - prior.A) / prior.B
		sum -= z * z / 2
		if slope*slope < math.Inf(1) {
			gradient[a] -= z * slope / prior.B
			information[a][a] += slope * slope / (prior.B * prior.B)
		}
	}
	return sum, gradient, information
}

// fitNoise moves the noise in the space's values to where the residuals of the
// solution want it, by scoring with steps cut where they do not help. It returns
// by how many standard deviations it moved.
func (m *objective) fitNoise(res []float64) (moved float64) {
	f := noiseFit{m, make([]float64, len(m.used))}
	for i, w := range m.weight {
		f.e[i] = res[i] / w
	}
	s := m.space
	start := s.value
	sum, gradient, information := f.value(&s.value)
	for range 100 {
		held := make([]bool, len(s.noise))
		for a, slot := range s.noise {
			lo, hi := s.limits(slot)
			held[a] = s.value[slot] <= lo && gradient[a] <= 0 || s.value[slot] >= hi && gradient[a] >= 0
		}
		step := solveHeld(information, gradient, held)
		promised := 0.0
		for a := range step {
			promised += step[a] * gradient[a]
		}
		if !(promised > 1e-9) {
			break
		}
		better := false
		for cut := 1.0; cut > 1e-6 && !better; cut /= 4 {
			v := s.value
			for a, slot := range s.noise {
				lo, hi := s.limits(slot)
				v[slot] = min(max(v[slot]+cut*step[a], lo), hi)
			}
			if trial, g, h := f.value(&v); trial > sum {
				s.value, sum, gradient, information, better = v, trial, g, h, true
			}
		}
		if !better {
			break
		}
	}
	for a, slot := range s.noise {
		moved = max(moved, math.Abs(s.value[slot]-start[slot])*math.Sqrt(information[a][a]))
	}
	m.setNoise(s.noiseOf(&s.value))
	return moved
}

// noiseCovariance is that of the free coordinates of the noise.
func (m *objective) noiseCovariance(res []float64) [][]float64 {
	f := noiseFit{m, make([]float64, len(m.used))}
	for i, w := range m.weight {
		f.e[i] = res[i] / w
	}
	_, _, information := f.value(&m.space.value)
	n := len(m.space.noise)
	cov := columns(n, n)
	for a := range n {
		unit := make([]float64, n)
		unit[a] = 1
		copy(cov[a], solveHeld(information, unit, make([]bool, n)))
	}
	return cov
}

// solveHeld solves the system of one or two equations, with some unknowns held
// at zero.
func solveHeld(a [][]float64, b []float64, held []bool) []float64 {
	x := make([]float64, len(b))
	switch free := slices.DeleteFunc([]int{0, 1}[:len(b)], func(k int) bool { return held[k] }); len(free) {
	case 1:
		x[free[0]] = b[free[0]] / a[free[0]][free[0]]
	case 2:
		det := a[0][0]*a[1][1] - a[0][1]*a[1][0]
		if !(det > 1e-12*a[0][0]*a[1][1]) { // scale and jitter act alike: one of them is enough
			x[0] = b[0] / a[0][0]
			break
		}
		x[0] = (b[0]*a[1][1] - b[1]*a[0][1]) / det
		x[1] = (b[1]*a[0][0] - b[0]*a[1][0]) / det
	}
	return x
}
