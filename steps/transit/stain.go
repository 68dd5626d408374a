package transit

import (
	"math"
	"slices"
)

// between calls piece with the stretches into which cuts, angles in any order and
// at least one, divide the circle.
func between(cuts []float64, piece func(from, to float64)) {
	for i, c := range cuts {
		cuts[i] = math.Mod(math.Mod(c, 2*math.Pi)+2*math.Pi, 2*math.Pi)
	}
	slices.Sort(cuts)
	for i, from := range cuts {
		to := cuts[0] + 2*math.Pi
		if i+1 < len(cuts) {
			to = cuts[i+1]
		}
		if to > from {
			piece(from, to)
		}
	}
}

// ends are nodes and weights on (-1, 1) of the tanh-sinh rule, for functions with
// any singularity at the ends.
var ends = func() (r rule) {
	const step, half = 1. / 10, 32
	for k := -half; k <= half; k++ {
		sinh, cosh := math.Sinh(step*float64(k)), math.Cosh(step*float64(k))
		c := math.Cosh(math.Pi / 2 * sinh)
		r.nodes = append(r.nodes, math.Tanh(math.Pi/2*sinh))
		r.weights = append(r.weights, step*math.Pi/2*cosh/(c*c))
	}
	return r
}()

// A stainer collects a stain along its edge, as an outline does the shade of a
// planet.
type stainer struct {
	profile *profile
	area    float64 // twice that of the stain
	inner   [terms]float64
	out     stain // but for the value, and π times it
}

// stain returns what was collected.
func (w *stainer) stain() stain {
	s := &w.out
	ma, mb := w.profile.moments()
	for k, moment := range [terms]float64{1. / 2, 1. / 3, 1. / 4, ma, mb} {
		s.value[k] = moment*w.area + w.inner[k]
	}
	for _, all := range []*[terms]float64{&s.value, &s.byX, &s.byY, &s.byR, &s.byLatitude, &s.byLongitude, &s.byRadius} {
		for k := range all {
			all[k] /= math.Pi
		}
	}
	return *s
}

// point adds what of the edge is at a point of height μ, where the edge's step has
// the given x dy - y dx, and returns the terms.
func (w *stainer) point(mu2, lever float64) [terms]float64 {
	mu := math.Sqrt(mu2)
	a, b, ha, hb := w.profile.values(mu2)
	w.area += lever
	w.inner[1] += lever * mu2 / (3 * (1 + mu))
	w.inner[2] += lever * mu2 / 4
	w.inner[3] += lever * ha
	w.inner[4] += lever * hb
	return [terms]float64{1, mu, mu2, a, b}
}

// planet adds a piece of the edge of a planet of radius r at (x, y) = z (cos phi,
// sin phi).
func (w *stainer) planet(r, z, phi, x, y, from, to float64) {
	middle, half := (from+to)/2, (to-from)/2
	opr := (1 - z - r) * (1 + z + r)
	for i, node := range ends.nodes {
		angle := middle + half*node
		weight := half * ends.weights[i]
		sin, cos := math.Sincos(angle)
		s := math.Sin((angle - phi) / 2)
		g := w.point(max(0, min(1, opr+4*z*r*s*s)), r*(r+x*cos+y*sin)*weight)
		for k, v := range g {
			w.out.byX[k] += v * r * cos * weight
			w.out.byY[k] += v * r * sin * weight
			w.out.byR[k] += v * r * weight
		}
	}
}

// edge adds a piece of the edge of the spot. The light that a move of the edge by
// an angle adds to the spot is the term times μ for each unit of its length.
func (w *stainer) edge(c *spotCap, from, to float64) {
	middle, half := (from+to)/2, (to-from)/2
	for i, node := range ends.nodes {
		angle := middle + half*node
		weight := half * ends.weights[i]
		at, by := c.edge(angle)
		sin, cos := math.Sincos(angle)
		mu := max(0, min(1, at[2]))
		g := w.point(mu*mu, (at[0]*by[1]-at[1]*by[0])*weight)
		for k, v := range g {
			v *= mu * c.sin * weight
			w.out.byRadius[k] += v
			w.out.byLatitude[k] += v * cos
			w.out.byLongitude[k] -= v * sin * c.cosLatitude
		}
	}
}
