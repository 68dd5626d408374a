package transit

import "math"

const (
	// smallest is the length below which a radius or a separation counts as 0,
	// so that no product of lengths underflows.
	smallest = 1e-100
	// largestRadius is the radius above which the planet's edge is taken as
	// straight as that of a planet of this radius.
	largestRadius = 1e6
	// smallestModulus replaces a complementary modulus of 0, at which the
	// integral of the third kind has a finite limit when multiplied by its square.
	smallestModulus = 1e-16
	// lanes is how many separations are worked on side by side.
	lanes = 16
)

// deficits are the integrals of the terms of the intensity, 1, μ, μ² = 1-ρ² and
// those of a profile, over the covered part of the stellar disc, divided by π, and
// their derivatives by r and z.
type deficits struct {
	value, byR, byZ [terms]float64
}

// linear is how the integral of μ and its derivatives follow from complete
// elliptic integrals T, C, S and M (third, cosine, sine, margin):
//
//	value = step + third T + cosine C + sine S
//	byR = front (C + s S)
//	byZ = -front/3 (M + t S)
type linear struct {
	step                float64
	third, cosine, sine float64
	front, s, t         float64
}

// add completes d.
func (l *linear) add(t *integrals, d *deficits) {
	// Rounding may leave less than nothing covered.
	d.value[1] = max(0, l.step+l.third*t.third+l.cosine*t.cosine+l.sine*t.sine)
	d.byR[1] = l.front * (t.cosine + l.s*t.sine)
	d.byZ[1] = -l.front / 3 * (t.margin + l.t*t.sine)
}

// block is up to lanes separations, for one radius.
type block struct {
	covered [lanes]deficits
	needs   [lanes]integrals
	linear  [lanes]linear
	lane    [lanes]int // the element of covered that these two are for
	edge    edge
}

// cover sets the block's covered[i], as far as the profile needs it, for a radius
// r ≥ 0 and each separation z[i] ≥ 0, at most lanes of them.
func (b *block) cover(p *profile, r float64, z []float64) {
	n := 0
	for i, separation := range z {
		if b.covered[i].place(p, r, separation, &b.edge, &b.linear[n], &b.needs[n]) {
			b.lane[n] = i
			n++
		}
	}
	solve(b.needs[:n])
	for k, lane := range b.lane[:n] {
		b.linear[k].add(&b.needs[k], &b.covered[lane])
	}
}

// cover is that of a block for one separation; e may be nil for a profile of
// closed terms.
func (d *deficits) cover(p *profile, r, z float64, e *edge) {
	var l linear
	var t [1]integrals
	if d.place(p, r, z, e, &l, &t[0]) {
		solve(t[:])
		l.add(&t[0], d)
	}
}

// place works out all of a separation that takes no elliptic integrals, and
// reports whether it needs some, which it then prepares.
func (d *deficits) place(p *profile, r, z float64, e *edge, l *linear, t *integrals) bool {
	if r > largestRadius {
		z, r = max(z-r+largestRadius, 0), largestRadius
	}
	if z < smallest {
		z = 0
	}
	outer, inner, beyond := gaps(r, z)
	switch {
	case outer <= 0 || r < smallest:
		*d = deficits{} // nothing is covered
		return false
	case inner <= 0:
		ma, mb := p.moments()
		*d = deficits{value: [terms]float64{1, 2. / 3, 0.5, 2 * ma, 2 * mb}}
		return false
	}
	w := outer * inner // 1-(z-r)²
	if beyond <= 0 {
		opr := -beyond * (1 + z + r) // 1-(z+r)²
		d.inside(r, z, w, opr, l, t)
		if p.shape != none {
			if !e.around(p.nodes, r, z, opr) {
				e.graded(p.nodes, opr, 4*z*r, 0, 1)
			}
			e.integrate(p, r, z, d)
		}
		return true
	}
	excess := beyond * (1 + z + r) // (z+r)²-1
	d.limb(r, z, w, excess, l, t)
	if p.shape != none {
		quarter := 0.25 / (z * r)
		e.graded(p.nodes, 0, w, excess*quarter, w*quarter)
		e.integrate(p, r, z, d)
	}
	return true
}

// gaps returns the distances between the edges of planet and star, exact wherever
// they are small: outer = 1-z+r, above 0 before fourth contact; inner = 1-r+z, 0
// or less when the star is covered; beyond = z+r-1, 0 or less when the planet is
// within the star's disc.
func gaps(r, z float64) (outer, inner, beyond float64) {
	outer, inner, beyond = (1-z)+r, (1-r)+z, (r-1)+z
	if z > 2 {
		outer = (r - z) + 1
	}
	if r > 2 {
		inner = (z - r) + 1
	}
	if r < 0.5 {
		beyond = (z - 1) + r
	}
	return outer, inner, beyond
}

// offset returns z - r, kept away from 0, where the integral of the third kind
// has the same limit from both sides once the step of 2/3 is added, and that
// step.
func offset(r, z float64) (diff, step float64) {
	diff = z - r
	if math.Abs(diff) <= smallest*(z+r) {
		diff = smallest * (z + r)
	}
	if diff < 0 {
		step = 2. / 3
	}
	return diff, step
}

