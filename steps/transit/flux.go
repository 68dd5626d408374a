package transit

import "math"

const (
	// smallest is the length below which a radius or a separation counts as 0,
	// so that no product of lengths underflows.
	smallest = 1e-100
	// largestRadius is the radius above which the planet's edge is taken as
	// straight as that of a planet of this radius.
	largestRadius = 1e6
	// smallestModulus replaces a complementary modulus squared of 0, at which the
	// integral of the third kind has a finite limit when multiplied by it.
	smallestModulus = 1e-32
	// largestCoefficient bounds the limb-darkening coefficients so that their
	// sums and quotients stay finite.
	largestCoefficient = 1e100
)

// deficits are the integrals of 1, μ and μ² = 1-ρ² over the covered part of the
// stellar disc, divided by π, and their derivatives by r and z.
type deficits struct {
	value, byR, byZ [3]float64
}

// Quadratic returns the relative flux of a star with limb-darkening
// coefficients u1 and u2 behind a planet of radius ratio r at separation z. It
// is exactly 1 for z ≥ 1+r and 0 for z ≤ r-1. The absolute error is below 1e-14
// for r ≤ 10 and limb darkening that [limb.Law.Physical] accepts, and grows in
// proportion to r beyond.
//
// The result is NaN if r or z is negative or NaN, or r is infinite. It is 1 for
// coefficients with which the star has no light to lose: 1 - u1/3 - u2/6 = 0,
// or coefficients above 1e100.
func Quadratic(r, z, u1, u2 float64) float64 {
	if z-r >= 1 && r >= 0 {
		return 1
	}
	if !(r >= 0 && z >= 0) || math.IsInf(r, 1) {
		return math.NaN()
	}
	l := newLaw(u1, u2)
	if !l.valid {
		return 1
	}
	var d deficits
	d.cover(r, z, false)
	return 1 - l.weigh(&d.value)
}

// QuadraticGradient returns the flux of [Quadratic] and its derivatives with
// respect to r, z, u1 and u2. The derivatives with respect to r and z are
// continuous, except at r = 1, z = 0, where 0 is returned; they are 0 with
// respect to z at z = 0. Where the flux is NaN, so are the derivatives.
func QuadraticGradient(r, z, u1, u2 float64) (flux, dr, dz, du1, du2 float64) {
	if z-r >= 1 && r >= 0 {
		return 1, 0, 0, 0, 0
	}
	if !(r >= 0 && z >= 0) || math.IsInf(r, 1) {
		nan := math.NaN()
		return nan, nan, nan, nan, nan
	}
	l := newLaw(u1, u2)
	if !l.valid {
		return 1, 0, 0, 0, 0
	}
	return l.gradient(r, z)
}

// law holds the weights of the three deficits for one pair of coefficients.
type law struct {
	valid   bool
	weights [3]float64 // of 1, μ, μ²
	inverse float64    // 1 / (1 - u1/3 - u2/6), π times the inverse of the star's flux
}

// newLaw prepares a pair of coefficients.
func newLaw(u1, u2 float64) law {
	total := 1 - u1/3 - u2/6
	if !(total != 0 && math.Abs(u1) <= largestCoefficient && math.Abs(u2) <= largestCoefficient) {
		return law{}
	}
	inverse := 1 / total
	return law{valid: true, weights: [3]float64{(1 - u1 - u2) * inverse, (u1 + 2*u2) * inverse, -u2 * inverse}, inverse: inverse}
}

// weigh returns the deficit of flux.
func (l *law) weigh(d *[3]float64) float64 {
	return l.weights[0]*d[0] + l.weights[1]*d[1] + l.weights[2]*d[2]
}

// gradient is [QuadraticGradient] for valid coefficients and 0 ≤ r, 0 ≤ z.
func (l *law) gradient(r, z float64) (flux, dr, dz, du1, du2 float64) {
	var all deficits
	all.cover(r, z, true)
	d := &all.value
	deficit := l.weigh(d)
	// deficit = Σ c_n D_n / total, with d(total) = -du1/3 - du2/6.
	du1 = l.inverse * (d[0] - d[1] - deficit/3)
	du2 = l.inverse * (d[0] - 2*d[1] + d[2] - deficit/6)
	return 1 - deficit, -l.weigh(&all.byR), -l.weigh(&all.byZ), du1, du2
}

// cover sets d to the deficits for r ≥ 0 and z ≥ 0, and, if asked, their
// derivatives. d must be zero before.
func (d *deficits) cover(r, z float64, derivatives bool) {
	if r > largestRadius {
		z, r = math.Max(z-r+largestRadius, 0), largestRadius
	}
	if z < smallest {
		z = 0
	}
	// Distances of the planet's near and far edge from the star's, exact
	// wherever they are small.
	outer := (1 - z) + r // > 0 before fourth contact
	if z > 2 {
		outer = (r - z) + 1
	}
	inner := (1 - r) + z // ≤ 0 when the star is covered
	if r > 2 {
		inner = (z - r) + 1
	}
	beyond := (r - 1) + z // ≤ 0 when the planet is within the star's disc
	if r < 0.5 {
		beyond = (z - 1) + r
	}
	switch {
	case outer <= 0 || r < smallest: // nothing is covered
	case inner <= 0:
		d.value = [3]float64{1, 2. / 3, 0.5}
	case beyond <= 0:
		d.inside(r, z, outer*inner, -beyond, derivatives)
	default:
		d.limb(r, z, outer*inner, beyond, derivatives)
	}
}

