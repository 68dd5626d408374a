package fit

import (
	"fmt"
	"math"
	"strings"

	"rimlight/steps/limb"
	"rimlight/steps/nearest"
)

// Limits of the parameters that hold whatever the priors say.
const (
	maxEccentricity = 0.95
	maxRadiusRatio  = 1
	leastRadius     = 1e-4 // radius ratio; a depth of 0.01 ppm
	mostCompanion   = 1000 // light of other stars; it hides any transit
	// leastShape is the least squared cosine of the inclination, or squared impact
	// parameter, used. At zero the light curve does not change with either; the
	// difference is below 1e-6 of the depth.
	leastShape = 1e-8
	// Settling times, in days, outside this range cannot be told from a spike or a
	// slope in any observation.
	leastSettling = 1e-6
	mostSettling  = 1e3
	// Errors are multiplied by numbers in this range at most.
	leastErrorScale = 1e-3
	mostErrorScale  = 1e3

	// squareMargin keeps √q1 and q2 of the power-2 law off the sides of the unit
	// square where its exponent is zero or infinite.
	squareMargin = 1e-4
	// Exponents of the power-2 law outside this range make a star without limb
	// darkening, or one that is bright at its centre only.
	leastExponent = 0.01
	mostExponent  = 50

	degree = math.Pi / 180
)

// Slots of a parameter vector. Each named parameter of a fit lives in one slot,
// in a coordinate in which the light curve is smooth (see [space]).
const (
	slotPeriod = iota
	slotMid
	slotSize
	slotTilt
	slotShape1
	slotShape2
	slotRadius
	slotLimb1
	slotLimb2
	slotLimb3
	slotLimb4
	slotCompanion
	slotSettling
	slotErrorScale
	slotJitter
	slots
)

// noisy reports whether a slot is of the noise, and not of the mean of the flux.
func noisy(slot int) bool { return slot == slotErrorScale || slot == slotJitter }

// A Parameter is a name that priors tables know.
type Parameter struct {
	Name  string
	Unit  string // of values in a posterior; FITS-standard, empty for a pure number
	About string
}

// A named parameter and where it lives.
type parameterName struct {
	name  string
	slot  int
	unit  string // of values in a posterior
	about string
}

var parameterNames = [...]parameterName{
	{"period", slotPeriod, "d", "orbital period"},
	{"midTransit", slotMid, "d", "time of inferior conjunction, BJD_TDB"},
	{"midTransitOffset", slotMid, "d", "the same, less the model's MidTransit"},
	{"axisRatio", slotSize, "", "semi-major axis in stellar radii"},
	{"stellarDensity", slotSize, "kg.m-3", "mean density of the star, in the place of axisRatio"},
	{"duration", slotSize, "h", "of the transit from first to fourth contact, in the place of axisRatio"},
	{"inclination", slotTilt, "deg", "of the orbit"},
	{"impact", slotTilt, "", "impact parameter in stellar radii, in the place of inclination"},
	{"eccentricity", slotShape1, "", "of the orbit"},
	{"ecosw", slotShape1, "", "e cos ω, in the place of eccentricity"},
	{"secosw", slotShape1, "", "√e cos ω, in the place of eccentricity"},
	{"periastron", slotShape2, "deg", "argument of periastron ω of the planet's path"},
	{"esinw", slotShape2, "", "e sin ω, in the place of periastron"},
	{"sesinw", slotShape2, "", "√e sin ω, in the place of periastron"},
	{"radiusRatio", slotRadius, "", "planet radius in stellar radii"},
	{"q1", slotLimb1, "", "limb darkening in the unit square of laws of two coefficients"},
	{"q2", slotLimb2, "", "limb darkening in the unit square of laws of two coefficients"},
	{"u1", slotLimb1, "", "first limb-darkening coefficient"},
	{"u2", slotLimb2, "", "second limb-darkening coefficient"},
	{"u3", slotLimb3, "", "third limb-darkening coefficient"},
	{"u4", slotLimb4, "", "fourth limb-darkening coefficient"},
	{"companion", slotCompanion, "", "light of other stars in units of the star's"},
	{"settlingTime", slotSettling, "d", "e-folding time of the settling"},
	{"errorScale", slotErrorScale, "", "factor of the errors given"},
	{"jitter", slotJitter, "", "white noise beside the errors given, relative to the median flux"},
}

