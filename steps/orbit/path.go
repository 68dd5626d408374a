package orbit

import "math"

// Path is an orbit with everything that does not depend on time worked out,
// for evaluation at many times. Its methods take the time in days since a
// mid-transit, which keeps all digits where a Julian date would lose them.
// Make one with [Orbit.Path]. A path that is nil or the zero value, or that of an
// orbit that is not valid, gives numbers without meaning, most often NaN.
type Path struct {
	period, midTransit, axis float64
	motion                   float64 // mean motion, radians per day
	frequency                float64 // 1/period
	light                    float64 // time that light takes over a stellar radius, days; negative seen from behind
	sinW, cosW, sinI, cosI   float64
	kepler                   kepler
	h, k                     float64 // e cos ω and e sin ω
	m0, sinE0, cosE0         float64 // mean and eccentric anomaly at inferior conjunction
	bend0, beta              float64 // see turnTime
	turning                  turning
	vector                   vector
}

// Path prepares a valid orbit for evaluation at many times.
func (o Orbit) Path() *Path { return o.path(false) }

// path prepares the orbit of the planet around the star or, behind, that of the
// star around the planet, on which eclipses are transits.
func (o Orbit) path(behind bool) *Path {
	e := o.Eccentricity
	p := &Path{
		period: o.Period, midTransit: o.MidTransit, axis: o.AxisRatio, motion: 2 * math.Pi / o.Period, frequency: 1 / o.Period,
		light: o.StarRadius * lightPerRadius, kepler: newKepler(e),
	}
	p.sinW, p.cosW = math.Sincos(o.Periastron)
	p.sinI, p.cosI = math.Sincos(o.Inclination)
	if behind {
		p.sinW, p.cosW, p.light = -p.sinW, -p.cosW, -p.light
	}
	p.h, p.k = e*p.cosW, e*p.sinW
	p.turning = newTurning(e, p.h, p.k)
	p.vector = newVector(&p.turning, p.h, p.k)
	// At conjunction cos f = sin ω and sin f = cos ω.
	minor := p.turning.minor
	anomaly := math.Atan2(minor*p.cosW, e+p.sinW)
	p.sinE0, p.cosE0 = minor*p.cosW/(1+p.k), (e+p.sinW)/(1+p.k)
	p.m0 = anomaly - e*p.sinE0
	p.beta = e / (1 + minor)
	p.bend0 = 2 * math.Atan(p.beta*p.cosW/(1+p.beta*p.sinW))
	return p
}

// nowhere is the path of no orbit.
var nowhere Path

// known returns p, or nowhere for a nil path.
func (p *Path) known() *Path {
	if p == nil {
		return &nowhere
	}
	return p
}

// Fold returns the time since the nearest mid-transit, between -Period/2 and
// Period/2, and the time elapsed since the orbit's MidTransit, both in days.
func (p *Path) Fold(t float64) (since, elapsed float64) {
	p = p.known()
	elapsed = t - p.midTransit
	return math.FMA(-math.Round(elapsed/p.period), p.period, elapsed), elapsed
}

// Separation returns the separation, in stellar radii, the given number of
// days after a mid-transit, and whether the planet is in front.
func (p *Path) Separation(since float64) (z float64, front bool) {
	p = p.known()
	if p.light != 0 {
		since = p.emitted(since)
	}
	s := p.plane(since)
	y := s.v * p.cosI
	return p.axis * math.Sqrt(s.u*s.u+y*y), s.v*p.sinI > 0
}

// SeparationGradient returns what [Path.Separation] does, with the derivatives
// of z listed at [Orbit.SeparationGradient]. elapsed is the time in days since
// the orbit's MidTransit (a whole number of periods more than since), which
// the derivative with respect to the period needs.
func (p *Path) SeparationGradient(since, elapsed float64) (z float64, front bool, grad [6]float64) {
	p = p.known()
	z, front = p.vectorGradient(since, elapsed, &grad)
	byH, byK := grad[4], grad[5]
	grad[4] = p.cosW*byH + p.sinW*byK
	grad[5] = p.kepler.e * (p.cosW*byK - p.sinW*byH)
	return z, front, grad
}

