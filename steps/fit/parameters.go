package fit

import (
	"fmt"
	"math"

	"rimlight/steps/nearest"
)

// Limits of the parameters that hold whatever the priors say.
const (
	maxEccentricity = 0.95
	maxRadiusRatio  = 1
	leastRadius     = 1e-4 // radius ratio; a depth of 0.01 ppm
	// leastShape is the least squared cosine of the inclination, or squared impact
	// parameter, used. At zero the light curve does not change with either; the
	// difference is below 1e-6 of the depth.
	leastShape = 1e-8
	// Settling times, in days, outside this range cannot be told from a spike or a
	// slope in any observation.
	leastSettling = 1e-6
	mostSettling  = 1e3

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
	slotAxis
	slotShape
	slotEccentricity
	slotPeriastron
	slotRadius
	slotLimb1
	slotLimb2
	slotSettling
	slots
)

// A parameterName ties a name in a priors table to its slot and unit.
type parameterName struct {
	name string
	slot int
	unit string // of values in a posterior
}

var parameterNames = [...]parameterName{
	{"period", slotPeriod, "d"},
	{"midTransit", slotMid, "d"},
	{"midTransitOffset", slotMid, "d"},
	{"axisRatio", slotAxis, ""},
	{"inclination", slotShape, "deg"},
	{"impact", slotShape, ""},
	{"eccentricity", slotEccentricity, ""},
	{"periastron", slotPeriastron, "deg"},
	{"radiusRatio", slotRadius, ""},
	{"q1", slotLimb1, ""},
	{"q2", slotLimb2, ""},
	{"u1", slotLimb1, ""},
	{"u2", slotLimb2, ""},
	{"settlingTime", slotSettling, "d"},
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

// unitFactors turn values into the units of parameterNames.
var unitFactors = map[string]map[string]float64{
	"d":   {"": 1, "d": 1, "h": 1. / 24, "min": 1. / 1440, "s": 1. / 86400},
	"deg": {"": 1, "deg": 1, "rad": 1 / degree, "arcmin": 1. / 60},
	"":    {"": 1},
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

// check reports numbers that are no prior of its kind.
func (p Prior) check() error {
	bad := func(want string) error {
		return fmt.Errorf("prior of %.40s is %.40s with A=%g, B=%g, Lo=%g, Hi=%g; expected %s", p.Name, p.Kind, p.A, p.B, p.Lo, p.Hi, want)
	}
	for _, v := range []float64{p.A, p.B, p.Lo, p.Hi} {
		if v-v != 0 {
			return bad("finite numbers")
		}
	}
	switch p.Kind {
	case Uniform:
		if !(p.A < p.B) {
			return bad("U(a, b) with a < b")
		}
	case LogUniform:
		if !(p.A > 0 && p.A < p.B) {
			return bad("logU(a, b) with 0 < a < b")
		}
	case Normal:
		if !(p.B > 0) {
			return bad("N(mean, sd) with sd > 0")
		}
	case TruncatedNormal:
		if !(p.B > 0 && p.Lo < p.Hi) {
			return bad("TN(mean, sd, a, b) with sd > 0 and a < b")
		}
	case Fixed:
	default:
		return fmt.Errorf("prior of %.40s has kind %.40q; expected U, N, TN, logU or =", p.Name, p.Kind)
	}
	return nil
}

// limits returns the interval a prior allows, infinite where there is no limit.
func (p Prior) limits() (lo, hi float64) {
	switch p.Kind {
	case Uniform, LogUniform:
		return p.A, p.B
	case TruncatedNormal:
		return p.Lo, p.Hi
	}
	return math.Inf(-1), math.Inf(1)
}

// normal reports whether a prior has a Gaussian factor.
func (p Prior) normal() bool { return p.Kind == Normal || p.Kind == TruncatedNormal }
