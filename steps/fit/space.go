package fit

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"rimlight/steps/limb"
)

// A space is the set of parameters of a fit: a vector of coordinates, one per
// slot, some free. Coordinates are those in which the light curve is smooth, in
// parentheses where they are not the named parameter itself:
//
//	period, midTransit (offset from reference), axisRatio, stellarDensity or duration,
//	inclination (cos² i) or impact (b²),
//	eccentricity and periastron (rad), ecosw and esinw, or secosw and sesinw,
//	radiusRatio, u1 to u4 or q1 (√q1) and q2 (see limb.FromSquare), companion,
//	settlingTime and errorScale (their logarithms), jitter (its square)
type space struct {
	value     [slots]float64 // coordinates: start of the free ones, values of the others
	name      [slots]string  // the name each slot goes by in tables
	prior     [slots]Prior   // of the free slots, in the posterior's units
	free      []int          // free slots of what the flux is, increasing
	noise     []int          // free slots of the noise, increasing
	trend     Priors         // normal priors of coefficients of the trend
	reference float64        // mid-transit time that slotMid counts from
	exposure  float64        // s
	law       string         // of limb darkening
	limbs     int            // coefficients of the law
}

// newSpace takes start values from the model. Names are those of its fields.
func newSpace(model Model) *space {
	cosI := math.Cos(model.Inclination * degree)
	s := &space{
		value: [slots]float64{
			slotPeriod: model.Period, slotSize: model.AxisRatio, slotTilt: max(cosI*cosI, leastShape),
			slotShape1: model.Eccentricity, slotShape2: model.Periastron * degree,
			slotRadius: model.RadiusRatio, slotCompanion: model.Companion,
		},
		name: [slots]string{"period", "midTransit", "axisRatio", "inclination", "eccentricity", "periastron",
			"radiusRatio", "u1", "u2", "u3", "u4", "companion", "settlingTime", "errorScale", "jitter"},
		reference: model.MidTransit,
		exposure:  model.Exposure,
		law:       model.LimbLaw,
	}
	if s.law == "" {
		s.law = LawQuadratic
	}
	s.limbs, _ = limb.Count(s.law) // the law was checked
	if s.law == LawPower2 {
		s.value[slotLimb1], s.value[slotLimb2] = 0.5, 0.7 // some star; an exponent of 0 is none
	}
	if model.Trend.Settling {
		s.value[slotSettling] = math.Log(model.Trend.SettlingTime)
	}
	return s
}

// exists reports whether a slot has a meaning for the law of limb darkening.
func (s *space) exists(slot int) bool {
	return slot < slotLimb1 || slot >= slotLimb1+limb.Most || slot < slotLimb1+s.limbs
}

// rename changes the parameterisation of a slot, and of those that go with it,
// and converts values.
func (s *space) rename(slot int, name string) {
	if s.name[slot] == name {
		return
	}
	switch slot {
	case slotSize, slotTilt, slotShape1, slotShape2:
		o, err := s.orbit(&s.value)
		s.name[slot] = name
		if slot == slotShape1 || slot == slotShape2 {
			f := family(name)
			s.name[slotShape1], s.name[slotShape2] = f[0], f[1]
		}
		if err == nil {
			s.setOrbit(o)
		}
	case slotLimb1, slotLimb2, slotLimb3, slotLimb4:
		u := s.coefficients(&s.value)
		if family(name)[0] == "q1" {
			s.name[slotLimb1], s.name[slotLimb2] = "q1", "q2"
			q1, q2, err := limb.ToSquare(s.law, u[0], u[1])
			if err != nil { // the start is nowhere near a star
				q1, q2 = 0, 0.5
			}
			s.value[slotLimb1], s.value[slotLimb2] = math.Sqrt(q1), q2
			return
		}
		s.name[slotLimb1], s.name[slotLimb2] = "u1", "u2"
		copy(s.value[slotLimb1:], u)
	default:
		s.name[slot] = name
	}
}

