package orbit

import "math"

// plane is the state of the planet in the plane of its orbit, in semi-major
// axes: u is to the left as we see it and 0 at conjunction, v is towards us.
type plane struct {
	u, v         float64
	uE, vE       float64 // derivatives by the eccentric anomaly
	inverse      float64 // 1 / (1 - e cos E)
	sin, versine float64 // sine, and 1 - cosine, of the turn of E since conjunction
}

// plane returns the state at a time in days since mid-transit, without the time
// that light takes.
func (p *Path) plane(since float64) plane {
	m := p.motion * since
	t := &p.turning
	if math.Abs(m) < t.small {
		sin, versine := t.solve(m)
		return t.plane(sin, versine)
	}
	e := p.kepler.e
	if e == 0 {
		sin, cos := math.Sincos(m)
		versine := 1 - cos
		if cos > 0 {
			versine = sin * sin / (1 + cos)
		}
		return plane{u: -sin, v: cos, uE: -cos, vE: -sin, inverse: 1, sin: sin, versine: versine}
	}
	m += p.m0
	if math.Abs(m) > math.Pi {
		m = math.Remainder(m, 2*math.Pi)
	}
	_, sin, cos := p.kepler.solve(m)
	versine := 1 - cos
	if cos > 0.5 {
		versine = sin * sin / (1 + cos)
	}
	along, across := p.kepler.rest-versine, t.minor*sin
	return plane{
		u: along*p.cosW - across*p.sinW, v: along*p.sinW + across*p.cosW,
		uE: -sin*p.cosW - t.minor*cos*p.sinW, vE: t.minor*cos*p.cosW - sin*p.sinW,
		inverse: 1 / (p.kepler.rest + e*versine),
		sin:     sin*p.cosE0 - cos*p.sinE0, versine: 1 - (cos*p.cosE0 + sin*p.sinE0),
	}
}

// Sky returns the place of the planet the given number of days after a
// mid-transit, in stellar radii: X, Y and Z as in the package's comment.
func (p *Path) Sky(since float64) (x, y, z float64) {
	p = p.known()
	if p.light != 0 {
		since = p.emitted(since)
	}
	s := p.plane(since)
	return -p.axis * s.u, -p.axis * s.v * p.cosI, p.axis * s.v * p.sinI
}

// SkyGradient returns the place (X, Y, Z) of [Path.Sky] and its derivatives, a row
// for each, by (Period, MidTransit, AxisRatio, Inclination, e cos ω, e sin ω);
// see [Path.SeparationGradient] for elapsed and [Path.VectorGradient] for the
// last two.
func (p *Path) SkyGradient(since, elapsed float64) (place [3]float64, grad [3][6]float64) {
	p = p.known()
	at := since
	if p.light != 0 {
		at = p.emitted(since)
	}
	s := p.plane(at)
	uM, vM := s.uE*s.inverse, s.vE*s.inverse
	w := p.vector.at(s.sin, s.versine)
	uH, uK := uM*w.mH+w.uH, uM*w.mK+w.uK
	vH, vK := vM*w.mH+w.vH, vM*w.mK+w.vK
	uT, vT := uM*p.motion, vM*p.motion
	// The place at the time of emission: with that held, then through it.
	a, sin, cos := p.axis, p.sinI, p.cosI
	place = [3]float64{-a * s.u, -a * s.v * cos, a * s.v * sin}
	rate := [3]float64{-a * uT, -a * vT * cos, a * vT * sin}
	grad[0] = [6]float64{2: -s.u, 4: -a * uH, 5: -a * uK}
	grad[1] = [6]float64{2: -s.v * cos, 3: a * s.v * sin, 4: -a * vH * cos, 5: -a * vK * cos}
	grad[2] = [6]float64{2: s.v * sin, 3: a * s.v * cos, 4: a * vH * sin, 5: a * vK * sin}
	through := [6]float64{(since - elapsed) / p.period, -1} // of the time of emission
	if p.light != 0 {
		near := p.turning.near
		start := [6]float64{2: near * sin, 3: a * near * cos, 4: a * p.vector.nearH * sin, 5: a * p.vector.nearK * sin}
		through[0] -= p.light * rate[2] * at / p.period
		for k := range through {
			if k > 0 {
				through[k] += p.light * (grad[2][k] - start[k])
			}
			through[k] /= 1 - p.light*rate[2]
		}
	}
	through[0] -= at / p.period
	for i := range grad {
		for k := range through {
			grad[i][k] += rate[i] * through[k]
		}
	}
	return place, grad
}