// VectorGradient is [Path.SeparationGradient] with derivatives by e cos ω and
// e sin ω in the place of those by e and ω. They are regular at e = 0, where the
// direction ω is lost; others follow by the chain rule, see [Elements.Jacobian].
func (p *Path) VectorGradient(since, elapsed float64) (z float64, front bool, grad [6]float64) {
	z, front = p.known().vectorGradient(since, elapsed, &grad)
	return z, front, grad
}

// vectorGradient is VectorGradient into zeros.
func (p *Path) vectorGradient(since, elapsed float64, grad *[6]float64) (z float64, front bool) {
	if p.light != 0 {
		place, slopes := p.SkyGradient(since, elapsed)
		z = math.Sqrt(place[0]*place[0] + place[1]*place[1])
		if z > 0 {
			x, y := place[0]/z, place[1]/z
			for k := range grad {
				grad[k] = x*slopes[0][k] + y*slopes[1][k]
			}
		}
		return z, place[2] > 0
	}
	s := p.plane(since)
	y := s.v * p.cosI
	distance := math.Sqrt(s.u*s.u + y*y)
	z, front = p.axis*distance, s.v*p.sinI > 0
	if distance == 0 {
		return z, front
	}
	scale := p.axis / distance
	byU, byV := scale*s.u, scale*y*p.cosI
	byM := (byU*s.uE + byV*s.vE) * s.inverse
	grad[1] = -byM * p.motion
	grad[0] = grad[1] * elapsed * p.frequency
	grad[2] = distance
	grad[3] = -scale * y * s.v * p.sinI
	w := p.vector.at(s.sin, s.versine)
	grad[4] = byM*w.mH + byU*w.uH + byV*w.vH
	grad[5] = byM*w.mK + byU*w.uK + byV*w.vK
	return z, front
}

// Window returns a span of time around mid-transit, in days since it, outside
// of which the planet, when in front, is at least limit stellar radii from the
// star's centre. The span is generous on eccentric orbits. When no such span
// shorter than the orbit can be told cheaply it is infinite.
func (p *Path) Window(limit float64) (from, to float64) {
	p = p.known()
	sin := limit / (p.axis * p.kepler.rest) // |X| ≥ a (1-e) |cos(ω+f)|
	if sin < 1 {
		angle := math.Asin(sin)
		from, to = p.timeAt(-angle), p.timeAt(angle)
		// Widen by far more than rounding.
		margin := 1e-9 * p.period
		from, to = from-margin, to+margin
		if from > -p.period/2 && to < p.period/2 {
			return from, to
		}
	}
	return math.Inf(-1), math.Inf(1)
}

// timeAt returns the time in days since conjunction, as seen by us, at which the
// planet has turned around the star by the given angle (of true anomaly) from
// conjunction, -π to π.
func (p *Path) timeAt(angle float64) float64 {
	t := p.turnTime(angle)
	if p.light != 0 {
		t -= p.light * (p.axis*p.sinI*p.distance(angle)*math.Cos(angle) - p.depth0())
	}
	return t
}

// turnTime is timeAt without the time that light takes.
func (p *Path) turnTime(angle float64) float64 {
	sin, cos := math.Sincos(angle)
	cosF := p.sinW*cos - p.cosW*sin
	sinF := p.cosW*cos + p.sinW*sin
	// E = f - 2 atan(β sin f/(1+β cos f)) is continuous in f.
	bend := 2 * math.Atan(p.beta*sinF/(1+p.beta*cosF))
	e := p.kepler.e
	sinE := p.turning.minor * sinF / (1 + e*cosF)
	return (angle - (bend - p.bend0) - e*(sinE-p.sinE0)) / p.motion
}

// distance returns the distance from the star, in semi-major axes, after the
// given turn from conjunction.
func (p *Path) distance(angle float64) float64 {
	sin, cos := math.Sincos(angle)
	return p.kepler.rest * (1 + p.kepler.e) / (1 + p.kepler.e*(p.sinW*cos-p.cosW*sin))
}
