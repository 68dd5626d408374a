package noise

import (
	"fmt"
	"math"
)

// A filter factorises the covariance of a sum of processes in time, sample by
// sample: it carries the mean and covariance of the state, given all samples so
// far. In terms of Foreman-Mackey et al. (2017) it is the Cholesky factorisation
// K = L D Lᵀ of the semi-separable matrix, with the transition matrices in the
// place of their products of exponentials and harmonics, which makes Matérn-3/2
// and critical damping exact; carrying the covariance that is left, and not what
// was taken from it, loses no digits to white noise far below the red. It is also
// known as the Kalman filter.
//
// Each term has a state of two numbers, of which the first is the process. The
// covariance is kept as 2×2 blocks of pairs of terms (i ≤ j), rows first.
type filter struct {
	scale       []timescale
	freeDamping []bool    // whether the damping of each term is a parameter
	variance    []float64 // of each term
	white       []float64 // variance of each sample

	d, innovation []float64    // per sample: variance of what is new in it, and the new itself
	step          []propagator // per sample and term
	gain          [][2]float64 // per sample and term: covariance of state and process, before division by d
	mean          [][2]float64 // per sample and term: state after the sample, kept for the gradient
	left          [][4]float64 // per sample and pair: covariance after the sample, kept for the gradient
}

// prepare sets the filter to parameters, which are valid.
func (q *process) prepare(f *filter, values []float64) {
	f.white = resized(f.white, len(q.data.Time))
	q.whiteVariance(f.white, values)
	f.scale, f.freeDamping, f.variance = f.scale[:0], f.freeDamping[:0], f.variance[:0]
	values = values[q.whiteCount():]
	for _, t := range q.model.Terms {
		f.variance = append(f.variance, values[0]*values[0])
		kind := t.Factors[0].Kind
		f.scale = append(f.scale, timescaleOf(kind, values[1:]))
		f.freeDamping = append(f.freeDamping, kind == Oscillator)
		values = values[1+count(kind):]
	}
}

// count is the number of parameters of a kernel over one input.
func count(kind string) int {
	if kind == Oscillator {
		return 2
	}
	return 1
}

func timescaleOf(kind string, values []float64) timescale {
	switch kind {
	case Oscillator:
		return timescale{rate: 2 * math.Pi / values[0], damping: 1 / (2 * values[1])}
	case Matern32:
		return timescale{rate: math.Sqrt(3) / values[0], damping: 1}
	}
	return timescale{rate: 1 / values[0]}
}

// run filters the residuals and returns the logarithm of their likelihood. What
// the factorisation needs stays in d, gain and step; with all, mean and left are
// kept, too.
func (f *filter) run(time, residual []float64, all bool) (float64, error) {
	n, terms := len(time), len(f.scale)
	pairs := terms * (terms + 1) / 2
	f.d, f.innovation = sized(f.d, n), sized(f.innovation, n)
	f.step, f.gain = sized(f.step, n*terms), sized(f.gain, n*terms)
	if all {
		f.mean, f.left = sized(f.mean, n*terms), sized(f.left, n*pairs)
	}
	mean, left := make([][2]float64, terms), make([][4]float64, pairs)
	sum := newLogSum()
	chi2 := 0.0
	for i := range time {
		step, gain := f.step[i*terms:(i+1)*terms], f.gain[i*terms:(i+1)*terms]
		if i == 0 {
			f.begin(left)
		} else {
			for t := range step {
				f.scale[t].propagate(&step[t], time[i]-time[i-1])
				p, m := &step[t].phi, mean[t]
				mean[t] = [2]float64{p[0]*m[0] + p[1]*m[1], p[2]*m[0] + p[3]*m[1]}
			}
			f.spread(step, left)
		}
		d, z := f.white[i]+project(left, gain), residual[i]
		for t := range mean {
			z -= mean[t][0]
		}
		if !(d > 0) || math.IsInf(d, 0) {
			return math.NaN(), fmt.Errorf("noise: the variance of sample %d is %g, given those before it; expected a positive one: errors or jitter above 0", i, d)
		}
		absorb(mean, left, gain, z/d, 1/d)
		f.d[i], f.innovation[i] = d, z
		chi2 += z * z / d
		sum.multiply(d)
		if all {
			copy(f.mean[i*terms:], mean)
			copy(f.left[i*pairs:], left)
		}
	}
	value := -(chi2 + sum.log() + float64(n)*math.Log(2*math.Pi)) / 2
	if !finite(value) {
		return math.NaN(), errRange
	}
	return value, nil
}