// Parameters lists the names that the priors of a [Model] know, beside those of a
// function of the recipe's own. Of those in the place of one another a table has
// one; ecosw goes with esinw, secosw with sesinw, and q1 with q2.
func Parameters() []Parameter {
	var out []Parameter
	for _, p := range parameterNames {
		out = append(out, Parameter{p.name, p.unit, p.about})
	}
	return out
}

func findName(name string) (parameterName, error) {
	var known []string
	for _, p := range parameterNames {
		if p.name == name {
			return p, nil
		}
		known = append(known, p.name)
	}
	return parameterName{}, fmt.Errorf("unknown parameter %.40q%s; expected one of %v", name, nearest.Hint(name, known), known)
}

// isLimb reports whether a parameter is one of limb darkening.
func isLimb(name string) bool {
	p, err := findName(name)
	return err == nil && p.slot >= slotLimb1 && p.slot < slotLimb1+limb.Most
}

// A family of names: parameters of one go together.
var families = [...][]string{{"eccentricity", "periastron"}, {"ecosw", "esinw"}, {"secosw", "sesinw"}, {"u1", "u2", "u3", "u4"}, {"q1", "q2"}}

// family lists the names that go with one, itself among them.
func family(name string) []string {
	for _, f := range families {
		for _, other := range f {
			if other == name {
				return f
			}
		}
	}
	return []string{name}
}

// checkFamilies reports rows of which one follows from the others, or that do
// not go together.
func checkFamilies(rows *[slots]*Prior) error {
	for _, pair := range [][2]int{{slotShape1, slotShape2}, {slotLimb1, slotLimb2}, {slotLimb1, slotLimb3}, {slotLimb1, slotLimb4}, {slotLimb2, slotLimb3}} {
		a, b := rows[pair[0]], rows[pair[1]]
		if a == nil || b == nil {
			continue
		}
		if f, g := family(a.Name), family(b.Name); f[0] != g[0] {
			return fmt.Errorf("both %s and %s have priors; use %s, or %s", a.Name, b.Name, strings.Join(f[:2], " and "), strings.Join(g[:2], " and "))
		}
	}
	return nil
}

// unitFactors turn values into the units of parameterNames.
var unitFactors = map[string]map[string]float64{
	"d":      {"": 1, "d": 1, "h": 1. / 24, "min": 1. / 1440, "s": 1. / 86400},
	"h":      {"h": 1, "d": 24, "min": 1. / 60, "s": 1. / 3600},
	"deg":    {"": 1, "deg": 1, "rad": 1 / degree, "arcmin": 1. / 60},
	"kg.m-3": {"": 1, "kg.m-3": 1, "kg/m3": 1, "kg m-3": 1, "g.cm-3": 1000, "g/cm3": 1000, "g cm-3": 1000},
	"":       {"": 1},
}

// normalise checks a prior and returns it in the posterior's unit.
func (p Prior) normalise(unit string) (Prior, error) {
	factor, ok := unitFactors[unit][p.Unit]
	if !ok {
		want := unit
		if want == "" {
			want = "none"
		}
		return Prior{}, fmt.Errorf("parameter %.40s has unit %.40q; expected %s", p.Name, p.Unit, want)
	}
	if err := p.check(); err != nil {
		return Prior{}, err
	}
	p.A, p.B, p.Lo, p.Hi = p.A*factor, p.B*factor, p.Lo*factor, p.Hi*factor
	p.Unit = unit
	return p, nil
}
