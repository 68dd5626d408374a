// Package limb describes how the disc of a star darkens towards its edge.
//
// The law is the quadratic one: at a point where the line of sight leaves the
// star at an angle whose cosine is mu (1 at the centre of the disc, 0 at its
// edge) the intensity relative to the centre is
//
//	I(mu) = 1 - u1 (1-mu) - u2 (1-mu)².
//
// u1 and u2 are the limb-darkening coefficients. Kipping (2013, MNRAS 435,
// 2152) maps the coefficients with positive and monotonic intensity onto the
// unit square (q1, q2), on which a uniform prior is uniform in (u1, u2) too.
// All quantities are dimensionless.
package limb

import "math"

// FromKipping returns the coefficients u1 = 2 √q1 q2 and u2 = √q1 (1 - 2 q2)
// of Kipping (2013). q1 and q2 lie in [0, 1]; a negative q1 gives NaN.
func FromKipping(q1, q2 float64) (u1, u2 float64) {
	root := math.Sqrt(q1)
	return 2 * root * q2, root * (1 - 2*q2)
}

// FromKippingGradient returns the coefficients of [FromKipping] and their
// derivatives d = (du1/dq1, du1/dq2, du2/dq1, du2/dq2). At q1 = 0 the
// derivatives with respect to q1 are infinite, or zero where the numerator
// vanishes as well.
func FromKippingGradient(q1, q2 float64) (u1, u2 float64, d [4]float64) {
	root := math.Sqrt(q1)
	u1, u2 = FromKipping(q1, q2)
	d[1] = 2 * root
	d[3] = -2 * root
	if q2 != 0 {
		d[0] = q2 / root
	}
	if q2 != 0.5 {
		d[2] = (0.5 - q2) / root
	}
	return u1, u2, d
}

// ToKipping returns q1 = (u1+u2)² and q2 = u1 / (2 (u1+u2)), the inverse of
// [FromKipping] for u1+u2 > 0. Without limb darkening (u1 = u2 = 0) q2 is not
// defined and 0.5 is returned. For u1+u2 < 0 the pair lies outside the map and
// [FromKipping] does not lead back; for u1 = -u2 ≠ 0, q2 is infinite.
func ToKipping(u1, u2 float64) (q1, q2 float64) {
	sum := u1 + u2
	if u1 == 0 && u2 == 0 {
		return 0, 0.5
	}
	return sum * sum, u1 / (2 * sum)
}

// QuadraticIntensity returns the intensity at mu in [0, 1], relative to the
// centre of the disc.
func QuadraticIntensity(mu, u1, u2 float64) float64 {
	edge := 1 - mu
	return 1 - edge*(u1+u2*edge)
}

// Physical reports whether the intensity is nowhere negative and nowhere
// increases from the centre of the disc to its edge: u1+u2 ≤ 1, u1 ≥ 0 and
// u1+2 u2 ≥ 0 (Kipping 2013, eq. 8, boundaries included). It is false for NaN.
func Physical(u1, u2 float64) bool {
	return u1+u2 <= 1 && u1 >= 0 && u1+2*u2 >= 0
}
