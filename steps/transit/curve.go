package transit

import (
	"fmt"
	"math"
	"slices"
	"sort"

	"rimlight/steps/orbit"
)

// orbital is the number of parameters of the orbit, the first arguments of a
// curve.
const orbital = 6

// Curve returns the relative flux at the given times, days on the scale of
// Orbit.MidTransit, one value for each; times are the middles of the exposures.
// The flux is 1 while no part of the star is covered, spots or not, and while the
// planet is behind the star. With an exposure the flux is averaged over it with an
// error below 5e-9. Times may be in any order; in increasing order those out of
// transit are passed over at once. It returns an error for invalid parameters or a
// time that is not finite.
func Curve(times []float64, p Params) ([]float64, error) {
	c, err := newCurve(times, p)
	if err != nil {
		return nil, err
	}
	c.run(times)
	return c.out.flux, nil
}

// CurveGradient returns the flux of [Curve] and its derivatives: a slice as long
// as times for each of [Params.Arguments]. Averaged over an exposure they have
// errors of up to 1e-5 of their size, where a contact falls into it.
func CurveGradient(times []float64, p Params) (flux []float64, grad [][]float64, err error) {
	c, err := newCurve(times, p)
	if err != nil {
		return nil, nil, err
	}
	n, arguments := len(times), len(p.Arguments())
	all := make([]float64, arguments*n)
	c.out.grad = make([][]float64, arguments)
	for k := range c.out.grad {
		c.out.grad[k] = all[k*n : (k+1)*n : (k+1)*n]
	}
	c.run(times)
	return c.out.flux, c.out.grad, nil
}

// CurveTerms returns what is covered at the given times of each of the functions of
// μ that p.Law is a sum of, averaged over exposures as in [Curve]: a slice as long
// as times for 1, μ and μ², then, for laws with others, for √μ and μ√μ
// (square-root and laws of more coefficients), μ ln μ (logarithmic) or μ^u2
// (power-2). They are integrals over the covered part of the disc divided by π, so
// that for a law I = Σ a_n term_n of mean intensity m over the disc, the flux is
// 1 - Σ a_n covered_n / m. Where the planet does not touch the star they are 0.
// p is of a round planet, a star without spots, and no companions; of its law only
// the name counts, and u2 where it is an exponent. Errors are those of Curve.
func CurveTerms(times []float64, p Params) ([][]float64, error) {
	if p.Evening != 0 || len(p.Spots) > 0 || p.Companion != 0 {
		return nil, fmt.Errorf("transit: terms of a planet of two limbs, a star with spots or with companions; expected neither")
	}
	c, err := newCurve(times, p)
	if err != nil {
		return nil, err
	}
	count := 3
	switch c.profile.shape {
	case roots:
		count = 5
	case logs, power:
		count = 4
	}
	c.out.terms = make([][]float64, count)
	for k := range c.out.terms {
		c.out.terms[k] = make([]float64, len(times))
	}
	c.run(times)
	return c.out.terms, nil
}

// curve computes a light curve.
type curve struct {
	path     *orbit.Path
	profile  profile
	radius   float64 // the larger one of two limbs
	period   float64
	from, to float64 // days since mid-transit outside of which there is no transit
	exposure float64 // days
	pieces   []piece // of the transit, for averages over exposures
	share    float64 // of the star in all the light
	face     *face   // of a planet of two limbs or a star with spots, or nil

	eccentricity, sinW, cosW float64
	out                      result
	wait                     queue
}

// result is a light curve, with derivatives if grad is not nil, or what is covered
// of each term if terms is not nil.
type result struct {
	flux  []float64
	grad  [][]float64
	terms [][]float64
}

// queue holds samples until they are computed side by side.
type queue struct {
	n       int
	z       [lanes]float64
	byOrbit [lanes][orbital]float64
	target  [lanes]int     // index of the time that a sample belongs to
	weight  [lanes]float64 // with which its deficit counts there
	block   block
}

// newCurve validates the parameters and the times and prepares a curve.
func newCurve(times []float64, p Params) (*curve, error) {
	profile, err := p.profile()
	if err != nil {
		return nil, err
	}
	for i, t := range times {
		if t-t != 0 {
			return nil, fmt.Errorf("transit: times[%d] is %g, must be a finite time in days", i, t)
		}
	}
	c := &curve{
		path: p.Orbit.Path(), profile: profile, radius: p.RadiusRatio, period: p.Orbit.Period,
		exposure: p.Exposure / secondsPerDay, share: 1 / (1 + p.Companion),
	}
	if p.Evening != 0 || len(p.Spots) > 0 {
		if c.face, err = newFace(&c.profile, p); err != nil {
			return nil, err
		}
		c.radius = max(p.RadiusRatio, p.Evening)
		c.eccentricity = p.Orbit.Eccentricity
		c.sinW, c.cosW = math.Sincos(p.Orbit.Periastron)
	}
	c.from, c.to = c.path.Window(1 + c.radius)
	if c.exposure > 0 {
		c.split()
	}
	c.out.flux = make([]float64, len(times))
	return c, nil
}

// run fills the result.
func (c *curve) run(times []float64) {
	for i := range c.out.flux {
		c.out.flux[i] = 1
	}
	sorted := slices.IsSorted(times)
	from, to := c.from-c.exposure/2, c.to+c.exposure/2
	for i := 0; i < len(times); {
		since, elapsed := c.path.Fold(times[i])
		if since < from || since > to {
			// From here to the next transit.
			wait := from - since
			if wait < 0 {
				wait += c.period
			}
			next := times[i] + wait*(1-1e-9) - 1e-15*math.Abs(times[i])
			i++
			if sorted && i < len(times) && times[i] < next {
				i += sort.SearchFloat64s(times[i:], next)
			}
			continue
		}
		if c.exposure > 0 {
			c.average(i, since, elapsed)
		} else {
			c.sample(i, since, elapsed, 1)
		}
		i++
	}
	c.flush()
}

// sample adds a sample at a time since mid-transit to the result for time i, with
// a weight; elapsed is the time since Orbit.MidTransit.
func (c *curve) sample(i int, since, elapsed, weight float64) {
	if c.face != nil {
		c.look(i, since, elapsed, weight)
		return
	}
	q := &c.wait
	var z float64
	var front bool
	if c.out.grad == nil {
		z, front = c.path.Separation(since)
	} else {
		z, front, q.byOrbit[q.n] = c.path.SeparationGradient(since, elapsed)
	}
	if !front || z-c.radius >= 1 {
		return
	}
	q.z[q.n], q.target[q.n], q.weight[q.n] = z, i, weight
	if q.n++; q.n == lanes {
		c.flush()
	}
}

// flush computes the samples that wait.
func (c *curve) flush() {
	q, p := &c.wait, &c.profile
	q.block.cover(p, c.radius, q.z[:q.n])
	for k, i := range q.target[:q.n] {
		d := &q.block.covered[k]
		for a, term := range c.out.terms {
			term[i] += q.weight[k] * d.value[a]
		}
		deficit, weight := p.weigh(&d.value), q.weight[k]*c.share
		c.out.flux[i] -= weight * deficit
		if c.out.grad == nil {
			continue
		}
		byZ := weight * p.weigh(&d.byZ)
		for a, by := range q.byOrbit[k] {
			c.out.grad[a][i] -= byZ * by
		}
		rest := c.out.grad[orbital:]
		rest[0][i] -= weight * p.weigh(&d.byR)
		for a := range p.count {
			rest[1+a][i] -= weight * p.byCoefficient(a, &d.value, deficit)
		}
		rest[1+p.count][i] += weight * deficit * c.share
	}
	q.n = 0
}
