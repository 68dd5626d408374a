package fit

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"rimlight/steps/limb"
	"rimlight/steps/limbtable"
	"rimlight/steps/nearest"
	"rimlight/steps/systematics"
)

// Limb-darkening laws of [Setup]: those of package limb with up to two
// coefficients.
const (
	LawUniform     = limb.Uniform
	LawLinear      = limb.Linear
	LawQuadratic   = limb.Quadratic
	LawSquareRoot  = limb.SquareRoot
	LawLogarithmic = limb.Logarithmic
	LawPower2      = limb.Power2
)

// laws lists them.
func laws() []string {
	return []string{LawUniform, LawLinear, LawQuadratic, LawSquareRoot, LawLogarithmic, LawPower2}
}

// Policies for limb darkening of [Setup].
const (
	PolicyFree  = "free"  // fitted, under the rows of the priors table
	PolicyFixed = "fixed" // held at the values of the limb-darkening table
	PolicyPrior = "prior" // fitted, with normal priors about the table's values of its errors
)

// A Setup is what the settings of a recipe say about a fit: start values of the
// parameters (and the values of those that no priors table names), and choices.
type Setup struct {
	Period       float64 // d, above 0
	MidTransit   float64 // BJD_TDB, d; a guess good to 0.01 d
	AxisRatio    float64 // semi-major axis over stellar radius, above 1
	Inclination  float64 // deg, above 0 up to 90; more than 90 is mirrored
	Eccentricity float64 // from 0, below 1
	Periastron   float64 // argument of periastron of the planet's path, deg
	RadiusRatio  float64 // planet radius over stellar radius, a start value, above 0
	Exposure     float64 // of one integration, s; 0 for an instantaneous one

	LimbLaw    string          // "quadratic" (also when empty) or another law of up to two coefficients
	LimbPolicy string          // "free" (also when empty), "fixed" or "prior"
	Limb       limbtable.Table // for the policies "fixed" and "prior"

	Trend   systematics.Trend // the systematics
	Inflate bool              // multiply the errors by the root of the reduced chi-square where that is above 1, and fit again
}

// check fills in defaults and reports settings outside their range. what names
// the caller.
func (s *Setup) check(what string) error {
	if s.LimbLaw == "" {
		s.LimbLaw = LawQuadratic
	}
	if s.LimbPolicy == "" {
		s.LimbPolicy = PolicyFree
	}
	if !slices.Contains(laws(), s.LimbLaw) {
		return fmt.Errorf("%s: limb-darkening law %.40q; expected one of %s%s", what, s.LimbLaw, strings.Join(laws(), ", "), nearest.Hint(s.LimbLaw, laws()))
	}
	if p := s.LimbPolicy; p != PolicyFree && p != PolicyFixed && p != PolicyPrior {
		return fmt.Errorf("%s: limb-darkening policy %.40q; expected free, fixed or prior", what, p)
	}
	settling := s.Trend.SettlingTime
	if !s.Trend.Settling {
		settling = 1 // not used
	}
	for _, c := range []struct {
		name  string
		value float64
		ok    bool
		want  string
	}{
		{"period", s.Period, s.Period > 0, "days above 0"},
		{"midTransit", s.MidTransit, true, "a time in days"},
		{"axisRatio", s.AxisRatio, s.AxisRatio > 1, "a number above 1"},
		{"inclination", s.Inclination, s.Inclination > 0 && s.Inclination < 180, "degrees between 0 and 180"},
		{"eccentricity", s.Eccentricity, s.Eccentricity >= 0 && s.Eccentricity <= maxEccentricity, "a number from 0 to 0.95"},
		{"periastron", s.Periastron, true, "degrees"},
		{"radiusRatio", s.RadiusRatio, s.RadiusRatio > 0 && s.RadiusRatio <= maxRadiusRatio, "a number above 0, up to 1"},
		{"settlingTime", settling, settling >= leastSettling && settling <= mostSettling, "days above 0, for example 0.01"},
		{"exposure", s.Exposure, s.Exposure >= 0, "seconds from 0 up"},
	} {
		if !c.ok || math.IsInf(c.value, 0) || math.IsNaN(c.value) {
			return fmt.Errorf("%s: %s is %g; expected %s", what, c.name, c.value, c.want)
		}
	}
	return nil
}