// inside is for a planet whose disc lies within the star's: w = 1-(z-r)² > 0 and
// opr = 1-(z+r)² ≥ 0.
func (d *deficits) inside(r, z, w, opr float64, l *linear, t *integrals) {
	r2, z2 := r*r, z*z
	d.value[0], d.value[2] = r2, r2*(1-0.5*r2-z2)
	d.byR[0], d.byR[2] = 2*r, 2*r*(1-z2-r2)
	d.byZ[0], d.byZ[2] = 0, -2*r2*z

	sum := z + r
	root, inverse := math.Sqrt(w), 1/(sum*w)
	opr = max(opr, smallestModulus*smallestModulus)
	kc2 := min(1, opr*sum*inverse) // 1 is passed by rounding at z = 0
	diff, step := offset(r, z)
	mu := 3 * diff * inverse
	t.kc = math.Sqrt(kc2)
	t.k2 = 4 * r * z * sum * inverse
	t.q = math.Abs(diff*w*inverse) * t.kc // |z-r|/(z+r) kc
	t.a = 1 + mu
	t.b = t.q + mu/t.q

	l.step = step
	l.third = 2 / (9 * math.Pi) * root * opr
	l.cosine = -2 / (9 * math.Pi) * root * (4 - 7*r2 - z2)
	l.sine = l.cosine * kc2
	l.front = 4 / math.Pi * r * root
	l.s, l.t = kc2, 0
}

// limb is for a planet whose edge crosses the star's: w = 1-(z-r)² > 0 and
// excess = (z+r)²-1 > 0.
func (d *deficits) limb(r, z, w, excess float64, l *linear, t *integrals) {
	diff, sum, product := z-r, z+r, z*r
	// The edges cross at angle half from the centre line, seen from the planet,
	// and star, seen from the star; kite is four times the area of the triangle
	// between the centres and a crossing.
	rootExcess, inverse := math.Sqrt(excess), 1/math.Sqrt(product)
	kite := math.Sqrt(w) * rootExcess
	var cosHalf, cosStar float64 // times 2zr and 2z
	if r < 0.5 {
		cosHalf = (z-1)*(z+1) + r*r
	} else {
		cosHalf = (r-1)*(r+1) + z*z
	}
	if r < 2 {
		cosStar = (1-r)*(1+r) + z*z
	} else {
		cosStar = diff*sum + 1
	}
	half, star := angle(kite, cosHalf), angle(kite, cosStar)
	sinHalf := 0.5 * kite * inverse * inverse

	// Integrals of q = 1 - cos ψ and q² over the planet's edge, 0 ≤ ψ ≤ half.
	var q1, q2 float64
	if half < 0.5 {
		q1, q2 = versedIntegrals(half)
	} else {
		q1 = half - sinHalf
		q2 = 1.5*half - 2*sinHalf + 0.25*sinHalf*cosHalf*inverse*inverse
	}
	quarter := 0.5 - 0.25*diff*diff
	d.value[0] = (star + r*(z*q1-diff*half)) * (1 / math.Pi)
	d.value[2] = (0.5*star + 2*r*(z*(quarter+0.5*diff*r)*q1-diff*quarter*half-0.5*z*product*q2)) * (1 / math.Pi)
	c := 2 / math.Pi * r
	d.byR[0], d.byR[2] = c*half, c*(w*half-2*product*q1)
	d.byZ[0], d.byZ[2] = -c*sinHalf, -c*(w*(half-q1)-2*product*(q1-q2))

	diff, step := offset(r, z)
	// Below 1 but for rounding at the outer contacts.
	t.kc = min(1, max(0.5*rootExcess*inverse, smallestModulus))
	kc2 := t.kc * t.kc
	t.k2 = 0.25 * w * inverse * inverse
	t.q = math.Abs(diff) * t.kc
	t.a = 0
	t.b = math.Copysign(3*t.kc*sum, diff)

	front := w * inverse
	l.step = step
	l.third = 1 / (9 * math.Pi) * front
	l.cosine = l.third * (6*r*r - 3 - 2*product)
	l.sine = l.third * (-4 * product * kc2)
	l.front = c * front
	l.s, l.t = 0, 3*kc2
}

// versedIntegrals returns the integrals from 0 to x < 0.5 of 1 - cos and
// (1 - cos)², by their series: x - sin x and 3x/2 - 2 sin x + sin 2x / 4.
func versedIntegrals(x float64) (q1, q2 float64) {
	y := x * x
	x3 := x * y
	q1 = x3 * (1. / 6) * (1 - y*(1./20)*(1-y*(1./42)*(1-y*(1./72)*(1-y*(1./110)*(1-y*(1./156))))))
	// (1-cos)² = 3/2 - 2 cos x + cos(2x)/2 = Σ (-1)^k (4^k/2 - 2) x^(2k)/(2k)!
	q2 = x3 * y * (1./20 + y*(-1./168+y*(1./2880+y*(-17./1330560+y*(31./94348800+y*(-1./159667200+y*(5461./59281238016000)))))))
	return q1, q2
}

// angle returns the angle of the point (x, y), y ≥ 0 and not at the origin, from
// the x axis, 0 to π, as math.Atan2 does for any point: with the rational function
// of the Cephes library (Moshier 1989) on |tan| ≤ 0.66.
func angle(y, x float64) float64 {
	across := math.Abs(x)
	t, base := 0.0, 0.0
	switch {
	case y <= 0.66*across:
		t = y / across
	case y < 2.414213562373095*across:
		t, base = (y-across)/(y+across), math.Pi/4
	default:
		t, base = -across/y, math.Pi/2
	}
	z := t * t
	z2 := z * z
	p := (-6.485021904942025371773e+01 - 1.228866684490136173410e+02*z) + z2*((-7.500855792314704667340e+01-1.615753718733365076637e+01*z)-8.750608600031904122785e-01*z2)
	q := (1.945506571482613964425e+02 + 4.853903996359136964868e+02*z) + z2*((4.328810604912902668951e+02+1.650270098316988542046e+02*z)+z2*(2.485846490142306297962e+01+z))
	a := base + (t + t*z*(p/q))
	if x < 0 {
		return math.Pi - a
	}
	return a
}
