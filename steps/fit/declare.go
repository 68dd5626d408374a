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

// Limb-darkening laws of a [Model]: those of package limb.
const (
	LawUniform        = limb.Uniform
	LawLinear         = limb.Linear
	LawQuadratic      = limb.Quadratic
	LawSquareRoot     = limb.SquareRoot
	LawLogarithmic    = limb.Logarithmic
	LawPower2         = limb.Power2
	LawThreeParameter = limb.ThreeParameter
	LawFourParameter  = limb.FourParameter
)

// Policies for limb darkening of a [Model].
const (
	PolicyFree  = "free"  // fitted, under the rows of the priors table
	PolicyFixed = "fixed" // held at the values of the limb-darkening table
	PolicyPrior = "prior" // fitted, with normal priors about the table's values of its errors
)

// A Model is a light-curve model as data:
//
//	flux = transit × function × trend + added terms, with Gaussian noise of the errors given
//
// See [Model.Equation] for all of it. Fields for the transit are start values of
// parameters that a priors table leaves free, and values of the others. White
// lists the parameters of the white light curve, or of any single curve, and
// Channel those that each channel has of its own; all others are shared by the
// channels, which are fitted with them held at the white fit's values. The names
// that priors know are those of [Parameters].
type Model struct {
	Period       float64 // d, above 0
	MidTransit   float64 // BJD_TDB, d; a guess good to 0.01 d
	AxisRatio    float64 // semi-major axis over stellar radius, above 1
	Inclination  float64 // deg, above 0 up to 90; more than 90 is mirrored
	Eccentricity float64 // from 0, below 1
	Periastron   float64 // argument of periastron of the planet's path, deg
	RadiusRatio  float64 // planet radius over stellar radius, a start value, above 0
	Exposure     float64 // of one integration, s; 0 for an instantaneous one
	Companion    float64 // light of other stars in the same measurement, in units of the star's, from 0: it dilutes the transit

	LimbLaw    string          // "quadratic" (also when empty) or another law of package limb
	LimbPolicy string          // of channels: "free" (also when empty), "fixed" or "prior"
	Limb       limbtable.Table // for the policies "fixed" and "prior"

	Trend    systematics.Trend // the systematics
	Function []string          // parameters of a factor of the recipe's own, see [WhiteWith]; nil without one
	Alone    bool              // that function is all there is in the place of the transit, see [Function]
	Inflate  bool              // multiply the errors by the root of the reduced chi-square where that is above 1, and fit again

	White   Priors // parameters of the white light curve
	Channel Priors // parameters that each channel has of its own
}

// check fills in defaults and reports settings outside their range.
func (m *Model) check() error {
	if m.LimbLaw == "" {
		m.LimbLaw = LawQuadratic
	}
	if m.LimbPolicy == "" {
		m.LimbPolicy = PolicyFree
	}
	if laws := limb.Names(); !slices.Contains(laws, m.LimbLaw) {
		return fmt.Errorf("limb-darkening law %.40q; expected one of %s%s", m.LimbLaw, strings.Join(laws, ", "), nearest.Hint(m.LimbLaw, laws))
	}
	if p := m.LimbPolicy; p != PolicyFree && p != PolicyFixed && p != PolicyPrior {
		return fmt.Errorf("limb-darkening policy %.40q; expected free, fixed or prior", p)
	}
	settling := m.Trend.SettlingTime
	if !m.Trend.Settling {
		settling = 1 // not used
	}
	for _, c := range []struct {
		name  string
		value float64
		ok    bool
		want  string
	}{
		{"period", m.Period, m.Period > 0, "days above 0"},
		{"midTransit", m.MidTransit, true, "a time in days"},
		{"axisRatio", m.AxisRatio, m.AxisRatio > 1, "a number above 1"},
		{"inclination", m.Inclination, m.Inclination > 0 && m.Inclination < 180, "degrees between 0 and 180"},
		{"eccentricity", m.Eccentricity, m.Eccentricity >= 0 && m.Eccentricity <= maxEccentricity, "a number from 0 to 0.95"},
		{"periastron", m.Periastron, true, "degrees"},
		{"radiusRatio", m.RadiusRatio, m.RadiusRatio > 0 && m.RadiusRatio <= maxRadiusRatio, "a number above 0, up to 1"},
		{"settlingTime", settling, settling >= leastSettling && settling <= mostSettling, "days above 0, for example 0.01"},
		{"exposure", m.Exposure, m.Exposure >= 0, "seconds from 0 up"},
		{"companion", m.Companion, m.Companion >= 0 && m.Companion <= mostCompanion, "a number from 0 to 1000"},
	} {
		if !c.ok || math.IsInf(c.value, 0) || math.IsNaN(c.value) {
			return fmt.Errorf("%s is %g; expected %s", c.name, c.value, c.want)
		}
	}
	return nil
}

// plain reports a model that needs a function of the recipe.
func (m *Model) plain() error {
	if m.Alone || len(m.Function) > 0 {
		return fmt.Errorf("the model has a function of the recipe's own; fit it with WhiteWith, ChannelWith or Function")
	}
	return nil
}
