package transit

import (
	"fmt"
	"math"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
)

// secondsPerDay is exact.
const secondsPerDay = 86400

// Params describe a light curve of one planet.
type Params struct {
	Orbit       orbit.Orbit
	RadiusRatio float64  // radius of the planet, or of its morning half, in stellar radii, ≥ 0
	Evening     float64  // radius of the evening half of a planet of two limbs, see [Halves]; 0 = a round planet
	Terminator  float64  // angle of the morning half from the direction of the X axis, radians; for two limbs
	Law         limb.Law // limb darkening
	Spots       []Spot   // that do not overlap, on a star that is otherwise as the law says; for a round planet
	Exposure    float64  // length of one exposure, seconds; 0 = instantaneous; shorter than half the period
	Companion   float64  // light of other stars in the same measurement, in units of the star's, ≥ 0; it dilutes the transit
	Tolerance   float64  // of the flux, see [Flux]; 0 = [DefaultTolerance]
}

// Arguments names what [CurveGradient] has derivatives by, in their order:
// Period, MidTransit, AxisRatio, Inclination, Eccentricity, Periastron,
// RadiusRatio, the coefficients of the law u1, u2, ..., and Companion; then, with
// two limbs, Evening and Terminator; then Latitude, Longitude, Radius and
// Contrast of each spot, as spot1.Latitude. Angles are in radians and times in
// days.
func (p Params) Arguments() []string {
	names := []string{"Period", "MidTransit", "AxisRatio", "Inclination", "Eccentricity", "Periastron", "RadiusRatio"}
	for i := range p.Law.Coefficients {
		names = append(names, fmt.Sprintf("u%d", i+1))
	}
	names = append(names, "Companion")
	if p.Evening != 0 {
		names = append(names, "Evening", "Terminator")
	}
	for i := range p.Spots {
		for _, name := range []string{"Latitude", "Longitude", "Radius", "Contrast"} {
			names = append(names, fmt.Sprintf("spot%d.%s", i+1, name))
		}
	}
	return names
}

// Validate returns nil for parameters that a curve can be computed with, or an
// error naming the first that is wrong and its valid range.
func (p Params) Validate() error {
	_, err := p.profile()
	return err
}

// profile is Validate with the law prepared.
func (p Params) profile() (profile, error) {
	if err := p.Orbit.Validate(); err != nil {
		return profile{}, fmt.Errorf("transit: %w", err)
	}
	switch {
	case !(p.RadiusRatio >= 0) || math.IsInf(p.RadiusRatio, 1):
		return profile{}, fmt.Errorf("transit: RadiusRatio is %g, must be finite and not negative", p.RadiusRatio)
	case !(p.Evening >= 0) || math.IsInf(p.Evening, 1):
		return profile{}, fmt.Errorf("transit: Evening is %g, must be finite and not negative", p.Evening)
	case p.Terminator-p.Terminator != 0:
		return profile{}, fmt.Errorf("transit: Terminator is %g, must be a finite angle in radians", p.Terminator)
	case p.Evening != 0 && len(p.Spots) > 0:
		return profile{}, fmt.Errorf("transit: %d spots and two limbs (Evening is %g); spots are for a round planet, with Evening 0", len(p.Spots), p.Evening)
	case !(p.Exposure >= 0 && p.Exposure/secondsPerDay < p.Orbit.Period/2):
		return profile{}, fmt.Errorf("transit: Exposure is %g s, must be 0 or more and shorter than half the period of %g days", p.Exposure, p.Orbit.Period)
	case !(p.Companion >= 0) || math.IsInf(p.Companion, 1):
		return profile{}, fmt.Errorf("transit: Companion is %g, must be finite and not negative", p.Companion)
	}
	for i, s := range p.Spots {
		if err := s.check(fmt.Sprintf("spot %d", i+1)); err != nil {
			return profile{}, err
		}
	}
	return newProfile(p.Law, p.Tolerance)
}
