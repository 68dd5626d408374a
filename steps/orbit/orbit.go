package orbit

import (
	"fmt"
	"math"
)

// MaxEccentricity is the largest eccentricity of an orbit.
const MaxEccentricity = 0.999

// An Orbit is a Keplerian orbit. Angles are in radians.
type Orbit struct {
	Period       float64 // d, above 0
	MidTransit   float64 // time of inferior conjunction, in the days of the times asked for (BJD_TDB)
	AxisRatio    float64 // semi-major axis in stellar radii, 1 or more
	Inclination  float64 // rad, 0 to pi; pi/2 is edge-on
	Eccentricity float64 // 0 to MaxEccentricity
	Periastron   float64 // argument of periastron of the star's orbit, rad; without effect on a circular orbit
}

// Validate checks that every field of the orbit is in its range.
func (o Orbit) Validate() error {
	finite := func(x float64) bool { return math.Abs(x) <= math.MaxFloat64 }
	switch {
	case !(o.Period > 0 && finite(o.Period)):
		return fmt.Errorf("orbit: period is %g d; expected a number above 0", o.Period)
	case !finite(o.MidTransit):
		return fmt.Errorf("orbit: mid-transit time is %g; expected a number of days", o.MidTransit)
	case !(o.AxisRatio >= 1 && finite(o.AxisRatio)):
		return fmt.Errorf("orbit: semi-major axis is %g stellar radii; expected 1 or more", o.AxisRatio)
	case !(o.Inclination >= 0 && o.Inclination <= math.Pi):
		return fmt.Errorf("orbit: inclination is %g rad; expected 0 to pi (90 deg is %.6g rad)", o.Inclination, math.Pi/2)
	case !(o.Eccentricity >= 0 && o.Eccentricity <= MaxEccentricity):
		return fmt.Errorf("orbit: eccentricity is %g; expected 0 to %g", o.Eccentricity, MaxEccentricity)
	case !finite(o.Periastron):
		return fmt.Errorf("orbit: argument of periastron is %g rad; expected a number", o.Periastron)
	}
	return nil
}

// Separation returns the distance of planet and star on the sky at time t, in
// stellar radii, and whether the planet is in front of the star's plane. It is
// NaN for an orbit that [Orbit.Validate] refuses.
func (o Orbit) Separation(t float64) (z float64, front bool) {
	k := o.Track()
	return k.Separation(t)
}

// SeparationGradient also returns the derivatives of the separation in Period,
// MidTransit, AxisRatio, Inclination, Eccentricity and Periastron, per day and
// radian where the argument has that unit. Where the separation is zero it has
// a kink, and the derivatives are zero.
func (o Orbit) SeparationGradient(t float64) (z float64, front bool, grad [6]float64) {
	k := o.Track()
	return k.SeparationGradient(t)
}

// ImpactParameter is the separation at mid-transit,
//
//	b = a/R |cos i| (1-e^2)/(1+e sin w)
//
// (Winn 2010, Exoplanets, ed. Seager, eq. 7; the equation's number is from
// memory). It is NaN for an orbit that [Orbit.Validate] refuses.
func (o Orbit) ImpactParameter() float64 {
	if o.Validate() != nil {
		return math.NaN()
	}
	e := o.Eccentricity
	return o.AxisRatio * math.Abs(math.Cos(o.Inclination)) * (1 - e) * (1 + e) / (1 + e*math.Sin(o.Periastron))
}

const (
	// gravitational is the constant of gravitation, 6.67430(15)e-11 m3 kg-1 s-2
	// (CODATA 2018; the same in CODATA 2022).
	gravitational = 6.67430e-11
	secondsPerDay = 86400
)

// StellarDensity is the mean density of the star in kg m-3 that follows from
// Kepler's third law for a planet of negligible mass, given the period in days
// and the semi-major axis in stellar radii:
//
//	rho = 3 pi (a/R)^3 / (G P^2)
//
// (Seager & Mallen-Ornelas 2003, ApJ 585, 1038). The constant of gravitation
// limits it to a relative accuracy of 2e-5.
func StellarDensity(period, axisRatio float64) float64 {
	p := period * secondsPerDay
	return 3 * math.Pi * axisRatio * axisRatio * axisRatio / (gravitational * p * p)
}
