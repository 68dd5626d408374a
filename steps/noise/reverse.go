package noise

// reverse runs the filter backwards and writes the derivatives of the logarithm of
// the likelihood, by residual and white variance of each sample and by the
// logarithms of the terms' parameters, in their order. The slices begin as zeros.
//
// Symbols with a bar are derivatives by what they are named after. Of symmetric
// matrices both halves count.
func (f *filter) reverse(time []float64, out *Gradient, byLog []float64) {
	n, terms := len(time), len(f.scale)
	pairs := terms * (terms + 1) / 2
	mean, left := make([][2]float64, terms), make([][4]float64, pairs) // bars
	gain := make([][2]float64, terms)
	sums := make([]termSums, terms)
	for i := n - 1; i >= 0; i-- {
		inverse := 1 / f.d[i]
		z := f.innovation[i] * inverse
		g := f.gain[i*terms : (i+1)*terms]

		// absorb
		multiply(left, g, gain)
		meanGain, gainLeftGain := 0.0, 0.0
		for t := range g {
			meanGain += mean[t][0]*g[t][0] + mean[t][1]*g[t][1]
			gainLeftGain += gain[t][0]*g[t][0] + gain[t][1]*g[t][1]
		}
		meanGain *= inverse
		zBar := meanGain - z
		dBar := (z*z-inverse)/2 - meanGain*z + gainLeftGain*inverse*inverse
		out.ByResidual[i] = zBar
		out.ByVariance[i] = dBar
		for t := range g {
			gain[t][0] = mean[t][0]*z - 2*gain[t][0]*inverse + dBar
			gain[t][1] = mean[t][1]*z - 2*gain[t][1]*inverse
			mean[t][0] -= zBar
		}

		// project: left += (gain hᵀ + h gainᵀ)/2
		k := 0
		for s := range gain {
			for t := s; t < terms; t++ {
				c := &left[k]
				c[0] += (gain[s][0] + gain[t][0]) / 2
				c[1] += gain[t][1] / 2
				c[2] += gain[s][1] / 2
				k++
			}
		}

		if i == 0 {
			for t := range sums {
				c := &left[diagonal(t, terms)]
				sums[t].variance += c[0]
				if f.scale[t].damping != 0 {
					sums[t].variance += c[3]
				}
			}
			break
		}
		f.back(time[i]-time[i-1], f.step[i*terms:(i+1)*terms], f.mean[(i-1)*terms:i*terms], f.left[(i-1)*pairs:i*pairs], mean, left, sums)
	}
	f.collect(sums, byLog)
}

// termSums adds up the derivatives of one term: by the logarithms of rate and
// damping, and by the variance.
type termSums struct{ rate, damping, variance float64 }

// back carries the bars over the interval before a sample, with the mean and
// covariance after the sample before.
func (f *filter) back(τ float64, step []propagator, before [][2]float64, leftBefore [][4]float64, mean [][2]float64, left [][4]float64, sums []termSums) {
	terms := len(step)
	for t := range step {
		p := &step[t].phi
		own := &left[diagonal(t, terms)]
		v := f.variance[t]
		// What the interval adds is v (1 - φφᵀ), so that the bar of φ is
		// 2 Σ_s left_ts φ_s (before_st) - 2 v left_tt φ + mean beforeᵀ.
		var bar [4]float64
		for s := range step {
			l, b := pair(left, t, s, terms), pair(leftBefore, s, t, terms)
			if s == t {
				b[0] -= v
				if f.scale[t].damping != 0 {
					b[3] -= v
				}
			}
			x := product(&l, &step[s].phi)
			x = product(&x, &b)
			for e := range bar {
				bar[e] += 2 * x[e]
			}
		}
		m, b := mean[t], before[t]
		bar[0] += m[0] * b[0]
		bar[1] += m[0] * b[1]
		bar[2] += m[1] * b[0]
		bar[3] += m[1] * b[1]

		x := f.scale[t].rate * τ
		by := step[t].byRate(f.scale[t], x)
		sums[t].rate += bar[0]*by[0] + bar[1]*by[1] + bar[2]*by[2] + bar[3]*by[3]
		if f.scale[t].damping != 0 {
			by = step[t].byDamping(f.scale[t], x)
			sums[t].damping += bar[0]*by[0] + bar[1]*by[1] + bar[2]*by[2] + bar[3]*by[3]
		}
		spread := &step[t].spread
		sums[t].variance += own[0]*spread[0] + 2*own[1]*spread[1] + own[3]*spread[2]

		mean[t] = [2]float64{p[0]*m[0] + p[2]*m[1], p[1]*m[0] + p[3]*m[1]}
	}
	k := 0
	for s := range step {
		a := transposed(&step[s].phi)
		for t := s; t < terms; t++ {
			b := transposed(&step[t].phi)
			left[k] = sandwich(&a, &left[k], &b)
			k++
		}
	}
}

// collect turns the sums into derivatives by the logarithms of the parameters.
func (f *filter) collect(sums []termSums, byLog []float64) {
	for t, s := range sums {
		byLog[0] = 2 * f.variance[t] * s.variance
		byLog[1] = -s.rate
		byLog = byLog[2:]
		if f.freeDamping[t] {
			byLog[0] = -s.damping
			byLog = byLog[1:]
		}
	}
}

// multiply writes the symmetric matrix of blocks times g to out.
func multiply(left [][4]float64, g, out [][2]float64) {
	clear(out)
	k := 0
	for s := range g {
		c := &left[k]
		out[s][0] += c[0]*g[s][0] + c[1]*g[s][1]
		out[s][1] += c[2]*g[s][0] + c[3]*g[s][1]
		k++
		for t := s + 1; t < len(g); t++ {
			c := &left[k]
			out[s][0] += c[0]*g[t][0] + c[1]*g[t][1]
			out[s][1] += c[2]*g[t][0] + c[3]*g[t][1]
			out[t][0] += c[0]*g[s][0] + c[2]*g[s][1]
			out[t][1] += c[1]*g[s][0] + c[3]*g[s][1]
			k++
		}
	}
}

// diagonal is the index of the block of term t with itself.
func diagonal(t, terms int) int { return t*terms - t*(t-1)/2 }

// pair is the block of rows of s and columns of t.
func pair(left [][4]float64, s, t, terms int) [4]float64 {
	if s <= t {
		return left[diagonal(s, terms)+t-s]
	}
	return transposed(&left[diagonal(t, terms)+s-t])
}

func transposed(a *[4]float64) [4]float64 { return [4]float64{a[0], a[2], a[1], a[3]} }

func product(a, b *[4]float64) [4]float64 {
	return [4]float64{
		a[0]*b[0] + a[1]*b[2], a[0]*b[1] + a[1]*b[3],
		a[2]*b[0] + a[3]*b[2], a[2]*b[1] + a[3]*b[3],
	}
}
