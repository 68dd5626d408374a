package noise

import (
	"fmt"
	"math"
	"slices"
)

// A Prediction is what residuals tell of the correlated noise, without the white.
type Prediction struct {
	Mean     []float64
	Variance []float64
}

// Predict returns mean and variance of the correlated noise at other places, given
// residuals: the sum of all terms, or the one called term. The times of at need no
// order, and its errors do not matter; dense processes want their inputs in it, and
// no more than 2000 places.
func (c Covariance) Predict(residual []float64, at Data, term string) (Prediction, error) {
	if err := c.check([][]float64{residual}); err != nil {
		return Prediction{}, err
	}
	q := c.c.q
	which := -1
	if term != "" {
		which = slices.IndexFunc(q.model.Terms, func(t Term) bool { return t.Name == term })
		if which < 0 {
			return Prediction{}, fmt.Errorf("noise prediction: the model has no term %.40q", term)
		}
	}
	order := make([]int, len(at.Time))
	for i, t := range at.Time {
		if !finite(t) {
			return Prediction{}, fmt.Errorf("noise prediction: time %d is %g; expected a number", i, t)
		}
		order[i] = i
	}
	if len(at.Time) > mostSamples {
		return Prediction{}, fmt.Errorf("noise prediction: %d times; expected at most %d", len(at.Time), mostSamples)
	}
	out := Prediction{Mean: make([]float64, len(at.Time)), Variance: make([]float64, len(at.Time))}
	if q.fast {
		slices.SortStableFunc(order, func(a, b int) int {
			switch {
			case at.Time[a] < at.Time[b]:
				return -1
			case at.Time[a] > at.Time[b]:
				return 1
			}
			return 0
		})
		c.c.smooth(&out, residual, at.Time, order, which)
	} else {
		if err := at.checkInputs(q.model); err != nil {
			return Prediction{}, fmt.Errorf("noise prediction: %w", err)
		}
		c.c.predictDense(&out, residual, at, which)
	}
	for i, m := range out.Mean {
		if !finite(m) || !finite(out.Variance[i]) {
			return Prediction{}, errRange
		}
		out.Variance[i] = math.Max(out.Variance[i], 0)
	}
	return out, nil
}

// A place is a sample or, without a white variance, one where to predict.
type place struct {
	sample, target int // the other is -1
	step           []propagator
	mean           [][2]float64 // of targets: state given the samples before
	left           [][4]float64 // of targets: its covariance
	gain           [][2]float64 // of samples, as in the filter
	z, inverse     float64      // of samples: what is new over its variance, and one over that
}

// smooth predicts at times in the given order, with a filter that runs through
// samples and targets alike, and back (Bryson & Frazier 1963; the form with missing
// samples is that of de Jong 1989).
func (c *covariance) smooth(out *Prediction, residual, at []float64, order []int, which int) {
	f, time := &c.fast, c.q.data.Time
	terms := len(f.scale)
	if terms == 0 {
		return
	}
	places := make([]place, 0, len(time)+len(at))
	mean, left := make([][2]float64, terms), make([][4]float64, terms*(terms+1)/2)
	gain := make([][2]float64, terms)
	f.begin(left)
	last := math.Inf(-1)
	for i, k := 0, 0; i < len(time) || k < len(order); {
		p, t := place{sample: -1, target: -1}, 0.0
		if i < len(time) && (k == len(order) || time[i] <= at[order[k]]) {
			p.sample, t = i, time[i]
			i++
		} else {
			p.target, t = order[k], at[order[k]]
			k++
		}
		if len(places) > 0 {
			p.step = make([]propagator, terms)
			for s := range p.step {
				f.scale[s].propagate(&p.step[s], t-last)
				a, m := &p.step[s].phi, mean[s]
				mean[s] = [2]float64{a[0]*m[0] + a[1]*m[1], a[2]*m[0] + a[3]*m[1]}
			}
			f.spread(p.step, left)
		}
		last = t
		if s := p.sample; s >= 0 {
			p.gain = make([][2]float64, terms)
			p.inverse = 1 / (f.white[s] + project(left, p.gain))
			p.z = (residual[s] - sumOf(mean)) * p.inverse
			absorb(mean, left, p.gain, p.z, p.inverse)
		} else {
			p.mean, p.left = slices.Clone(mean), slices.Clone(left)
		}
		places = append(places, p)
	}

	// r and information are what later samples tell of the state: their gradient, and minus its
	// derivative.
	r, information := make([][2]float64, terms), make([][4]float64, len(left))
	with := make([][2]float64, terms)
	for n := len(places) - 1; n >= 0; n-- {
		p := &places[n]
		if p.sample >= 0 {
			g, inverse := p.gain, p.inverse
			multiply(information, g, with)
			x, curvature := p.z, inverse
			for t := range g {
				x -= (g[t][0]*r[t][0] + g[t][1]*r[t][1]) * inverse
				curvature += (g[t][0]*with[t][0] + g[t][1]*with[t][1]) * inverse * inverse
			}
			k := 0
			for a := range r {
				r[a][0] += x
				for b := a; b < terms; b++ {
					c := &information[k]
					c[0] += curvature - (with[a][0]+with[b][0])*inverse
					c[1] -= with[b][1] * inverse
					c[2] -= with[a][1] * inverse
					k++
				}
			}
		} else {
			column(p.left, gain, which)
			multiply(information, gain, with)
			m, v := 0.0, 0.0
			for t := range gain {
				if which < 0 || which == t {
					m += p.mean[t][0]
					v += gain[t][0]
				}
				m += gain[t][0]*r[t][0] + gain[t][1]*r[t][1]
				v -= gain[t][0]*with[t][0] + gain[t][1]*with[t][1]
			}
			out.Mean[p.target], out.Variance[p.target] = m, v
		}
		k := 0
		for a := range p.step {
			s, x := transposed(&p.step[a].phi), r[a]
			r[a] = [2]float64{s[0]*x[0] + s[1]*x[1], s[2]*x[0] + s[3]*x[1]}
			for b := a; b < terms; b++ {
				u := transposed(&p.step[b].phi)
				information[k] = sandwich(&s, &information[k], &u)
				k++
			}
		}
	}
}

// column writes the covariance of the state with one term, or with the sum of all
// for which < 0.
func column(left [][4]float64, out [][2]float64, which int) {
	if which < 0 {
		project(left, out)
		return
	}
	for s := range out {
		b := pair(left, s, which, len(out))
		out[s] = [2]float64{b[0], b[2]}
	}
}
