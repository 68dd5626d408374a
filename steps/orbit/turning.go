package orbit

import "math"

const (
	// widest is the turn of the eccentric anomaly from conjunction up to which the
	// series of turning.sine hold.
	widest = 0.3
	// steepest bounds the ratio of neighbouring terms of the series that
	// turning.solve starts from.
	steepest = 0.12
	// turningStep is the relative change of a turn below which a step of third
	// order leaves nothing but rounding.
	turningStep = 1e-5
	// turningSteps bounds their number; one or two are usual.
	turningSteps = 8
)

// turning describes an orbit as seen from inferior conjunction. With
// h = e cos ω, k = e sin ω and E0 the eccentric anomaly there, the turn
// δ = E - E0 obeys
//
//	near δ + A (1 - cos δ) + B (δ - sin δ) = n t,
//
// where t is the time since conjunction and near the distance there, and the
// planet is at
//
//	u = -(√(1-e²) sin δ + h (1 - cos δ)),
//	v = near + A sin δ - (near + k) (1 - cos δ).
//
// Nothing cancels for small δ: places, and their derivatives, are as good in
// relation to the distance from conjunction as the time is.
type turning struct {
	minor   float64 // √(1-e²)
	near    float64 // 1 - e cos E0 = (1-e²)/(1+k)
	a, b    float64 // e sin E0 and e cos E0
	h, k    float64
	inverse float64 // 1/near
	small   float64 // mean anomaly since conjunction below which solve works
	c       [4]float64
}

func newTurning(e, h, k float64) turning {
	t := turning{h: h, k: k, minor: math.Sqrt((1 - e) * (1 + e))}
	t.near = (1 - e) * (1 + e) / (1 + k)
	t.a, t.b = t.minor*h/(1+k), (e*e+k)/(1+k)
	t.inverse = 1 / t.near
	// Taylor coefficients of the equation over near, then of its inverse.
	a2, a3 := t.a*t.inverse/2, t.b*t.inverse/6
	a4, a5 := -a2/12, -a3/20
	t.c = [4]float64{a2, 2*a2*a2 - a3, 5*a2*(a2*a2-a3) + a4, 14*a2*a2*a2*a2 - 21*a2*a2*a3 + 6*a2*a4 + 3*a3*a3 - a5}
	if e > 0 {
		t.small = t.near * math.Min(0.8*widest, steepest/math.Max(math.Abs(a2), math.Sqrt(math.Abs(a3))))
	}
	return t
}

// solve returns sin δ and 1 - cos δ at the mean anomaly m since conjunction,
// |m| < small.
func (t *turning) solve(m float64) (sin, versine float64) {
	x := m * t.inverse
	turn := x * (1 - x*(t.c[0]-x*(t.c[1]-x*(t.c[2]-x*t.c[3]))))
	for range turningSteps {
		square := turn * turn
		versine = square * (1./2 - square*(1./24-square*(1./720-square*(1./40320-square/3628800))))
		excess := turn * square * (1./6 - square*(1./120-square*(1./5040-square*(1./362880-square/39916800))))
		sin = turn - excess
		cos := 1 - versine
		inverse := 1 / (t.near + (t.a*sin + t.b*versine))
		newton := ((m - t.near*turn) - (t.a*versine + t.b*excess)) * inverse
		step := newton * (1 - newton*0.5*(t.a*cos+t.b*sin)*inverse)
		versine += step * (sin + 0.5*step*cos)
		sin += step * (cos - 0.5*step*sin)
		if !(math.Abs(step) > turningStep*math.Abs(turn)) {
			break
		}
		turn += step
	}
	return sin, versine
}

// plane returns the state after a turn with the given sine and 1 - cosine.
func (t *turning) plane(sin, versine float64) plane {
	cos := 1 - versine
	return plane{
		u: -(t.minor*sin + t.h*versine), v: t.near + (t.a*sin - (t.near+t.k)*versine),
		uE: -(t.minor*cos + t.h*sin), vE: t.a*cos - (t.near+t.k)*sin,
		inverse: 1 / (t.near + (t.a*sin + t.b*versine)),
		sin:     sin, versine: versine,
	}
}

// vector holds the derivatives of what a turning is made of by h = e cos ω and
// k = e sin ω; those of b are the opposite of those of near.
type vector struct {
	minorH, minorK, nearH, nearK, aH, aK float64
}

func newVector(t *turning, h, k float64) vector {
	w := vector{minorH: -h / t.minor, minorK: -k / t.minor, nearH: -2 * h / (1 + k), nearK: -(2*k + t.near) / (1 + k)}
	w.aH = (w.minorH*h + t.minor) / (1 + k)
	w.aK = (w.minorK*h - t.a) / (1 + k)
	return w
}

// slopes are derivatives by h and k: of the place with δ held, and of the mean
// anomaly that δ then takes (with the opposite sign), through which they act on δ.
type slopes struct {
	uH, uK, vH, vK, mH, mK float64
}

// at returns the derivatives after a turn with the given sine and 1 - cosine.
func (w *vector) at(sin, versine float64) slopes {
	return slopes{
		uH: -(w.minorH*sin + versine), uK: -w.minorK * sin,
		vH: w.nearH*(1-versine) + w.aH*sin, vK: w.nearK*(1-versine) + w.aK*sin - versine,
		mH: -(w.nearH*sin + w.aH*versine), mK: -(w.nearK*sin + w.aK*versine),
	}
}
