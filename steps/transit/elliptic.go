package transit

import "math"

const (
	// agmTolerance ends the arithmetic-geometric mean, which converges
	// quadratically: the remaining error is its square, below rounding.
	agmTolerance = 1e-8
	// agmSteps bounds the mean; moduli down to 1e-16 take 9 steps.
	agmSteps = 16
)

// elliptic returns, for 0 < kc ≤ 1 and p > 0, with Δ = √(cos²x + kc² sin²x) and
// integrals over x from 0 to π/2,
//
//	third = ∫ (a cos²x + b sin²x) / ((cos²x + p sin²x) Δ) dx,
//	cosine = ∫ cos²x/Δ dx,
//	sine = ∫ sin²x/Δ dx.
//
// These are cel(kc,p,a,b), cel(kc,1,1,0) and cel(kc,1,0,1) of Bulirsch (1969),
// computed with one arithmetic-geometric mean.
func elliptic(kc, p, a, b float64) (third, cosine, sine float64) {
	m, e := 1.0, kc
	p = math.Sqrt(p)
	b /= p
	ca, cb := 1.0, 0.0
	sa, sb := 0.0, 1.0
	for range agmSteps {
		invP, invM := 1/p, 1/m
		f := a
		a += b * invP
		g := e * invP
		b = 2 * (b + f*g)
		p += g
		ratio := e * invM
		f = ca
		ca += cb * invM
		cb = 2 * (cb + f*ratio)
		f = sa
		sa += sb * invM
		sb = 2 * (sb + f*ratio)
		g = m
		m += kc
		if math.Abs(g-kc) <= g*agmTolerance {
			break
		}
		kc = 2 * math.Sqrt(e)
		e = kc * m
	}
	h := 0.5 * math.Pi / m
	third = h * (b + a*m) / (m + p)
	h /= m + m
	return third, h * (cb + ca*m), h * (sb + sa*m)
}
