package sample

import "math"

// A metric makes coordinates in which a posterior is roughly a standard normal
// one: u = factor y. With momenta of unit mass in y, the inverse mass matrix in u
// is factor times its transpose, the covariance.
type metric struct {
	n      int
	dense  bool
	factor []float64 // diagonal, or lower triangle by rows
}

func newMetric(n int, dense bool) metric {
	m := metric{n: n, dense: dense, factor: make([]float64, n)}
	if dense {
		m.factor = make([]float64, n*n)
	}
	for k := range n {
		m.factor[m.diagonal(k)] = 1
	}
	return m
}

func (m *metric) diagonal(k int) int {
	if m.dense {
		return k*m.n + k
	}
	return k
}

// add adds scale times factor y to u.
func (m *metric) add(u []float64, scale float64, y []float64) {
	if !m.dense {
		for k, f := range m.factor {
			u[k] += scale * f * y[k]
		}
		return
	}
	for k := range m.n {
		sum := 0.0
		for l, f := range m.factor[k*m.n : k*m.n+k+1] {
			sum += f * y[l]
		}
		u[k] += scale * sum
	}
}

// gradient turns a gradient in u into one in y.
func (m *metric) gradient(y, u []float64) {
	if !m.dense {
		for k, f := range m.factor {
			y[k] = f * u[k]
		}
		return
	}
	clear(y)
	for k := range m.n {
		g := u[k]
		for l, f := range m.factor[k*m.n : k*m.n+k+1] {
			y[l] += f * g
		}
	}
}

// solve turns a difference of u into one of y, in place.
func (m *metric) solve(u []float64) {
	for k := range m.n {
		if m.dense {
			for l, f := range m.factor[k*m.n : k*m.n+k] {
				u[k] -= f * u[l]
			}
		}
		u[k] /= m.factor[m.diagonal(k)]
	}
}

// adapt makes the metric fit draws, of n coordinates each. Their covariance is
// taken in the coordinates y of the metric so far, where the correlations are
// drawn towards 0 by a weight of n + 5 draws: this keeps what is known of strong
// correlations, and of scales. A coordinate that did not move keeps its scale.
func (m *metric) adapt(draws []float64) {
	n, count := m.n, len(draws)/m.n
	if count < 2 {
		return
	}
	y := make([]float64, len(draws))
	mean := make([]float64, n)
	for i := range count {
		for k := range n {
			mean[k] += draws[i*n+k] / float64(count)
		}
	}
	for i := range count {
		for k := range n {
			y[i*n+k] = draws[i*n+k] - mean[k]
		}
		m.solve(y[i*n : (i+1)*n])
	}
	covariance := func(k, l int) float64 {
		sum := 0.0
		for i := range count {
			sum += y[i*n+k] * y[i*n+l]
		}
		return sum / float64(count-1)
	}
	sd := make([]float64, n)
	for k := range n {
		if sd[k] = math.Sqrt(covariance(k, k)); !(sd[k] > 0) || math.IsInf(sd[k], 1) {
			sd[k] = 1
		}
	}
	if !m.dense {
		for k := range n {
			m.factor[k] *= sd[k]
		}
		return
	}
	shrunk := float64(count) / float64(count+n+5)
	own := make([]float64, n*n)
	for k := range n {
		own[k*n+k] = sd[k] * sd[k]
		for l := range k {
			own[k*n+l] = shrunk * covariance(k, l)
		}
	}
	if cholesky(own, n) {
		m.factor = product(m.factor, own, n)
	}
}

// rescale makes the metric fit the scales of draws of u and of their gradients,
// which are in the coordinates y: the root of the ratio of their standard
// deviations is the scale of a normal distribution wherever the draws lie, so that
// a few will do for a start.
func (m *metric) rescale(draws, slope []float64) {
	y := make([]float64, len(draws))
	for i := range y {
		y[i] = draws[i] - draws[i%m.n]
	}
	for i := 0; i < len(y); i += m.n {
		m.solve(y[i : i+m.n])
	}
	for k := range m.n {
		scale := math.Sqrt(scatter(y, m.n, k) / scatter(slope, m.n, k))
		if !(scale > 0) || math.IsInf(scale, 1) {
			continue
		}
		if !m.dense {
			m.factor[k] *= scale
			continue
		}
		for l := k; l < m.n; l++ {
			m.factor[l*m.n+k] *= scale
		}
	}
}

// scatter is the root mean square deviation of every n-th number of x from k on.
func scatter(x []float64, n, k int) float64 {
	count := float64(len(x) / n)
	mean, square := 0.0, 0.0
	for i := k; i < len(x); i += n {
		mean += x[i] / count
	}
	for i := k; i < len(x); i += n {
		square += (x[i] - mean) * (x[i] - mean) / count
	}
	return math.Sqrt(square)
}

// cholesky replaces the lower triangle of a matrix by its factor, and reports
// whether there is one. What stands above the diagonal stays.
func cholesky(a []float64, n int) bool {
	for k := range n {
		for l := range k + 1 {
			sum := a[k*n+l]
			for j := range l {
				sum -= a[k*n+j] * a[l*n+j]
			}
			if l < k {
				a[k*n+l] = sum / a[l*n+l]
				continue
			}
			if !(sum > 0) || math.IsInf(sum, 1) {
				return false
			}
			a[k*n+k] = math.Sqrt(sum)
		}
	}
	return true
}

// product multiplies lower triangles.
func product(a, b []float64, n int) []float64 {
	out := make([]float64, n*n)
	for k := range n {
		for l := range k + 1 {
			for j := l; j <= k; j++ {
				out[k*n+l] += a[k*n+j] * b[j*n+l]
			}
		}
	}
	return out
}
