package orbit

import "math"

const (
	// solarRadius is the nominal solar radius of the IAU (2015, resolution B3), m;
	// exact.
	solarRadius = 6.957e8
	// lightSpeed is exact, m/s.
	lightSpeed = 299792458
	// lightPerRadius is the time that light takes over a solar radius, days.
	lightPerRadius = solarRadius / (lightSpeed * secondsPerDay)
	// maxSpeed bounds the speed of a planet, in that of light. Above, times of
	// light travel are not all that matters.
	maxSpeed = 0.1
	// lightSteps bounds the search for a time of emission; three or four steps are
	// usual.
	lightSteps = 20
)

// depth0 returns Z at inferior conjunction, in stellar radii.
func (p *Path) depth0() float64 { return p.axis * p.turning.near * p.sinI }

// emitted returns when light that we see at the given time since mid-transit
// passed the planet or left it, in days since mid-transit on the clock of light
// that passed it at inferior conjunction. It is the root of
// emitted = since + light (Z(emitted) - Z(0)).
func (p *Path) emitted(since float64) float64 {
	start := p.depth0()
	at := since
	for range lightSteps {
		s := p.plane(at)
		rate := p.axis * p.sinI * s.vE * s.inverse * p.motion
		step := (at - since - p.light*(p.axis*p.sinI*s.v-start)) / (1 - p.light*rate)
		at -= step
		if !(math.Abs(step) > 1e-9*p.period) { // the next would be rounding
			break
		}
	}
	return at
}

// speed returns the speed of the planet at periastron in that of light.
func (o Orbit) speed() float64 {
	e := o.Eccentricity
	return o.StarRadius * lightPerRadius * o.AxisRatio * 2 * math.Pi / o.Period * math.Sqrt((1+e)/(1-e))
}