// apply puts the rows of a priors table into the space. settling says whether
// the trend has a settling term; a row about it is otherwise passed over, with a
// warning.
func (s *space) apply(priors Priors, settling bool) (warnings []string, err error) {
	var rows [slots]*Prior
	for i := range priors {
		if isTrend(priors[i].Name) {
			if err := s.addTrend(priors[i]); err != nil {
				return nil, err
			}
			continue
		}
		named, err := findName(priors[i].Name)
		if err != nil {
			return nil, err
		}
		row, err := priors[i].normalise(named.unit)
		if err != nil {
			return nil, err
		}
		if other := rows[named.slot]; other != nil {
			if other.Name == row.Name {
				return nil, fmt.Errorf("parameter %s has two priors; give one", row.Name)
			}
			return nil, fmt.Errorf("both %s and %s have priors, but one follows from the other; give one of them", other.Name, row.Name)
		}
		if named.slot == slotSettling && !settling {
			warnings = append(warnings, "the prior on settlingTime is not used: the trend has no settling term")
			continue
		}
		if !s.exists(named.slot) {
			warnings = append(warnings, fmt.Sprintf("the prior on %s is not used: the law is %s", row.Name, s.law))
			continue
		}
		if family(row.Name)[0] == "q1" && s.limbs != 2 {
			return nil, fmt.Errorf("%s belongs to a law of two coefficients, but the law is %s; give a prior for u1", row.Name, s.law)
		}
		rows[named.slot] = &row
	}
	if err := checkFamilies(&rows); err != nil {
		return nil, err
	}
	for slot, row := range rows {
		if row != nil {
			s.rename(slot, row.Name)
		}
	}
	// A duration, a density and an impact parameter depend on what else is held:
	// numbers that the table gives come first, and start values after them.
	for slot, row := range rows {
		if row != nil && row.Kind == Fixed {
			if err := s.hold(slot, *row); err != nil {
				return nil, err
			}
		}
	}
	for slot, row := range rows {
		if row != nil && row.Kind != Fixed {
			if err := s.release(slot, *row); err != nil {
				return nil, err
			}
		}
	}
	return warnings, nil
}

// addTrend adds a prior of a coefficient of the trend.
func (s *space) addTrend(p Prior) error {
	if err := p.check(); err != nil {
		return err
	}
	if p.Kind != Normal || p.Unit != "" {
		return fmt.Errorf("prior of %.40s is %.40s(...) with unit %.40q; expected N(mean, sd), a pure number in units of the curve's median flux", p.Name, p.Kind, p.Unit)
	}
	for _, other := range s.trend {
		if other.Name == p.Name {
			return fmt.Errorf("parameter %.40s has two priors; give one", p.Name)
		}
	}
	s.trend = append(s.trend, p)
	return nil
}

// hold fixes a slot at the value of a row.
func (s *space) hold(slot int, row Prior) error {
	lo, hi := s.allowed(slot)
	s.value[slot] = s.coordinate(slot, row.A)
	if !(s.value[slot] >= lo && s.value[slot] <= hi) {
		return fmt.Errorf("parameter %s is held at %g, outside its range", row.Name, row.A)
	}
	return nil
}

// release makes a slot free under a prior and moves its value into the range.
func (s *space) release(slot int, prior Prior) error {
	s.prior[slot] = prior
	if noisy(slot) {
		s.noise = append(s.noise, slot)
	} else {
		s.free = append(s.free, slot)
		slices.Sort(s.free)
	}
	lo, hi := s.limits(slot)
	if !(lo < hi) {
		return fmt.Errorf("the prior of %s leaves no room inside the parameter's range", prior.Name)
	}
	start := s.value[slot]
	if prior.normal() && slot != slotRadius && slot != slotMid {
		start = s.coordinate(slot, prior.A)
	}
	s.value[slot] = inside(start, lo, hi)
	return nil
}

// inside moves x into [lo, hi], to a tenth of the width from an end that it lies
// at or beyond, where the width is finite.
func inside(x, lo, hi float64) float64 {
	margin := (hi - lo) / 10
	if math.IsInf(margin, 0) {
		margin = 0
	}
	if x <= lo {
		return lo + margin
	}
	if x >= hi {
		return hi - margin
	}
	return x
}

// isFree reports whether a slot is free.
func (s *space) isFree(slot int) bool {
	return slices.Contains(s.free, slot) || slices.Contains(s.noise, slot)
}