// offset returns z - r, kept away from 0, where the integral of the third kind
// has the same limit from both sides once the step of 2/3 is added.
func offset(r, z float64) float64 {
	if d := z - r; math.Abs(d) > smallest*(z+r) {
		return d
	}
	return smallest * (z + r)
}

// inside is cover for a planet whose disc lies within the star's:
// w = 1-(z-r)² > 0 and gap = 1-z-r ≥ 0.
func (d *deficits) inside(r, z, w, gap float64, derivatives bool) {
	r2, z2 := r*r, z*z
	d.value[0] = r2
	d.value[2] = r2 * (1 - 0.5*r2 - z2)

	diff, sum := offset(r, z), z+r
	ratio := diff / sum
	opr := math.Max(gap*(1+sum), smallestModulus) // 1-(z+r)²
	kc2 := opr / w
	if kc2 > 1 { // rounding at z = 0
		kc2 = 1
	}
	mu := 3 * ratio / w
	p := ratio * ratio * kc2
	third, cosine, sine := elliptic(math.Sqrt(kc2), p, 1+mu, p+mu)
	second := cosine + kc2*sine // E
	root := math.Sqrt(w)
	d.value[1] = 2 * root * (opr*third - (4-7*r2-z2)*second) / (9 * math.Pi)
	if diff < 0 {
		d.value[1] += 2. / 3
	}
	if derivatives {
		d.byR = [3]float64{2 * r, 4 * r / math.Pi * root * second, 2 * r * (1 - z2 - r2)}
		if z > 0 {
			d.byZ = [3]float64{0, -4 * r / (3 * math.Pi) * root * (cosine - kc2*sine), -2 * r2 * z}
		}
	}
}

// limb is cover for a planet whose edge crosses the star's:
// w = 1-(z-r)² > 0 and beyond = z+r-1 > 0.
func (d *deficits) limb(r, z, w, beyond float64, derivatives bool) {
	diff, sum, product := z-r, z+r, z*r
	excess := beyond * (1 + sum) // (z+r)²-1
	// The edges cross at angle half from the centre line, seen from the planet,
	// and star, seen from the star; kite is four times the area of the triangle
	// between the centres and a crossing.
	kite := math.Sqrt(w * excess)
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
	half, star := math.Atan2(kite, cosHalf), math.Atan2(kite, cosStar)
	sinHalf := kite / (2 * product)

	// Integrals of q = 1 - cos ψ and q² over the planet's edge, 0 ≤ ψ ≤ half.
	var q1, q2 float64
	if half < 0.5 {
		q1, q2 = versedIntegrals(half)
	} else {
		q1 = half - sinHalf
		q2 = 1.5*half - 2*sinHalf + sinHalf*cosHalf/(4*product)
	}
	quarter := 0.5 - 0.25*diff*diff
	d.value[0] = (star + r*(z*q1-diff*half)) / math.Pi
	d.value[2] = (0.5*star + 2*r*(z*(quarter+0.5*diff*r)*q1-diff*quarter*half-0.5*z*product*q2)) / math.Pi

	diff = offset(r, z)
	kc2 := excess / (4 * product)
	if kc2 > 1 { // rounding at the outer contacts
		kc2 = 1
	} else if kc2 < smallestModulus {
		kc2 = smallestModulus
	}
	third, cosine, sine := elliptic(math.Sqrt(kc2), diff*diff*kc2, 0, 3*kc2*diff*sum)
	// w/(3√zr) times the integrals; (6r²-3+2zr) cosine - 4zr E, E = cosine + kc² sine.
	front := w / math.Sqrt(product)
	d.value[1] = front * (third + (6*r*r-3-2*product)*cosine - 4*product*kc2*sine) / (9 * math.Pi)
	if diff < 0 {
		d.value[1] += 2. / 3
	}
	if derivatives {
		c := 2 * r / math.Pi
		d.byR = [3]float64{c * half, c * front * cosine, c * (w*half - 2*product*q1)}
		d.byZ = [3]float64{-c * sinHalf, -c / 3 * front * (cosine + 2*kc2*sine), -c * (w*(half-q1) - 2*product*(q1-q2))}
	}
}

// versedIntegrals returns the integrals from 0 to x < 0.5 of 1 - cos and
// (1 - cos)², by their series: x - sin x and 3x/2 - 2 sin x + sin 2x / 4.
func versedIntegrals(x float64) (q1, q2 float64) {
	y := x * x
	x3 := x * y
	q1 = x3 / 6 * (1 - y/20*(1-y/42*(1-y/72*(1-y/110*(1-y/156)))))
	// (1-cos)² = 3/2 - 2 cos x + cos(2x)/2 = Σ (-1)^k (4^k/2 - 2) x^(2k)/(2k)!
	q2 = x3 * y * (1./20 + y*(-1./168+y*(1./2880+y*(-17./1330560+y*(31./94348800+y*(-1./159667200+y*(5461./59281238016000)))))))
	return q1, q2
}
