package fit

import (
	"fmt"
	"math"
	"slices"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
	"rimlight/steps/transit"
)

// A space is the set of parameters of a fit: a vector of coordinates, one per
// slot, some free. Coordinates are those in which the light curve is smooth, in
// parentheses where they are not the named parameter itself:
//
//	period, midTransit (offset from reference), axisRatio,
//	inclination (cos² i) or impact (b²),
//	eccentricity, periastron (rad), radiusRatio,
//	u1, u2 or q1 (√q1), q2 (see limb.FromSquare), settlingTime (its logarithm)
type space struct {
	value     [slots]float64 // coordinates: start of the free ones, values of the others
	name      [slots]string  // the name each slot goes by in tables
	prior     [slots]Prior   // of the free slots, in the posterior's units
	free      []int          // free slots, increasing
	reference float64        // mid-transit time that slotMid counts from
	exposure  float64        // s
	law       string         // of limb darkening, one of two coefficients; the quadratic one stands in for simpler ones
}

// newSpace takes start values from the setup and names the slots by the
// parameterisation that the priors choose.
func newSpace(setup Setup) *space {
	cosI := math.Cos(setup.Inclination * degree)
	s := &space{
		value: [slots]float64{
			slotPeriod: setup.Period, slotAxis: setup.AxisRatio, slotShape: max(cosI*cosI, leastShape),
			slotEccentricity: setup.Eccentricity, slotPeriastron: setup.Periastron * degree,
			slotRadius: setup.RadiusRatio,
		},
		name: [slots]string{"period", "midTransit", "axisRatio", "inclination", "eccentricity", "periastron",
			"radiusRatio", "u1", "u2", "settlingTime"},
		reference: setup.MidTransit,
		exposure:  setup.Exposure,
		law:       LawQuadratic,
	}
	switch setup.LimbLaw {
	case LawSquareRoot, LawLogarithmic:
		s.law = setup.LimbLaw
	case LawPower2:
		s.law = setup.LimbLaw
		s.value[slotLimb1], s.value[slotLimb2] = 0.5, 0.7 // some star; an exponent of 0 is none
	}
	if setup.Trend.Settling {
		s.value[slotSettling] = math.Log(setup.Trend.SettlingTime)
	}
	return s
}

// rename changes the parameterisation of a slot, converting its value.
func (s *space) rename(slot int, name string) {
	if s.name[slot] == name {
		return
	}
	p := s.physical(&s.value)
	switch name {
	case "impact":
		b := p.Orbit.ImpactParameter()
		s.value[slotShape] = max(b*b, leastShape)
	case "q1", "q2":
		q1, q2, err := limb.ToSquare(s.law, p.Law.Coefficients[0], p.Law.Coefficients[1])
		if err != nil { // the start is nowhere near a star
			q1, q2 = 0, 0.5
		}
		s.value[slotLimb1], s.value[slotLimb2] = math.Sqrt(q1), q2
		s.name[slotLimb1], s.name[slotLimb2] = "q1", "q2"
	}
	s.name[slot] = name
}

// apply puts the rows of a priors table into the space. settling says whether
// the trend has a settling term; a row about it is otherwise passed over, with a
// warning.
func (s *space) apply(priors Priors, settling bool) (warnings []string, err error) {
	var rows [slots]*Prior
	for i := range priors {
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
		rows[named.slot] = &row
	}
	if a, b := rows[slotLimb1], rows[slotLimb2]; a != nil && b != nil && a.Name[0] != b.Name[0] {
		return nil, fmt.Errorf("both %s and %s have priors; use u1 and u2, or q1 and q2", a.Name, b.Name)
	}
	for slot, row := range rows {
		if row != nil {
			s.rename(slot, row.Name)
		}
	}
	for slot, row := range rows {
		if row == nil {
			continue
		}
		if row.Kind == Fixed {
			lo, hi := s.allowed(slot)
			s.value[slot] = s.coordinate(slot, row.A)
			if !(s.value[slot] >= lo && s.value[slot] <= hi) {
				return nil, fmt.Errorf("parameter %s is held at %g, outside its range", row.Name, row.A)
			}
			continue
		}
		if err := s.release(slot, *row); err != nil {
			return nil, err
		}
	}
	return warnings, nil
}

