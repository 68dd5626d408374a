package transit

import (
	"fmt"
	"math"
)

// leastLight is how much of its light spots must leave a star.
const leastLight = 1e-6

// face is a star with spots, or with a planet of two limbs before it. With the
// deficit f of the star without spots, the shares t of each spot in its light and
// o of what is covered of the spot, both as on a star without spots, and k =
// 1 - Contrast, the flux is
//
//	1 - (f - Σ k o) / (1 - Σ k t).
type face struct {
	profile *profile
	halves  *Halves // nil for a round planet
	radius  float64
	spots   []Spot
	caps    []spotCap
	light   float64   // 1 - Σ k t
	byRest  []float64 // its derivatives
	edge    edge
	deficit deficit // scratch
}

// deficit is 1 less the flux, with its derivatives: by the place of the planet,
// and by what follows the parameters of the orbit in the arguments of a curve.
type deficit struct {
	value, byX, byY float64
	rest            []float64
}

// newFace prepares valid parameters.
func newFace(profile *profile, p Params) (*face, error) {
	f := &face{profile: profile, radius: p.RadiusRatio, spots: p.Spots, light: 1}
	if p.Evening != 0 {
		f.halves = &Halves{Morning: p.RadiusRatio, Evening: p.Evening, Terminator: p.Terminator}
	}
	rest := len(p.Arguments()) - orbital
	f.deficit.rest, f.byRest = make([]float64, rest), make([]float64, rest)
	for i, s := range p.Spots {
		c := newCap(s)
		f.caps = append(f.caps, c)
		whole := c.whole(profile)
		f.light -= f.share(i, &whole, f.byRest)
	}
	for k := range f.byRest {
		f.byRest[k] = -f.byRest[k]
	}
	if !(f.light >= leastLight) || math.IsInf(f.light, 1) {
		return nil, fmt.Errorf("transit: the spots leave the star %g of its light, must be %g or more, and finite", f.light, leastLight)
	}
	return f, nil
}

// share returns k times the share of a part of spot i in the star's light, and
// adds its derivatives to by.
func (f *face) share(i int, s *stain, by []float64) float64 {
	p, k := f.profile, 1-f.spots[i].Contrast
	share := p.weigh(&s.value)
	by[0] += k * p.weigh(&s.byR)
	for a := range p.count {
		by[1+a] += k * p.byCoefficient(a, &s.value, share)
	}
	own := by[2+p.count+spotArguments*i:]
	own[0] += k * p.weigh(&s.byLatitude)
	own[1] += k * p.weigh(&s.byLongitude)
	own[2] += k * p.weigh(&s.byRadius)
	own[3] -= share
	return k * share
}

// at computes the deficit of a planet at (x, y), which stays valid until the next
// call.
func (f *face) at(x, y float64) *deficit {
	p, d := f.profile, &f.deficit
	clear(d.rest)
	var value [terms]float64
	if f.halves != nil {
		s := f.halves.cover(p, x, y)
		value = s.value
		d.byX, d.byY = p.weigh(&s.byX), p.weigh(&s.byY)
		d.rest[0] = p.weigh(&s.byMorning)
		d.rest[2+p.count], d.rest[3+p.count] = p.weigh(&s.byEvening), p.weigh(&s.byTerminator)
	} else {
		var round deficits
		z := math.Hypot(x, y)
		round.cover(p, f.radius, z, &f.edge)
		value = round.value
		byZ := p.weigh(&round.byZ)
		d.byX, d.byY = 0, 0
		if z > 0 {
			d.byX, d.byY = byZ*x/z, byZ*y/z
		}
		d.rest[0] = p.weigh(&round.byR)
	}
	d.value = p.weigh(&value)
	for i := range p.count {
		d.rest[1+i] = p.byCoefficient(i, &value, d.value)
	}
	if len(f.spots) == 0 {
		return d
	}
	for k := range d.rest {
		d.rest[k] = -d.rest[k] // while shares of spots are added
	}
	for i, s := range f.spots {
		covered, any := f.caps[i].covered(p, f.radius, x, y)
		if !any {
			continue
		}
		k := 1 - s.Contrast
		d.value -= f.share(i, &covered, d.rest)
		d.byX -= k * p.weigh(&covered.byX)
		d.byY -= k * p.weigh(&covered.byY)
	}
	d.value /= f.light
	d.byX /= f.light
	d.byY /= f.light
	for k := range d.rest {
		d.rest[k] = (-d.rest[k] - d.value*f.byRest[k]) / f.light
	}
	return d
}

// look adds a sample to the result for time i, as sample does.
func (c *curve) look(i int, since, elapsed, weight float64) {
	d, byOrbit := c.see(since, elapsed)
	if d == nil {
		return
	}
	weight *= c.share
	c.out.flux[i] -= weight * d.value
	if c.out.grad == nil {
		return
	}
	for a, by := range byOrbit {
		c.out.grad[a][i] -= weight * by
	}
	for a, by := range d.rest {
		c.out.grad[orbital+a][i] -= weight * by
	}
	c.out.grad[orbital+1+c.profile.count][i] += weight * c.share * d.value
}

// see returns the deficit at a time since mid-transit and its derivatives by the
// parameters of the orbit, or nil when nothing is covered.
func (c *curve) see(since, elapsed float64) (d *deficit, byOrbit [orbital]float64) {
	place, slopes := c.path.SkyGradient(since, elapsed)
	x, y := place[0], place[1]
	if place[2] <= 0 || math.Hypot(x, y)-c.radius >= 1 {
		return nil, byOrbit
	}
	d = c.face.at(x, y)
	for k := range byOrbit {
		byOrbit[k] = d.byX*slopes[0][k] + d.byY*slopes[1][k]
	}
	// From e cos ω and e sin ω to e and ω.
	h, k := byOrbit[4], byOrbit[5]
	byOrbit[4], byOrbit[5] = h*c.cosW+k*c.sinW, c.eccentricity*(k*c.cosW-h*c.sinW)
	return d, byOrbit
}

// refine adds the samples that make up the integral from a to b of an exposure,
// wherever the contacts are that limbs and spots add.
func (c *curve) refine(i int, a, b, offset float64) {
	halve(a, b, averageTolerance*c.exposure, func(since float64) float64 {
		if d, _ := c.see(since, offset+since); d != nil {
			return d.value
		}
		return 0
	}, func(since, weight float64) {
		c.look(i, since, offset+since, weight/c.exposure)
	})
}

// halve calls use with the points and weights of an integral from a to b, which
// is halved until the integral of value over a piece and over its halves agree
// to a tolerance, at most 500 times.
func halve(a, b, tolerance float64, value func(x float64) float64, use func(x, weight float64)) {
	const points, deepest = 8, 24
	left := 500
	r := &rules[points]
	each := func(a, b float64, use func(x, weight float64)) {
		for k, x := range r.nodes {
			use((a+b)/2+(b-a)/2*x, r.weights[k]*(b-a)/2)
		}
	}
	sum := func(a, b float64) (s float64) {
		each(a, b, func(x, weight float64) { s += weight * value(x) })
		return s
	}
	var descend func(a, b, whole float64, depth int)
	descend = func(a, b, whole float64, depth int) {
		middle := (a + b) / 2
		low, high := sum(a, middle), sum(middle, b)
		if math.Abs(low+high-whole) > tolerance && depth < deepest && left > 0 {
			left--
			descend(a, middle, low, depth+1)
			descend(middle, b, high, depth+1)
			return
		}
		each(a, middle, use)
		each(middle, b, use)
	}
	descend(a, b, sum(a, b), 0)
}
