package fit

import (
	"fmt"
	"math"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
	"rimlight/steps/transit"
)

const (
	// arguments is the largest number of arguments of the transit model: see
	// [transit.Params.Arguments], whose order this is.
	arguments         = argumentLimb + limb.Most + 1
	argumentShape     = 4
	argumentRadius    = 6
	argumentLimb      = 7
	hoursPerDay       = 24
	leastEccentricity = 1e-7 // for derivatives by e cos ω and its like, which have no meaning by e and ω on a circle
)

// basis is the one that the names of the slots speak of.
func (s *space) basis() orbit.Basis {
	b := orbit.Basis{Size: orbit.ByAxisRatio, Tilt: orbit.ByInclination, Shape: orbit.ByPolar}
	switch s.name[slotSize] {
	case "stellarDensity":
		b.Size = orbit.ByDensity
	case "duration":
		b.Size = orbit.ByDuration
	}
	if s.name[slotTilt] == "impact" {
		b.Tilt = orbit.ByImpact
	}
	switch s.name[slotShape1] {
	case "ecosw":
		b.Shape = orbit.ByVector
	case "secosw":
		b.Shape = orbit.ByRoot
	}
	return b
}

// elements are those of the orbit at coordinates v.
func (s *space) elements(v *[slots]float64) orbit.Elements {
	e := orbit.Elements{
		Basis: s.basis(), Period: v[slotPeriod], MidTransit: s.reference + v[slotMid], Size: v[slotSize],
		Shape: [2]float64{v[slotShape1], v[slotShape2]}, RadiusRatio: v[slotRadius],
	}
	if e.Basis.Size == orbit.ByDuration {
		e.Size /= hoursPerDay
	}
	if e.Tilt = math.Sqrt(v[slotTilt]); e.Basis.Tilt == orbit.ByInclination {
		e.Tilt = math.Acos(e.Tilt)
	}
	return e
}

// orbit is the one at coordinates v; an error where there is none.
func (s *space) orbit(v *[slots]float64) (orbit.Orbit, error) {
	o, err := s.elements(v).Orbit()
	if err == nil && o.Eccentricity > maxEccentricity*(1+1e-12) {
		err = fmt.Errorf("the eccentricity is %g; expected at most %g", o.Eccentricity, maxEccentricity)
	}
	return o, err
}

// setOrbit sets the coordinates of an orbit, but for its period and mid-transit
// time. A duration is that of a transit across the middle of the star where the
// orbit gives none.
func (s *space) setOrbit(o orbit.Orbit) {
	e, err := o.Elements(s.basis(), s.value[slotRadius])
	if err != nil {
		o.Inclination = math.Pi / 2
		if e, err = o.Elements(s.basis(), s.value[slotRadius]); err != nil {
			return
		}
	}
	s.value[slotSize] = e.Size
	if e.Basis.Size == orbit.ByDuration {
		s.value[slotSize] *= hoursPerDay
	}
	tilt := e.Tilt
	if e.Basis.Tilt == orbit.ByInclination {
		tilt = math.Cos(tilt)
	}
	s.value[slotTilt] = max(tilt*tilt, leastShape)
	s.value[slotShape1], s.value[slotShape2] = e.Shape[0], e.Shape[1]
}

// coefficients are those of the law of limb darkening at coordinates v.
func (s *space) coefficients(v *[slots]float64) []float64 {
	u := append([]float64(nil), v[slotLimb1:slotLimb1+s.limbs]...)
	if s.name[slotLimb1] == "q1" {
		u[0], u[1], _ = s.fromSquare(v)
	}
	return u
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

// physical turns coordinates into the arguments of the transit model; an error
// where there is no such orbit.
func (s *space) physical(v *[slots]float64) (transit.Params, error) {
	o, err := s.orbit(v)
	return s.params(v, o), err
}

func (s *space) params(v *[slots]float64, o orbit.Orbit) transit.Params {
	return transit.Params{
		Orbit: o, RadiusRatio: v[slotRadius], Law: limb.Law{Name: s.law, Coefficients: s.coefficients(v)},
		Exposure: s.exposure, Companion: v[slotCompanion],
	}
}

// A chainRule turns the gradient of a light curve in the transit model's arguments, in
// their order, into that in the slots' coordinates: a weight for each slot and
// argument.
type chainRule [slots][arguments]float64

// physicalChain is physical with the chain there.
func (s *space) physicalChain(v *[slots]float64) (transit.Params, *chainRule, error) {
	e := s.elements(v)
	o, jacobian, err := e.Jacobian()
	if err != nil {
		return transit.Params{}, nil, err
	}
	if o.Eccentricity > maxEccentricity*(1+1e-12) {
		return transit.Params{}, nil, fmt.Errorf("the eccentricity is %g; expected at most %g", o.Eccentricity, maxEccentricity)
	}
	polar := e.Basis.Shape == orbit.ByPolar
	if !polar {
		o.Eccentricity = max(o.Eccentricity, leastEccentricity)
	}
	w := new(chainRule)
	sin, cos := math.Sincos(o.Periastron)
	for k, slot := range [...]int{slotPeriod, slotMid, slotSize, slotTilt, slotShape1, slotShape2, slotRadius} {
		for row := range argumentShape {
			w[slot][row] = jacobian[row][k]
		}
		if !polar {
			h, k := jacobian[4][k], jacobian[5][k]
			w[slot][argumentShape] = cos*h + sin*k
			w[slot][argumentShape+1] = (cos*k - sin*h) / o.Eccentricity
		}
	}
	if polar {
		w[slotShape1][argumentShape], w[slotShape2][argumentShape+1] = 1, 1
	}
	var size, tilt float64 = 1, 1 / (2 * math.Sqrt(v[slotTilt])) // of the elements, by coordinate
	if e.Basis.Size == orbit.ByDuration {
		size = 1. / hoursPerDay
	}
	if e.Basis.Tilt == orbit.ByInclination {
		tilt /= -math.Sqrt(1 - v[slotTilt])
	}
	for row := range w[slotSize] {
		w[slotSize][row] *= size
		w[slotTilt][row] *= tilt
	}
	w[slotRadius][argumentRadius] = 1
	w[slotCompanion][argumentLimb+s.limbs] = 1
	for k := range s.limbs {
		w[slotLimb1+k][argumentLimb+k] = 1
	}
	if s.name[slotLimb1] == "q1" {
		_, _, grad := s.fromSquare(v)
		for k := range 2 {
			w[slotLimb1][argumentLimb+k] = grad[2*k]
			w[slotLimb2][argumentLimb+k] = grad[2*k+1]
		}
	}
	return s.params(v, o), w, nil
}
