package transit

import (
	"fmt"
	"math"

	"rimlight/steps/limb"
)

// Halves are a planet whose limbs differ: two half-discs about one centre, of
// the radius of the morning limb and of that of the evening limb, along the line
// of the terminator (the two semicircles of Espinoza & Jones 2021, AJ 162, 165).
type Halves struct {
	Morning    float64 // radius of the leading half in stellar radii, ≥ 0
	Evening    float64 // radius of the trailing half in stellar radii, ≥ 0
	Terminator float64 // angle of the middle of the morning half from the X axis, along which the planet moves, towards the Y axis, radians
}

// outline collects the integrals along the edge of what the planet covers. With
// the terms g of a profile, their moments M, and h as in profile.values,
//
//	π deficit = 2M area + ∮ h (x dy - y dx)
//
// along the part of the planet's outline within the star's disc, where it runs
// around the planet counterclockwise; any change of the outline by a velocity
// (vx, vy) has ∮ g (vx dy - vy dx). The area, and with it all of the first term,
// g = 1, h = 0, is closed.
type outline struct {
	profile *profile
	area    float64 // twice that of what is covered
	inner   [terms]float64
	byX     [terms]float64
	byY     [terms]float64
	radial  [terms]float64 // change by the radius of the arc last walked
	turn    [terms]float64 // by the terminator
}

// point adds a point at offset (px, py) from the planet's centre (cx, cy), where
// the outline goes on by (dx, dy).
func (o *outline) point(mu2, cx, cy, px, py, dx, dy, radial float64) {
	mu := math.Sqrt(mu2)
	a, b, ha, hb := o.profile.values(mu2)
	lever := (cx+px)*dy - (cy+py)*dx
	spin := -(px*dx + py*dy)
	values := [terms]float64{1, mu, mu2, a, b}
	n := terms
	if o.profile.shape == none {
		n = 3
	}
	for k := 1; k < n; k++ {
		g := values[k]
		o.byX[k] += g * dy
		o.byY[k] -= g * dx
		o.radial[k] += g * radial
		o.turn[k] += g * spin
	}
	o.inner[1] += lever * mu2 / (3 * (1 + mu))
	o.inner[2] += lever * mu2 / 4
	o.inner[3] += lever * ha
	o.inner[4] += lever * hb
}

// walk calls at for the nodes and weights of an integral from a to b of a function
// with singular points no nearer than clear: by Gauss and Legendre on pieces, with
// as many nodes as the piece's length takes (see curve.nodes).
func (o *outline) walk(a, b, clear float64, at func(x, weight float64)) {
	if !(b > a) {
		return
	}
	digits := o.profile.nodes.digits
	pieces := int(math.Ceil((b - a) / (2 * clear) * math.Sinh(digits/(2*mostNodes))))
	half := (b - a) / float64(2*pieces)
	n := max(1, min(mostNodes, int(math.Ceil(digits/(2*math.Asinh(clear/half))))))
	for k := range pieces {
		centre := a + half*float64(2*k+1)
		for i, x := range rules[n].nodes {
			at(centre+half*x, half*rules[n].weights[i])
		}
	}
}

// arc adds the part within the star of an arc of radius r > 0 about (cx, cy) = z
// (cos phi, sin phi), from angle from to angle from + π.
func (o *outline) arc(r, z, phi, cx, cy, from float64) {
	o.radial = [terms]float64{}
	outer, inner, beyond := gaps(r, z)
	if outer <= 0 || inner <= 0 {
		return
	}
	a := arc{outline: o, r: r, z: z, cx: cx, cy: cy, lead: 4 * z * r, v: 1}
	a.sin, a.cos = math.Sincos(phi)
	if excess := beyond * (1 + z + r); excess > 0 {
		a.base, a.lead = excess/(4*z*r), outer*inner
		a.v = math.Sqrt(a.lead / (4 * z * r))
		a.start = 2 * math.Atan2(math.Sqrt(a.base), a.v)
	} else {
		a.opr = -excess
	}
	// The edge lies within the star from start to 2π - start. The arc may meet
	// that twice.
	low := math.Remainder(from-phi, 2*math.Pi)
	for turn := -1.0; turn <= 1; turn++ {
		base := 2 * math.Pi * turn
		begin, end := max(low, base+a.start)-base, min(low+math.Pi, base+2*math.Pi-a.start)-base
		if begin >= end {
			continue
		}
		// On either side of the point nearest the star's centre.
		a.side(begin, min(end, math.Pi), 1)
		a.side(2*math.Pi-end, min(2*math.Pi-begin, math.Pi), -1)
		sinA, cosA := math.Sincos(phi + begin)
		sinB, cosB := math.Sincos(phi + end)
		o.area += r * (r*(end-begin) + cx*(sinB-sinA) - cy*(cosB-cosA))
		o.byX[0] += r * (sinB - sinA)
		o.byY[0] -= r * (cosB - cosA)
		o.radial[0] += r * (end - begin)
	}
}

