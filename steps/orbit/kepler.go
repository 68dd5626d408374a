package orbit

import "math"

const (
	// twoPiHigh + twoPiLow is 2π to twice the working precision.
	twoPiHigh = 2 * math.Pi
	twoPiLow  = 2.4492935982947064e-16
	// keplerStep is the relative change of E below which one more step of third
	// order leaves nothing but rounding: its cube is below 1e-18.
	keplerStep = 1e-6
	// keplerSteps bounds the loop; two or three steps are usual.
	keplerSteps = 12
)

// EccentricAnomaly solves Kepler's equation M = E - e sin E for E, in radians.
// E is in the same revolution as M. Its error is a few units in the last place
// for 0 ≤ e ≤ 0.999 and |M| below 1e6; larger |M| lose the digits that the
// revolutions take. Outside 0 ≤ e < 1, or when M is not finite, it returns
// NaN. The first guess is that of Mikkola (1987, Celest. Mech. 40, 329),
// refined by Halley's method on a form of the equation that does not cancel
// for small E and e near 1.
func EccentricAnomaly(meanAnomaly, eccentricity float64) float64 {
	e := eccentricity
	if !(e >= 0 && e < 1) || math.IsNaN(meanAnomaly) || math.IsInf(meanAnomaly, 0) {
		return math.NaN()
	}
	if e == 0 {
		return meanAnomaly
	}
	turns := math.Round(meanAnomaly / twoPiHigh)
	if turns == 0 {
		return solveKepler(meanAnomaly, e)
	}
	reduced := math.FMA(-turns, twoPiHigh, meanAnomaly)
	reduced = math.FMA(-turns, twoPiLow, reduced)
	return meanAnomaly + e*math.Sin(solveKepler(reduced, e))
}

// solveKepler is [EccentricAnomaly] for |m| ≤ π and 0 < e < 1.
func solveKepler(m, e float64) float64 {
	if m == 0 {
		return 0
	}
	if m < 0 {
		return -solveKepler(-m, e)
	}
	scale := 1 / (4*e + 0.5)
	alpha := (1 - e) * scale
	beta := 0.5 * m * scale
	root := math.Cbrt(beta + math.Sqrt(beta*beta+alpha*alpha*alpha))
	s := root - alpha/root
	s2 := s * s
	s -= 0.078 * s2 * s2 * s / (1 + e)
	anomaly := m + e*s*(3-4*s*s)
	for range keplerSteps {
		sin, cos := math.Sincos(anomaly)
		residual := (1-e)*anomaly + e*arcMinusSine(anomaly, sin) - m
		slope := 1 - e*cos
		step := residual / slope
		step = residual / (slope - 0.5*step*e*sin)
		anomaly -= step
		if math.Abs(step) <= keplerStep*anomaly {
			break
		}
	}
	return anomaly
}

// arcMinusSine returns x - sin x, given sin x, without cancellation for small
// x ≥ 0.
func arcMinusSine(x, sin float64) float64 {
	if x > 1 {
		return x - sin
	}
	y := x * x
	return x * y / 6 * (1 - y/20*(1-y/42*(1-y/72*(1-y/110*(1-y/156*(1-y/210*(1-y/272)))))))
}