// begin sets the covariance to the stationary one.
func (f *filter) begin(left [][4]float64) {
	clear(left)
	k := 0
	for i, v := range f.variance {
		left[k] = [4]float64{v, 0, 0, v}
		if f.scale[i].damping == 0 {
			left[k][3] = 0
		}
		k += len(f.variance) - i
	}
}

// spread carries the covariance over an interval.
func (f *filter) spread(step []propagator, left [][4]float64) {
	k := 0
	for i := range step {
		p, own, v := &step[i].phi, &step[i].spread, f.variance[i]
		c := &left[k]
		a, b := p[0]*c[0]+p[1]*c[1], p[0]*c[1]+p[1]*c[3]
		e, g := p[2]*c[0]+p[3]*c[1], p[2]*c[1]+p[3]*c[3]
		c[0] = a*p[0] + b*p[1] + v*own[0]
		c[1] = a*p[2] + b*p[3] + v*own[1]
		c[2] = c[1]
		c[3] = e*p[2] + g*p[3] + v*own[2]
		k++
		for j := i + 1; j < len(step); j++ {
			left[k] = sandwich(p, &left[k], &step[j].phi)
			k++
		}
	}
}

// sandwich returns a x bᵀ of 2×2 matrices.
func sandwich(a, x, b *[4]float64) [4]float64 {
	r0, r1 := a[0]*x[0]+a[1]*x[2], a[0]*x[1]+a[1]*x[3]
	s0, s1 := a[2]*x[0]+a[3]*x[2], a[2]*x[1]+a[3]*x[3]
	return [4]float64{r0*b[0] + r1*b[1], r0*b[2] + r1*b[3], s0*b[0] + s1*b[1], s0*b[2] + s1*b[3]}
}

// project writes the covariance of the state with the sum of processes to gain,
// and returns the variance of the sum.
func project(left [][4]float64, gain [][2]float64) (variance float64) {
	clear(gain)
	k := 0
	for i := range gain {
		gain[i][0] += left[k][0]
		gain[i][1] += left[k][2]
		k++
		for j := i + 1; j < len(gain); j++ {
			c := &left[k]
			gain[i][0] += c[0]
			gain[i][1] += c[2]
			gain[j][0] += c[0]
			gain[j][1] += c[1]
			k++
		}
		variance += gain[i][0]
	}
	return variance
}

// absorb takes a sample into mean and covariance.
func absorb(mean [][2]float64, left [][4]float64, gain [][2]float64, z, weight float64) {
	k := 0
	for i := range mean {
		g := gain[i]
		mean[i][0] += g[0] * z
		mean[i][1] += g[1] * z
		g[0], g[1] = g[0]*weight, g[1]*weight
		for j := i; j < len(mean); j++ {
			h, c := &gain[j], &left[k]
			c[0] -= g[0] * h[0]
			c[1] -= g[0] * h[1]
			c[2] -= g[1] * h[0]
			c[3] -= g[1] * h[1]
			k++
		}
	}
}

// sized returns a slice of the length n, whose elements are left as they are.
func sized[T any](x []T, n int) []T {
	if cap(x) < n {
		return make([]T, n)
	}
	return x[:n]
}

// A logSum adds logarithms by multiplying numbers as long as the product is in
// range.
type logSum struct{ product, sum float64 }

func newLogSum() logSum { return logSum{product: 1} }

func (s *logSum) multiply(x float64) {
	p := s.product * x
	if p < 1e-280 || p > 1e280 {
		s.sum += math.Log(s.product)
		p = x
	}
	s.product = p
}

func (s *logSum) log() float64 { return s.sum + math.Log(s.product) }