// arc is the edge of a half-disc. At an angle from the direction away from the
// star, with sin²(angle/2) = base + v² s, it has μ² = opr + lead s, where s runs from
// 0 at the angle start, at or nearest to the star's edge, to 1.
type arc struct {
	outline        *outline
	r, z, cx, cy   float64
	sin, cos       float64 // of the direction away from the star
	start, base, v float64
	opr, lead      float64
}

// add adds a point at an angle with the given sine and cosine.
func (a *arc) add(s, sin, cos, weight float64) {
	x, y := a.r*(a.cos*cos-a.sin*sin), a.r*(a.sin*cos+a.cos*sin)
	a.outline.point(a.opr+a.lead*s, a.cx, a.cy, x, y, -y*weight, x*weight, a.r*weight)
}

// side adds the piece at angles start ≤ from < to ≤ π, on the left of the
// direction away from the star (sign 1) or on its right (-1).
func (a *arc) side(from, to, sign float64) {
	if from >= to {
		return
	}
	if a.start == 0 {
		// Singular where sin²(angle/2) = -opr/lead, this far from the real axis.
		clear := math.Pi
		if a.lead > 0 {
			clear = min(clear, 2*math.Asinh(math.Sqrt(a.opr/a.lead)))
		}
		if clear > 0.25 {
			a.outline.walk(from, to, clear, func(angle, weight float64) {
				sin, cos := math.Sincos(angle / 2)
				a.add(sin*sin, sign*2*sin*cos, 1-2*sin*sin, weight)
			})
			return
		}
	}
	// With cos(angle/2) = v tanh x all singular points are π/2 away, however near
	// the contact.
	limit := func(angle float64) float64 {
		// tanh x = c gives x = log((1+c)²/(1-c²))/2, without cancellation.
		c := math.Cos(angle/2) / a.v
		rest := math.Sin((angle-a.start)/2) * math.Sin((angle+a.start)/2) / (a.v * a.v)
		if !(rest > 0) {
			return math.Inf(1)
		}
		return 0.5 * math.Log((1+c)*(1+c)/rest)
	}
	far := a.outline.profile.nodes.farthest
	if a.start == 0 { // the angle itself, not its square, vanishes there
		far *= 2
	}
	a.outline.walk(max(0, limit(to)), min(limit(from), far), math.Pi/2, func(x, weight float64) {
		e := math.Exp(-2 * x)
		s := 4 * e / ((1 + e) * (1 + e))
		half := math.Sqrt(a.base + a.v*a.v*s) // sin(angle/2)
		sin := 2 * half * a.v * (1 - e) / (1 + e)
		a.add(s, sign*sin, 1-2*half*half, weight*2*a.v*s/half)
	})
}

// segment adds the part within the star of the line from offset a to offset b
// from the planet's centre (cx, cy) in the direction (ex, ey).
func (o *outline) segment(cx, cy, ex, ey, a, b float64) {
	sign := 1.0
	if a > b {
		a, b, sign = b, a, -1
	}
	// The chord: offsets middle ± half.
	middle, distance := -(cx*ex + cy*ey), cx*ey-cy*ex
	if math.Abs(distance) >= 1 {
		return
	}
	half := math.Sqrt((1 - distance) * (1 + distance))
	a, b = max(a, middle-half), min(b, middle+half)
	if !(a < b) {
		return
	}
	o.area += sign * distance * (b - a)
	o.byX[0] += sign * ey * (b - a)
	o.byY[0] -= sign * ex * (b - a)
	o.turn[0] -= sign * (b - a) * (b + a) / 2
	bounded := func(s float64) float64 {
		return math.Atanh(max(-1, min(1, (s-middle)/half)))
	}
	far := o.profile.nodes.farthest
	o.walk(max(bounded(a), -far), min(bounded(b), far), math.Pi/2, func(x, weight float64) {
		cosh := math.Cosh(x)
		offset := middle + half*math.Tanh(x)
		d := sign * weight * half / (cosh * cosh)
		o.point(half*half/(cosh*cosh), cx, cy, offset*ex, offset*ey, ex*d, ey*d, 0)
	})
}

// shade is what a planet that is not round covers, and the derivatives by its
// place, by the radii of its halves and by its terminator.
type shade struct {
	value, byX, byY, byMorning, byEvening, byTerminator [terms]float64
}

