package orbit

import "math"

// EccentricAnomaly solves Kepler's equation E - e sin E = M for E, given the
// mean anomaly M in radians, any finite number, and the eccentricity, 0 to
// [MaxEccentricity]. E is in the same revolution as M. The relative error is a
// few units in the last place, also near periastron of a very eccentric orbit.
// Outside these ranges the result is NaN.
func EccentricAnomaly(meanAnomaly, eccentricity float64) float64 {
	if !(eccentricity >= 0 && eccentricity <= MaxEccentricity) || math.IsInf(meanAnomaly, 0) {
		return math.NaN()
	}
	// 2 pi is turn plus turnLow; without the second part, subtracting many
	// turns would cost accuracy.
	turns := math.RoundToEven(meanAnomaly / turn)
	m := math.FMA(-turns, turn, meanAnomaly) - turns*turnLow
	e, _, _ := kepler(m, eccentricity)
	return math.FMA(turns, turn, e+turns*turnLow)
}

const (
	turn    = 2 * math.Pi               // rounded to float64 where it is used
	turnLow = 2.4492935982947064e-16    // 2 pi less its float64 value
	maxStep = 20                        // iterations; 2 to 4 are needed
	settled = 4 * 2.220446049250313e-16 // relative step at which the iteration ends, 4 units in the last place
)

// kepler solves Kepler's equation for a mean anomaly within [-pi, pi], and
// returns the eccentric anomaly with its sine and cosine.
//
// The start is the solution of a cubic (Markley 1995, Celest. Mech. Dyn. Astron.
// 63, 101; coefficients from memory, which only costs iterations if wrong),
// improved by Householder's method of third order. On [0, pi] the equation's
// left side is convex and increasing, so that every start within converges.
func kepler(m, e float64) (ecc, sin, cos float64) {
	if m == 0 || e == 0 {
		sin, cos = math.Sincos(m)
		return m, sin, cos
	}
	target := math.Abs(m)
	x := keplerStart(target, e)
	for range maxStep {
		sin, cos = math.Sincos(x)
		// x - e sin x, less the mean anomaly, without cancellation for small x
		excess := (1-e)*x + e*sineDefect(x, sin) - target
		f1, f2, f3 := 1-e*cos, e*sin, e*cos
		if x < 0.1 {
			half := math.Sin(x / 2)
			f1 = (1 - e) + 2*e*half*half
		}
		step := -excess / f1
		step = -excess / (f1 + step*f2/2)
		step = -excess / (f1 + step*(f2/2+step*f3/6))
		next := min(max(x+step, 0), math.Pi)
		done := math.Abs(next-x) <= settled*x
		x = next
		if done || math.Abs(step) < 1e-4*x*f1 {
			// The next step would be below rounding: the method is of fourth
			// order.
			break
		}
	}
	sin, cos = math.Sincos(x)
	return math.Copysign(x, m), math.Copysign(sin, m), cos
}

// keplerStart gives a start value for m in [0, pi].
func keplerStart(m, e float64) float64 {
	alpha := (3*math.Pi*math.Pi + 1.6*math.Pi*(math.Pi-m)/(1+e)) / (math.Pi*math.Pi - 6)
	d := 3*(1-e) + alpha*e
	q := 2*alpha*d*(1-e) - m*m
	r := 3*alpha*d*(d-1+e)*m + m*m*m
	w := math.Cbrt(r + math.Sqrt(q*q*q+r*r))
	w *= w
	x := (2*r*w/(w*w+w*q+q*q) + m) / d
	if !(x > 0 && x <= math.Pi) {
		return m
	}
	return x
}

// sineDefect is x - sin x, without cancellation for small x.
func sineDefect(x, sin float64) float64 {
	if x > 0.5 {
		return x - sin
	}
	// The alternating series x^3/3! - x^5/5! + ...; the first term left out is
	// below 1e-19 of the sum.
	y := x * x
	return x * y / 6 * (1 - y/20*(1-y/42*(1-y/72*(1-y/110*(1-y/156*(1-y/210*(1-y/272)))))))
}
