package orbit

import "math"

// Path is an orbit with everything that does not depend on time worked out,
// for evaluation at many times. Its methods take the time in days since a
// mid-transit, which keeps all digits where a Julian date would lose them.
// Make one with [Orbit.Path]. A path that is nil or the zero value, or that of an
// orbit that is not valid, gives numbers without meaning, most often NaN.
type Path struct {
	period, midTransit, axis, e float64
	motion                      float64 // mean motion, radians per day
	minor                       float64 // √(1-e²)
	sinW, cosW, sinI, cosI      float64
	m0                          float64 // mean anomaly at inferior conjunction
	m0E, m0W                    float64 // its derivatives by eccentricity and periastron
	sinE0, bend0                float64 // sin E and atan term at conjunction, see timeAt
	beta                        float64 // e / (1 + √(1-e²))
}

// Path prepares a valid orbit for evaluation at many times.
func (o Orbit) Path() *Path {
	p := &Path{period: o.Period, midTransit: o.MidTransit, axis: o.AxisRatio, e: o.Eccentricity}
	e := p.e
	p.motion = 2 * math.Pi / o.Period
	p.minor = math.Sqrt((1 - e) * (1 + e))
	p.beta = e / (1 + p.minor)
	p.sinW, p.cosW = math.Sincos(o.Periastron)
	p.sinI = math.Sin(o.Inclination)
	p.cosI = math.Cos(o.Inclination)
	// At conjunction cos f = sin ω and sin f = cos ω.
	anomaly := math.Atan2(p.minor*p.cosW, e+p.sinW)
	p.sinE0 = math.Sin(anomaly)
	p.bend0 = 2 * math.Atan(p.beta*p.cosW/(1+p.beta*p.sinW))
	p.m0 = anomaly - e*p.sinE0
	ratio := p.minor / (1 + e*p.sinW)
	p.m0W = -p.minor * ratio * ratio
	p.m0E = -p.sinE0 * (1 + (1-e*math.Cos(anomaly))/(p.minor*p.minor))
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
	sin, cos := math.Sincos(EccentricAnomaly(p.m0+p.motion*since, p.e))
	along, across := p.axis*(cos-p.e), p.axis*p.minor*sin
	x := across*p.sinW - along*p.cosW
	depth := along*p.sinW + across*p.cosW // r sin(ω+f)
	y := depth * p.cosI
	return math.Sqrt(x*x + y*y), depth*p.sinI > 0
}

// SeparationGradient returns what [Path.Separation] does, with the derivatives
// of z listed at [Orbit.SeparationGradient]. elapsed is the time in days since
// the orbit's MidTransit (a whole number of periods more than since), which
// the derivative with respect to the period needs.
func (p *Path) SeparationGradient(since, elapsed float64) (z float64, front bool, grad [6]float64) {
	p = p.known()
	sin, cos := math.Sincos(EccentricAnomaly(p.m0+p.motion*since, p.e))
	along, across := p.axis*(cos-p.e), p.axis*p.minor*sin
	x := across*p.sinW - along*p.cosW
	depth := along*p.sinW + across*p.cosW
	y := depth * p.cosI
	z = math.Sqrt(x*x + y*y)
	front = depth*p.sinI > 0
	if z == 0 {
		return z, front, grad
	}
	ux, uy := x/z, y/z
	ud := uy * p.cosI // dz by depth
	// Derivatives by E, then everything that acts through E.
	alongE, acrossE := -p.axis*sin, p.axis*p.minor*cos
	byE := ux*(acrossE*p.sinW-alongE*p.cosW) + ud*(alongE*p.sinW+acrossE*p.cosW)
	byM := byE / (1 - p.e*cos)
	grad[1] = -byM * p.motion
	grad[0] = grad[1] * elapsed / p.period
	grad[2] = z / p.axis
	grad[3] = -uy * depth * p.sinI
	acrossEcc := -p.axis * p.e / p.minor * sin
	grad[4] = byM*(sin+p.m0E) +
		ux*(acrossEcc*p.sinW+p.axis*p.cosW) + ud*(acrossEcc*p.cosW-p.axis*p.sinW)
	grad[5] = byM*p.m0W + ux*depth - ud*x
	return z, front, grad
}

// Window returns a span of time around mid-transit, in days since it, outside
// of which the planet, when in front, is at least limit stellar radii from the
// star's centre. The span is generous on eccentric orbits. When no such span
// shorter than the orbit can be told cheaply it is infinite.
func (p *Path) Window(limit float64) (from, to float64) {
	p = p.known()
	sin := limit / (p.axis * (1 - p.e)) // |X| ≥ a (1-e) |cos(ω+f)|
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

// timeAt returns the time in days since conjunction at which the planet has
// turned around the star by the given angle (of true anomaly) from
// conjunction, -π to π.
func (p *Path) timeAt(angle float64) float64 {
	sin, cos := math.Sincos(angle)
	cosF := p.sinW*cos - p.cosW*sin
	sinF := p.cosW*cos + p.sinW*sin
	// E = f - 2 atan(β sin f/(1+β cos f)) is continuous in f.
	bend := 2 * math.Atan(p.beta*sinF/(1+p.beta*cosF))
	sinE := p.minor * sinF / (1 + p.e*cosF)
	return (angle - (bend - p.bend0) - p.e*(sinE-p.sinE0)) / p.motion
}

// separationAt returns the squared separation after the given turn from
// conjunction.
func (p *Path) separationAt(angle float64) float64 {
	sin, cos := math.Sincos(angle)
	r := p.axis * p.minor * p.minor / (1 + p.e*(p.sinW*cos-p.cosW*sin))
	y := cos * p.cosI
	return r * r * (sin*sin + y*y)
}