// cover computes the shade of a planet at (x, y).
func (h Halves) cover(p *profile, x, y float64) shade {
	var s shade
	z, phi := math.Hypot(x, y), math.Atan2(y, x)
	if z >= 1+max(h.Morning, h.Evening) {
		return s
	}
	o := outline{profile: p}
	sin, cos := math.Sincos(h.Terminator)
	if h.Morning > 0 {
		o.arc(h.Morning, z, phi, x, y, h.Terminator-math.Pi/2)
		s.byMorning = o.radial
	}
	o.segment(x, y, -sin, cos, h.Morning, h.Evening)
	if h.Evening > 0 {
		o.arc(h.Evening, z, phi, x, y, h.Terminator+math.Pi/2)
		s.byEvening = o.radial
	}
	o.segment(x, y, sin, -cos, h.Evening, h.Morning)
	// The star's edge behind either half.
	along := x*cos + y*sin // the morning half is beyond this, along its direction
	split := math.Acos(max(-1, min(1, along)))
	o.area += overlap(phi, behind(h.Morning, z), h.Terminator, split) +
		overlap(phi, behind(h.Evening, z), h.Terminator+math.Pi, math.Pi-split)

	ma, mb := p.moments()
	for k, moment := range [terms]float64{1. / 2, 1. / 3, 1. / 4, ma, mb} {
		s.value[k] = (moment*o.area + o.inner[k]) / math.Pi
		s.byX[k], s.byY[k] = o.byX[k]/math.Pi, o.byY[k]/math.Pi
		s.byMorning[k] /= math.Pi
		s.byEvening[k] /= math.Pi
		s.byTerminator[k] = o.turn[k] / math.Pi
	}
	return s
}

// A HalvesGradient is a relative flux and its derivatives, one value for each
// place of the planet.
type HalvesGradient struct {
	Flux          []float64
	ByX, ByY      []float64   // derivatives by the planet's place
	ByMorning     []float64   // by the radius of the morning half
	ByEvening     []float64   // by the radius of the evening half
	ByTerminator  []float64   // by the angle of the terminator
	ByCoefficient [][]float64 // by the law's coefficients, a slice for each
}

// HalvesFlux returns the relative flux of a star with a limb-darkening law behind
// a planet of two halves at each place (x[i], y[i]), in stellar radii from the
// star's centre. For the uniform, linear and quadratic laws the absolute error is
// below 1e-13, and that of the derivatives below 1e-11; for others both are below
// the tolerance, see [Flux]. They grow with the radii beyond 1. The law, the radii and the places
// must be valid and finite.
func HalvesFlux(h Halves, x, y []float64, law limb.Law, tolerance float64) (HalvesGradient, error) {
	fail := func(format string, args ...any) (HalvesGradient, error) {
		return HalvesGradient{}, fmt.Errorf("transit: "+format, args...)
	}
	for _, v := range []float64{h.Morning, h.Evening} {
		if !(v >= 0) || math.IsInf(v, 1) {
			return fail("radius of a half is %g, must be finite and not negative", v)
		}
	}
	if h.Terminator-h.Terminator != 0 {
		return fail("Terminator is %g, must be a finite angle in radians", h.Terminator)
	}
	if len(x) != len(y) {
		return fail("%d places x and %d places y, must be as many", len(x), len(y))
	}
	for i := range x {
		if x[i]-x[i] != 0 || y[i]-y[i] != 0 {
			return fail("place %d is (%g, %g), must be finite", i, x[i], y[i])
		}
	}
	p, err := newProfile(law, tolerance)
	if err != nil {
		return HalvesGradient{}, err
	}
	n := len(x)
	column := func() []float64 { return make([]float64, n) }
	g := HalvesGradient{Flux: column(), ByX: column(), ByY: column(), ByMorning: column(), ByEvening: column(), ByTerminator: column()}
	for range p.count {
		g.ByCoefficient = append(g.ByCoefficient, column())
	}
	for i := range x {
		s := h.cover(&p, x[i], y[i])
		deficit := p.weigh(&s.value)
		g.Flux[i] = 1 - deficit
		g.ByX[i], g.ByY[i] = -p.weigh(&s.byX), -p.weigh(&s.byY)
		g.ByMorning[i], g.ByEvening[i], g.ByTerminator[i] = -p.weigh(&s.byMorning), -p.weigh(&s.byEvening), -p.weigh(&s.byTerminator)
		for k, by := range g.ByCoefficient {
			by[i] = -p.byCoefficient(k, &s.value, deficit)
		}
	}
	return g, nil
}

// behind returns half the angle that the part of the star's edge within radius r
// of a point at distance z spans.
func behind(r, z float64) float64 {
	outer, inner, beyond := gaps(r, z)
	switch {
	case inner <= 0:
		return math.Pi
	case outer <= 0 || beyond <= 0:
		return 0
	}
	return 2 * math.Atan2(math.Sqrt(beyond*outer), math.Sqrt(inner*(1+z+r)))
}

// overlap returns the length of what two stretches of a circle share, each of an
// angle to either side of its middle.
func overlap(middle, half, other, otherHalf float64) float64 {
	d := math.Remainder(other-middle, 2*math.Pi)
	sum := 0.0
	for turn := -1.0; turn <= 1; turn++ {
		at := d + 2*math.Pi*turn
		sum += max(0, min(half, at+otherHalf)-max(-half, at-otherHalf))
	}
	return sum
}
