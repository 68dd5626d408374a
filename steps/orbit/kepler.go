package orbit

import "math"

const (
	// twoPiHigh + twoPiLow is 2π to twice the working precision.
	twoPiHigh = 2 * math.Pi
	twoPiLow  = 2.4492935982947064e-16
	// seriesBelow is the eccentric anomaly below which E - sin E is summed as a
	// series where e is large. There the slope of Kepler's equation is small and
	// would multiply the rounding of sin E; above 1 it does so by 2 at most, and a
	// unit in the last place of E is twice as large. The guess is good to 0.002.
	seriesBelow = 1.01
	// thirdOfBits brings the exponent of a float64 back to its bias after a
	// division of the bits by three, with the fraction shifted so that the
	// relative error of the cube root is at most 0.032, either way.
	thirdOfBits = 0x2a9f780000000000
)

// EccentricAnomaly solves Kepler's equation M = E - e sin E for E, in radians.
// E is in the same revolution as M. Its error is below 2 units in the last place
// for 0 ≤ e ≤ 0.999 and |M| ≤ π; many revolutions away it is that of M. Outside
// 0 ≤ e < 1, or when M is not finite, it returns NaN.
func EccentricAnomaly(meanAnomaly, eccentricity float64) float64 {
	e := eccentricity
	if !(e >= 0 && e < 1) || math.IsNaN(meanAnomaly) || math.IsInf(meanAnomaly, 0) {
		return math.NaN()
	}
	if e == 0 {
		return meanAnomaly
	}
	k := newKepler(e)
	turns := math.Round(meanAnomaly / twoPiHigh)
	if turns == 0 {
		anomaly, _, _ := k.solve(meanAnomaly)
		return anomaly
	}
	reduced := math.FMA(-turns, twoPiHigh, meanAnomaly)
	reduced = math.FMA(-turns, twoPiLow, reduced)
	_, sin, _ := k.solve(reduced)
	return math.FMA(e, sin, meanAnomaly)
}

// kepler is Kepler's equation for one eccentricity, 0 ≤ e < 1.
type kepler struct {
	e, rest            float64 // e and 1-e
	scale, alpha, cube float64 // of the cubic equation of the first guess
	fifth              float64 // coefficient of its correction
}

func newKepler(e float64) kepler {
	scale := 1 / (4*e + 0.5)
	alpha := (1 - e) * scale
	return kepler{e: e, rest: 1 - e, scale: scale, alpha: alpha, cube: alpha * alpha * alpha, fifth: 0.078 / (1 + e)}
}

// solve returns the eccentric anomaly at mean anomaly m, |m| ≤ π or a little
// more, with its sine and cosine.
//
// The first guess is that of Mikkola (1987, Celest. Mech. 40, 329), good to 2
// parts in 1000, with the root of his cubic equation written without
// cancellation. Its residual is computed as if in twice the working precision.
// What it takes to make that vanish is the root δ of
//
//	residual + (1 - e cos E) δ + e (sin E (1 - cos δ) + cos E (δ - sin δ)),
//
// where δ is so small that rounding does not matter any more: a power series of
// fourth order in the Newton step, then one step of Newton's method. Sine and
// cosine follow by the addition theorem.
func (k *kepler) solve(m float64) (anomaly, sin, cos float64) {
	size := math.Abs(m)
	e := k.e

	// s³ + 3α s - 2β = 0 for s = sin(E/3), nearly.
	beta := 0.5 * size * k.scale
	root := roughCbrt(beta + math.Sqrt(beta*beta+k.cube))
	r2 := root * root
	s := 2 * beta * r2 / (r2*(r2+k.alpha) + k.alpha*k.alpha)
	s2 := s * s
	s -= k.fifth * s2 * s2 * s
	guess := size + e*s*(3-4*s*s)

	sin, cos = math.Sincos(guess)
	residual, slope := k.residual(size, guess, sin, cos)
	inverse := 1 / slope
	newton := -residual * inverse
	a2, a3 := 0.5*e*sin*inverse, e*cos*inverse/6
	delta := newton * (1 - newton*(a2-newton*(2*a2*a2-a3-newton*a2*(5*(a2*a2-a3)-1./12))))

	square := delta * delta
	versine := square * (1./2 - square*(1./24-square*(1./720)))     // 1 - cos δ
	excess := delta * square * (1./6 - square*(1./120-square/5040)) // δ - sin δ
	left := (residual + slope*delta) + e*(sin*versine+cos*excess)
	last := -left * inverse * (1 - 2*a2*delta)
	delta += last
	turn := delta - excess // sin δ, nearly

	anomaly = guess + delta
	versine += last * turn
	sin, cos = sin+(cos*turn-sin*versine), cos-(sin*turn+cos*versine)
	if m < 0 {
		return -anomaly, -sin, cos
	}
	return anomaly, sin, cos
}

// residual returns E - e sin E - m for E ≥ 0, given sin E and cos E, and its
// derivative 1 - e cos E. The error of the first is e times that of sin E or, for
// large e and E below seriesBelow, 1e-16 E³; that of the second is relative.
func (k *kepler) residual(m, anomaly, sin, cos float64) (residual, slope float64) {
	e := k.e
	if e >= 0.5 && anomaly < seriesBelow {
		linear := k.rest * anomaly
		low := math.FMA(k.rest, anomaly, -linear)
		return (linear - m) + (e*arcMinusSine(anomaly) + low), k.rest + e*(sin*sin/(1+cos))
	}
	high := anomaly - m
	back := high - anomaly
	low := (anomaly - (high - back)) - (m + back)
	product := e * sin
	productLow := math.FMA(e, sin, -product)
	return (high - product) + (low - productLow), k.rest + e*(1-cos)
}

// arcMinusSine returns x - sin x for 0 ≤ x ≤ 1.1.
func arcMinusSine(x float64) float64 {
	y := x * x
	y2 := y * y
	y4 := y2 * y2
	low := (1./6 - y*(1./120)) + y2*(1./5040-y*(1./362880))
	high := (1./39916800 - y*(1./6227020800)) + y2*(1./1307674368000-y*(1./355687428096000))
	return x * y * (low + y4*(high+y4*(1./121645100408832000)))
}

// roughCbrt returns the cube root of x > 0 with a relative error of 3e-5 or less.
func roughCbrt(x float64) float64 {
	t := math.Float64frombits(math.Float64bits(x)/3 + thirdOfBits)
	cube := t * t * t
	return t * (cube + 2*x) / (2*cube + x) // Halley's method
}