// allowed is the range of a coordinate that holds whatever the prior says.
func (s *space) allowed(slot int) (lo, hi float64) {
	switch slot {
	case slotPeriod:
		return math.SmallestNonzeroFloat64, math.Inf(1)
	case slotSettling:
		return math.Log(leastSettling), math.Log(mostSettling)
	case slotSize:
		if s.name[slot] == "axisRatio" {
			return 1, math.Inf(1)
		}
		return math.SmallestNonzeroFloat64, math.Inf(1)
	case slotTilt:
		if s.name[slot] == "impact" {
			return leastShape, 4
		}
		return leastShape, 1
	case slotShape1, slotShape2:
		switch s.name[slot] {
		case "eccentricity":
			return 0, maxEccentricity
		case "ecosw", "esinw":
			return -maxEccentricity, maxEccentricity
		case "secosw", "sesinw":
			return -math.Sqrt(maxEccentricity), math.Sqrt(maxEccentricity)
		}
	case slotRadius:
		return leastRadius, maxRadiusRatio
	case slotCompanion:
		return 0, mostCompanion
	case slotErrorScale:
		return math.Log(leastErrorScale), math.Log(mostErrorScale)
	case slotJitter:
		return 0, 1
	case slotLimb1, slotLimb2:
		square := s.name[slot][0] == 'q'
		switch {
		case s.law == LawPower2 && square && slot == slotLimb1:
			return squareMargin, 1 - squareMargin
		case s.law == LawPower2 && square:
			return 0, 1 - squareMargin
		case s.law == LawPower2 && slot == slotLimb2:
			return leastExponent, mostExponent
		case square:
			return 0, 1
		}
	}
	return math.Inf(-1), math.Inf(1)
}

// limits is the range of a free coordinate: what is allowed and what the prior
// leaves of it.
func (s *space) limits(slot int) (lo, hi float64) {
	lo, hi = s.allowed(slot)
	a, b := s.prior[slot].limits()
	if s.name[slot] == "inclination" {
		// cos² i is the same at i and 180 deg - i, and least at 90 deg.
		ca, cb := s.coordinate(slot, max(a, 0)), s.coordinate(slot, min(b, 180))
		if a < 90 && b > 90 {
			return lo, min(hi, max(ca, cb))
		}
		return max(lo, min(ca, cb)), min(hi, max(ca, cb))
	}
	switch s.name[slot] {
	case "impact", "q1", "settlingTime", "errorScale", "jitter":
		if b < 0 {
			return lo, math.Inf(-1) // no room
		}
		a = max(a, 0) // squares, roots and logarithms are of numbers from 0 up
	}
	if !math.IsInf(a, 0) {
		lo = max(lo, s.coordinate(slot, a))
	}
	if !math.IsInf(b, 0) {
		hi = min(hi, s.coordinate(slot, b))
	}
	return lo, hi
}

// coordinate turns a named value into the slot's coordinate.
func (s *space) coordinate(slot int, named float64) float64 {
	switch s.name[slot] {
	case "midTransit":
		return named - s.reference
	case "inclination":
		c := math.Cos(named * degree)
		return max(c*c, leastShape)
	case "impact":
		return max(named*named, leastShape)
	case "periastron":
		return named * degree
	case "jitter":
		return named * named
	case "q1":
		return math.Sqrt(named)
	case "settlingTime", "errorScale":
		return math.Log(named)
	}
	return named
}

// named turns a coordinate into the named value, and gives its derivative.
func (s *space) named(slot int, x float64) (value, slope float64) {
	switch s.name[slot] {
	case "midTransit":
		return s.reference + x, 1
	case "inclination":
		i := math.Acos(math.Sqrt(x))
		return i / degree, -1 / (math.Sin(2*i) * degree)
	case "impact":
		b := math.Sqrt(x)
		return b, 1 / (2 * b)
	case "periastron":
		return x / degree, 1 / degree
	case "jitter":
		j := math.Sqrt(x)
		return j, 1 / (2 * j)
	case "q1":
		return x * x, 2 * x
	case "settlingTime", "errorScale":
		return math.Exp(x), math.Exp(x)
	}
	return x, 1
}

// noiseOf returns errorScale and jitter.
func (s *space) noiseOf(v *[slots]float64) (scale, jitter float64) {
	return math.Exp(v[slotErrorScale]), math.Sqrt(v[slotJitter])
}

// isTrend reports whether a name is that of a coefficient of the trend.
func isTrend(name string) bool {
	return len(name) > len(trendPrefix) && strings.HasPrefix(name, trendPrefix)
}
