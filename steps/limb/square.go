package limb

import (
	"fmt"
	"math"
)

// FromSquare returns the coefficients of a law of two coefficients at the point
// (q1, q2) of the unit square, so that a uniform prior there is uniform in the
// triangle of the physical laws:
//
//	quadratic    u1 = 2 √q1 q2,      u2 = √q1 (1 - 2 q2)    Kipping (2013, MNRAS 435, 2152)
//	square-root  u1 = √q1 (1-2 q2),  u2 = 2 √q1 q2          Kipping (2013)
//	logarithmic  u1 = 1 - √q1 q2,    u2 = 1 - √q1           Espinoza & Jordán (2016, MNRAS 457, 3573)
//	power-2      h1 = 1 - √q1 (1-q2), h2 = 1 - √q1          Short et al. (2019, RNAAS 3, 117)
//
// with h1 and h2 of [FromHalf]: for the power-2 law the prior is uniform in
// these. (The last two forms from memory; that they map the square onto the
// triangle with constant density is tested.)
//
// grad holds du1/dq1, du1/dq2, du2/dq1, du2/dq2. At q1 = 0 derivatives by q1 may
// be infinite; see [FromRoot]. It is an error when q1 or q2 is outside [0, 1], and
// for the power-2 law when q1 is 0 or 1 or q2 is 1, where the exponent would be
// zero or infinite; or when the law has not two coefficients.
func FromSquare(law string, q1, q2 float64) (u1, u2 float64, grad [4]float64, err error) {
	if !(q1 >= 0 && q1 <= 1 && q2 >= 0 && q2 <= 1) {
		return 0, 0, grad, fmt.Errorf("limb: the point q1 = %g, q2 = %g is outside the unit square", q1, q2)
	}
	root := math.Sqrt(q1)
	u1, u2, grad, err = FromRoot(law, root, q2)
	for _, i := range []int{0, 2} {
		if grad[i] != 0 {
			grad[i] /= 2 * root
		}
	}
	return u1, u2, grad, err
}

// FromRoot is [FromSquare] with √q1 in the place of q1, for fits: the
// coefficients are smooth in it and the derivatives, by √q1 and q2, finite. Points
// outside the square are allowed, where the formulas have a meaning, and give
// laws that are not physical.
func FromRoot(law string, root, q2 float64) (u1, u2 float64, grad [4]float64, err error) {
	fail := func(format string, args ...any) (float64, float64, [4]float64, error) {
		return 0, 0, [4]float64{}, fmt.Errorf("limb: "+format, args...)
	}
	if !(math.Abs(root) <= largest && math.Abs(q2) <= largest) {
		return fail("√q1 is %g and q2 is %g, must be finite", root, q2)
	}
	switch law {
	case Quadratic:
		return 2 * root * q2, root * (1 - 2*q2), [4]float64{2 * q2, 2 * root, 1 - 2*q2, -2 * root}, nil
	case SquareRoot:
		return root * (1 - 2*q2), 2 * root * q2, [4]float64{1 - 2*q2, -2 * root, 2 * q2, 2 * root}, nil
	case Logarithmic:
		return 1 - root*q2, 1 - root, [4]float64{-q2, -root, -1, 0}, nil
	case Power2:
		// c = 1 - √q1 q2 and 2^α = c/h2 = 1 + √q1 (1-q2)/(1-√q1).
		c, h2 := 1-root*q2, 1-root
		u2 = math.Log1p(root*(1-q2)/h2) / math.Ln2
		if !(u2 > 0 && h2 > 0) {
			return fail("the exponent of the power-2 law is zero or infinite at q1 = %g, q2 = %g; keep q1 off 0 and 1 and q2 off 1", root*root, q2)
		}
		return c, u2, [4]float64{-q2, -root, (1/h2 - q2/c) / math.Ln2, -root / (c * math.Ln2)}, nil
	}
	n, err := Count(law)
	if err != nil {
		return 0, 0, [4]float64{}, err
	}
	return fail("the %s law has %d coefficients; the unit square is for laws of two", law, n)
}

// ToSquare returns the point of the unit square that [FromSquare] maps to the
// coefficients: q1 = (u1+u2)² and, quadratic, q2 = u1/(2(u1+u2)) or, square-root,
// u2/(2(u1+u2)); q1 = (1-h2)² and q2 = (1-h1)/(1-h2) or, power-2, (h1-h2)/(1-h2),
// with the coefficients in the place of h1 and h2 for the logarithmic law. For
// laws that are not physical it lies outside the square. Where every q2 gives the
// same coefficients it is 0.5. It is an error when no q1 and q2 lead to the
// coefficients by the formulas, as with u1+u2 < 0, or they are not finite, or the
// law has not two coefficients.
func ToSquare(law string, u1, u2 float64) (q1, q2 float64, err error) {
	fail := func() (float64, float64, error) {
		return 0, 0, fmt.Errorf("limb: no point of the unit square leads to the coefficients %g and %g of the %s law, which are not physical", u1, u2, law)
	}
	if !(math.Abs(u1) <= largest && math.Abs(u2) <= largest) {
		return fail()
	}
	// Position on the side opposite to the vertex at q1 = 0, times root.
	var root, part float64
	switch law {
	case Quadratic:
		root, part = u1+u2, u1/2
	case SquareRoot:
		root, part = u1+u2, u2/2
	case Logarithmic:
		root, part = 1-u2, 1-u1
	case Power2:
		if !(u2 > 0) {
			return fail()
		}
		h1, h2 := ToHalf(u1, u2)
		root, part = 1-h2, h1-h2
	default:
		_, _, _, err := FromRoot(law, 0.5, 0.5)
		return 0, 0, err
	}
	if root == 0 && part == 0 {
		return 0, 0.5, nil
	}
	if !(root > 0) {
		return fail()
	}
	return root * root, part / root, nil
}

// FromHalf returns the coefficients u1 and u2 of the power-2 law with intensity
// h1 at mu = 1/2 and h1 - h2 at the edge of the disc: the parameters of Maxted
// (2018, A&A 616, A39; from memory), which correlate little in fits of transits:
//
//	h1 = 1 - u1 (1 - 2^-u2),  h2 = u1 2^-u2.
//
// grad holds du1/dh1, du1/dh2, du2/dh1, du2/dh2. Physical laws have
// 0 ≤ h2 ≤ h1 ≤ 1. It is an error when h2 is not above 0 or h1 not below 1, as
// no exponent above 0 leads there, or they are not finite.
func FromHalf(h1, h2 float64) (u1, u2 float64, grad [4]float64, err error) {
	if !(h2 > 0 && h1 < 1 && h2 <= largest && h1 >= -largest) {
		return 0, 0, grad, fmt.Errorf("limb: no power-2 law has h1 = %g and h2 = %g, expected h1 below 1 and h2 above 0", h1, h2)
	}
	u1 = (1 - h1) + h2
	u2 = math.Log1p((1-h1)/h2) / math.Ln2
	byH1 := -1 / (u1 * math.Ln2)
	return u1, u2, [4]float64{-1, 1, byH1, byH1 * (1 - h1) / h2}, nil
}

// ToHalf returns h1 and h2 of [FromHalf]. They are NaN when a coefficient is NaN.
func ToHalf(u1, u2 float64) (h1, h2 float64) {
	less := math.Expm1(-u2 * math.Ln2) // 2^-u2 - 1
	return 1 + u1*less, u1 * (1 + less)
}
