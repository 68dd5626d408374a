package noise

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
)

// A Covariance is that of the residuals of a series at given parameters,
// factorised as K = L Lᵀ. It may be used by several goroutines at a time.
type Covariance struct{ c *covariance }

type covariance struct {
	q      *process
	values []float64
	fast   filter
	root   []float64 // of the fast: standard deviation of what is new in each sample
	dense  factor
}

var errNoCovariance = errors.New("noise: this covariance was not made by Process.At")

// mostNumbers bounds what a call returns, and mostProducts the multiplications of a
// dense one.
const (
	mostNumbers  = 1 << 25
	mostProducts = 1 << 33
)

// At factorises the covariance at values of the parameters. Errors are those of
// [Process.LogLikelihood].
func (p Process) At(values []float64) (Covariance, error) {
	if p.p == nil {
		return Covariance{}, errNoProcess
	}
	if err := p.p.checkValues(values); err != nil {
		return Covariance{}, err
	}
	c := &covariance{q: p.p, values: append([]float64(nil), values...)}
	var err error
	if p.p.fast {
		p.p.prepare(&c.fast, values)
		_, err = c.fast.run(p.p.data.Time, make([]float64, len(p.p.data.Time)), false)
		for _, d := range c.fast.d {
			c.root = append(c.root, math.Sqrt(d))
		}
	} else {
		c.dense, err = p.p.factorise(values)
	}
	if err != nil {
		return Covariance{}, err
	}
	return Covariance{c}, nil
}

// check is the error for vectors that the covariance cannot be applied to.
func (c Covariance) check(vectors [][]float64) error {
	if c.c == nil {
		return errNoCovariance
	}
	n := len(c.c.q.data.Time)
	if len(vectors) > mostNumbers/n || !c.c.q.fast && len(vectors) > mostProducts/(n*n) {
		return fmt.Errorf("noise: %d vectors of %d numbers are more than fit; hand over fewer at a time", len(vectors), n)
	}
	for _, v := range vectors {
		if err := c.c.q.checkVector("vector", v); err != nil {
			return err
		}
	}
	return nil
}

// LogDet returns the natural logarithm of the determinant of K; NaN for a
// Covariance that is not from [Process.At].
func (c Covariance) LogDet() float64 {
	if c.c == nil {
		return math.NaN()
	}
	if !c.c.q.fast {
		return c.c.dense.logDet()
	}
	sum := newLogSum()
	for _, d := range c.c.fast.d {
		sum.multiply(d)
	}
	return sum.log()
}

// Whiten returns L⁻¹v of each vector: residuals become independent of unit
// variance, and a linear model of them one of white noise. Vectors have one number
// for each time.
func (c Covariance) Whiten(vectors [][]float64) ([][]float64, error) {
	return c.each(vectors, func(v []float64) {
		if !c.c.q.fast {
			c.c.dense.whiten(v)
			return
		}
		c.c.innovations(v)
		for i := range v {
			v[i] /= c.c.root[i]
		}
	})
}

// Colour returns L v of each vector, which [Covariance.Whiten] undoes.
func (c Covariance) Colour(vectors [][]float64) ([][]float64, error) {
	return c.each(vectors, func(v []float64) {
		if !c.c.q.fast {
			c.c.dense.colour(v)
			return
		}
		c.c.colour(v)
	})
}

// Solve returns K⁻¹v of each vector.
func (c Covariance) Solve(vectors [][]float64) ([][]float64, error) {
	return c.each(vectors, func(v []float64) {
		if !c.c.q.fast {
			c.c.dense.solve(v)
			return
		}
		c.c.innovations(v)
		c.c.solveBack(v)
	})
}

func (c Covariance) each(vectors [][]float64, do func([]float64)) ([][]float64, error) {
	if err := c.check(vectors); err != nil {
		return nil, err
	}
	out := make([][]float64, len(vectors))
	for k, v := range vectors {
		out[k] = append([]float64(nil), v...)
		do(out[k])
		for _, x := range out[k] {
			if !finite(x) {
				return nil, errRange
			}
		}
	}
	return out, nil
}

// Draw returns noise of this covariance, white part and all, from a seed.
func (c Covariance) Draw(seed uint64) ([]float64, error) {
	if c.c == nil {
		return nil, errNoCovariance
	}
	rng := rand.New(rand.NewPCG(seed, 0x6e6f697365))
	v := make([]float64, len(c.c.q.data.Time))
	for i := range v {
		v[i] = rng.NormFloat64()
	}
	out, err := c.Colour([][]float64{v})
	if err != nil {
		return nil, err
	}
	return out[0], nil
}

// advance carries the state over the interval before sample i.
func (c *covariance) advance(state [][2]float64, i int) {
	for t := range state {
		p, m := &c.fast.step[i*len(state)+t].phi, state[t]
		state[t] = [2]float64{p[0]*m[0] + p[1]*m[1], p[2]*m[0] + p[3]*m[1]}
	}
}

// add adds x times the gain of sample i to the state.
func (c *covariance) add(state [][2]float64, i int, x float64) {
	for t := range state {
		g := c.fast.gain[i*len(state)+t]
		state[t][0] += g[0] * x
		state[t][1] += g[1] * x
	}
}

func sumOf(state [][2]float64) (s float64) {
	for _, m := range state {
		s += m[0]
	}
	return s
}

// innovations replaces a vector by what is new in each number, given those before.
func (c *covariance) innovations(v []float64) {
	state := make([][2]float64, len(c.fast.scale))
	for i := range v {
		if i > 0 {
			c.advance(state, i)
		}
		v[i] -= sumOf(state)
		c.add(state, i, v[i]/c.fast.d[i])
	}
}

func (c *covariance) colour(v []float64) {
	state := make([][2]float64, len(c.fast.scale))
	for i := range v {
		if i > 0 {
			c.advance(state, i)
		}
		innovation := v[i] * c.root[i]
		v[i] = sumOf(state) + innovation
		c.add(state, i, innovation/c.fast.d[i])
	}
}

// solveBack turns innovations into the solution.
func (c *covariance) solveBack(v []float64) {
	terms := len(c.fast.scale)
	back := make([][2]float64, terms)
	for i := len(v) - 1; i >= 0; i-- {
		sum := v[i]
		for t, g := range c.fast.gain[i*terms : (i+1)*terms] {
			sum -= g[0]*back[t][0] + g[1]*back[t][1]
		}
		v[i] = sum / c.fast.d[i]
		for t := range back {
			p := &c.fast.step[i*terms+t].phi
			r := [2]float64{back[t][0] + v[i], back[t][1]}
			back[t] = [2]float64{p[0]*r[0] + p[2]*r[1], p[1]*r[0] + p[3]*r[1]}
		}
	}
}