// release makes a slot free under a prior and moves its value into the range.
func (s *space) release(slot int, prior Prior) error {
	s.prior[slot] = prior
	s.free = append(s.free, slot)
	slices.Sort(s.free)
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
func (s *space) isFree(slot int) bool { return slices.Contains(s.free, slot) }

// allowed is the range of a coordinate that holds whatever the prior says.
func (s *space) allowed(slot int) (lo, hi float64) {
	switch slot {
	case slotPeriod:
		return math.SmallestNonzeroFloat64, math.Inf(1)
	case slotSettling:
		return math.Log(leastSettling), math.Log(mostSettling)
	case slotAxis:
		return 1, math.Inf(1)
	case slotShape:
		if s.name[slot] == "impact" {
			return leastShape, 4
		}
		return leastShape, 1
	case slotEccentricity:
		return 0, maxEccentricity
	case slotRadius:
		return leastRadius, maxRadiusRatio
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
	case "impact", "q1", "settlingTime":
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
	case "q1":
		return math.Sqrt(named)
	case "settlingTime":
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
	case "q1":
		return x * x, 2 * x
	case "settlingTime":
		return math.Exp(x), math.Exp(x)
	}
	return x, 1
}

// physical turns coordinates into the arguments of the transit model.
func (s *space) physical(v *[slots]float64) transit.Params {
	e, sinW := v[slotEccentricity], math.Sin(v[slotPeriastron])
	cosI := math.Sqrt(v[slotShape])
	if s.name[slotShape] == "impact" {
		cosI = min(1, cosI*(1+e*sinW)/(v[slotAxis]*(1-e*e)))
	}
	u1, u2 := v[slotLimb1], v[slotLimb2]
	if s.name[slotLimb1] == "q1" {
		u1, u2, _ = s.fromSquare(v)
	}
	return transit.Params{
		Orbit: orbit.Orbit{
			Period: v[slotPeriod], MidTransit: s.reference + v[slotMid], AxisRatio: v[slotAxis],
			Inclination: math.Acos(cosI), Eccentricity: e, Periastron: v[slotPeriastron],
		},
		RadiusRatio: v[slotRadius], Law: limb.Law{Name: s.law, Coefficients: []float64{u1, u2}}, Exposure: s.exposure,
	}
}

// fromSquare returns the limb-darkening coefficients at √q1 and q2 and their
// derivatives, see [limb.FromRoot].
func (s *space) fromSquare(v *[slots]float64) (u1, u2 float64, grad [4]float64) {
	root, q2 := v[slotLimb1], v[slotLimb2]
	if s.law == LawPower2 { // steps of differences may leave the range
		root, q2 = min(max(root, squareMargin), 1-squareMargin), min(q2, 1-squareMargin)
	}
	u1, u2, grad, _ = limb.FromRoot(s.law, root, q2)
	return u1, u2, grad
}

// chain turns the gradient of a light curve in the transit model's arguments, in
// their order, into that in a slot's coordinate: a weight for each argument.
func (s *space) chain(v *[slots]float64, slot int) (weight [9]float64) {
	const inclination = 3 // the arguments are in the order of the slots, but for coordinates
	p := s.physical(v)
	sinI, cosI := math.Sincos(p.Orbit.Inclination)
	impact := s.name[slotShape] == "impact"
	e := v[slotEccentricity]
	sinW, cosW := math.Sincos(v[slotPeriastron])
	dCos := -1 / sinI // derivative of the inclination in its cosine
	switch slot {
	case slotShape:
		weight[inclination] = dCos * cosI / (2 * v[slotShape])
	case slotLimb1:
		weight[slotLimb1] = 1
		if s.name[slot] == "q1" {
			_, _, grad := s.fromSquare(v)
			weight[slotLimb1], weight[slotLimb2] = grad[0], grad[2]
		}
	case slotLimb2:
		weight[slotLimb2] = 1
		if s.name[slot] == "q2" {
			_, _, grad := s.fromSquare(v)
			weight[slotLimb1], weight[slotLimb2] = grad[1], grad[3]
		}
	default:
		weight[slot] = 1
		if !impact {
			break
		}
		switch slot { // the inclination follows from the impact parameter
		case slotAxis:
			weight[inclination] = -dCos * cosI / v[slotAxis]
		case slotEccentricity:
			weight[inclination] = dCos * cosI * (sinW/(1+e*sinW) + 2*e/(1-e*e))
		case slotPeriastron:
			weight[inclination] = dCos * cosI * e * cosW / (1 + e*sinW)
		}
	}
	return weight
}
