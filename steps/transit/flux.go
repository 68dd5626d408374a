package transit

import "math"

// largestCoefficient bounds the limb-darkening coefficients so that their sums
// and quotients stay finite.
const largestCoefficient = 1e100

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
	flux, _, _, _, _ := l.gradient(r, z)
	return flux
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
	var b block
	b.cover(r, []float64{z})
	return l.combine(&b.covered[0])
}

// combine returns the flux and its derivatives.
func (l *law) combine(all *deficits) (flux, dr, dz, du1, du2 float64) {
	d := &all.value
	deficit := l.weigh(d)
	// deficit = Σ c_n D_n / total, with d(total) = -du1/3 - du2/6.
	du1 = l.inverse * (d[0] - d[1] - deficit/3)
	du2 = l.inverse * (d[0] - 2*d[1] + d[2] - deficit/6)
	return 1 - deficit, -l.weigh(&all.byR), -l.weigh(&all.byZ), du1, du2
}
