// Package orbit places a planet on its Keplerian orbit and on the sky.
//
// Nouns. The separation z is the distance between the centres of planet and
// star projected on the sky, in stellar radii. Inferior conjunction is where
// the planet is nearest to us in front of the star: there the true anomaly f
// is 90° minus the argument of periastron ω. Mid-transit is the time of
// inferior conjunction; on an eccentric, inclined orbit the separation is
// smallest at a slightly different time. A contact is a time at which the
// discs of planet and star touch, from outside (first, fourth) or from inside
// (second, third).
//
// With r the distance from the star in stellar radii, the planet is at
//
//	X = -r cos(ω+f),  Y = -r sin(ω+f) cos i,  Z = r sin(ω+f) sin i,
//
// Z towards us (Winn 2010, in Exoplanets, ed. Seager, ch. 3). Angles are in
// radians, times in days, lengths in stellar radii.
//
// An [Orbit] holds one set of parameters; [Elements] are others that papers use,
// such as the density of the star, the duration of the transit, the impact
// parameter, or the vector e cos ω, e sin ω. A [Path] is an orbit made ready for
// many times. An [Ephemeris] says when transits come and how well that is known,
// an [Eclipse] when the planet passes behind the star.
package orbit

import (
	"fmt"
	"math"
)

const (
	// gravity is the Newtonian constant G, m3 kg-1 s-2; CODATA 2018, relative
	// standard uncertainty 2.2e-5.
	gravity = 6.67430e-11
	// secondsPerDay is exact.
	secondsPerDay = 86400
	// maxEccentricity is the largest eccentricity for which Kepler's equation
	// is tested to be solved to rounding.
	maxEccentricity = 0.999
)

// Orbit is a Keplerian orbit around a star. The zero value is not valid.
type Orbit struct {
	Period       float64 // days, > 0
	MidTransit   float64 // time of inferior conjunction, days, on the scale of the observation times
	AxisRatio    float64 // semi-major axis over stellar radius, > 1
	Inclination  float64 // radians, 0 to π; π/2 is seen edge-on
	Eccentricity float64 // 0 to 0.999; AxisRatio (1 - Eccentricity) > 1
	Periastron   float64 // argument of periastron of the planet's path, radians; of no effect on a circular orbit
	StarRadius   float64 // solar radii, ≥ 0: for the time that light takes across the orbit; 0 leaves it out
}

// Validate returns nil for an orbit that the rest of this package can handle,
// or an error naming the first field that is wrong and its valid range.
func (o Orbit) Validate() error {
	finite := func(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
	switch {
	case !finite(o.Period) || o.Period <= 0:
		return fmt.Errorf("orbit: Period is %g days, must be finite and above 0", o.Period)
	case !finite(o.MidTransit):
		return fmt.Errorf("orbit: MidTransit is %g, must be a finite time in days", o.MidTransit)
	case !finite(o.AxisRatio) || o.AxisRatio <= 1:
		return fmt.Errorf("orbit: AxisRatio is %g stellar radii, must be finite and above 1", o.AxisRatio)
	case !(o.Inclination >= 0 && o.Inclination <= math.Pi):
		return fmt.Errorf("orbit: Inclination is %g, must be 0 to π radians", o.Inclination)
	case !(o.Eccentricity >= 0 && o.Eccentricity <= maxEccentricity):
		return fmt.Errorf("orbit: Eccentricity is %g, must be 0 to %g", o.Eccentricity, maxEccentricity)
	case !finite(o.Periastron):
		return fmt.Errorf("orbit: Periastron is %g, must be a finite angle in radians", o.Periastron)
	case o.AxisRatio*(1-o.Eccentricity) <= 1:
		return fmt.Errorf("orbit: the planet meets the star at periastron: AxisRatio (1 - Eccentricity) is %g, must be above 1; lower Eccentricity or raise AxisRatio",
			o.AxisRatio*(1-o.Eccentricity))
	case !finite(o.StarRadius) || o.StarRadius < 0:
		return fmt.Errorf("orbit: StarRadius is %g solar radii, must be finite and not negative", o.StarRadius)
	case o.speed() > maxSpeed:
		return fmt.Errorf("orbit: with StarRadius %g solar radii the planet moves at %.3g of the speed of light, must be below %g", o.StarRadius, o.speed(), maxSpeed)
	}
	return nil
}

// Separation returns the separation z at time t, in stellar radii, and whether
// the planet is in front of the star's centre (Z > 0). For many times, prepare
// a [Path] once. The orbit must be valid.
func (o Orbit) Separation(t float64) (z float64, front bool) {
	p := o.Path()
	since, _ := p.Fold(t)
	return p.Separation(since)
}

// SeparationGradient returns what [Orbit.Separation] does, and the derivatives
// of z with respect to (Period, MidTransit, AxisRatio, Inclination,
// Eccentricity, Periastron). z has a corner at z = 0; there all derivatives
// are given as 0, which is right for functions of z².
func (o Orbit) SeparationGradient(t float64) (z float64, front bool, grad [6]float64) {
	p := o.Path()
	since, elapsed := p.Fold(t)
	return p.SeparationGradient(since, elapsed)
}

// ImpactParameter returns the separation at inferior conjunction, in stellar
// radii: a cos i (1-e²)/(1 + e sin ω) (Winn 2010, eq. 7).
func (o Orbit) ImpactParameter() float64 {
	e := o.Eccentricity
	return math.Abs(o.AxisRatio * math.Cos(o.Inclination) * (1 - e) * (1 + e) / (1 + e*math.Sin(o.Periastron)))
}

// StellarDensity returns the mean density of the star, kg m-3, from the orbital
// period in days and the ratio of semi-major axis to stellar radius, both
// above 0, for a planet of negligible mass: 3π a³/(G P²), a in stellar radii
// (Seager & Mallén-Ornelas 2003, ApJ 585, 1038).
func StellarDensity(period, axisRatio float64) float64 {
	seconds := period * secondsPerDay
	return 3 * math.Pi / (gravity * seconds * seconds) * axisRatio * axisRatio * axisRatio
}

// AxisRatio returns the ratio of semi-major axis to stellar radius from the
// orbital period in days and the mean density of the star, kg m-3: the inverse of
// [StellarDensity].
func AxisRatio(period, density float64) float64 {
	seconds := period * secondsPerDay
	return math.Cbrt(gravity * seconds * seconds / (3 * math.Pi) * density)
}
