package orbit

import (
	"fmt"
	"math"
)

// Choices of a [Basis].
const (
	ByAxisRatio   = "axisRatio"   // semi-major axis over stellar radius
	ByDensity     = "density"     // mean density of the star, kg m-3, see [StellarDensity]
	ByDuration    = "duration"    // from first to fourth contact, days
	ByInclination = "inclination" // radians
	ByImpact      = "impact"      // impact parameter, see [Orbit.ImpactParameter]
	ByPolar       = "polar"       // e and ω, radians
	ByVector      = "vector"      // e cos ω and e sin ω
	ByRoot        = "root"        // √e cos ω and √e sin ω
)

const (
	// maxAxisRatio is the largest axis ratio that a duration is turned into: light
	// takes weeks over that of a star like the Sun.
	maxAxisRatio = 1e12
	// margin allows for rounding at the ends of ranges.
	margin = 1 + 1e-12
)

// A Basis says which parameters describe an orbit. Each field names one choice;
// empty means the first.
type Basis struct {
	Size  string // [ByAxisRatio], [ByDensity] or [ByDuration]
	Tilt  string // [ByInclination] or [ByImpact]
	Shape string // [ByPolar], [ByVector] or [ByRoot]
}

// Elements are the parameters of an orbit in a basis of choice.
type Elements struct {
	Basis       Basis
	Period      float64    // days, > 0
	MidTransit  float64    // time of inferior conjunction, days
	Size        float64    // of the basis; a density and a duration are above 0
	Tilt        float64    // of the basis; an impact parameter is ≥ 0
	Shape       [2]float64 // of the basis
	RadiusRatio float64    // planet radius over stellar radius, ≥ 0; for a duration
	StarRadius  float64    // see [Orbit]
}

// check fills in the defaults of a basis and reports unknown names.
func (b *Basis) check() error {
	for _, field := range []struct {
		name  string
		value *string
		known []string
	}{
		{"Size", &b.Size, []string{ByAxisRatio, ByDensity, ByDuration}},
		{"Tilt", &b.Tilt, []string{ByInclination, ByImpact}},
		{"Shape", &b.Shape, []string{ByPolar, ByVector, ByRoot}},
	} {
		if *field.value == "" {
			*field.value = field.known[0]
		}
		found := false
		for _, name := range field.known {
			found = found || *field.value == name
		}
		if !found {
			return fmt.Errorf("orbit: %s of the basis is %.40q, expected one of %q", field.name, *field.value, field.known)
		}
	}
	return nil
}

// shape returns e and ω of the elements.
func (e Elements) shape() (eccentricity, periastron float64) {
	a, b := e.Shape[0], e.Shape[1]
	switch e.Basis.Shape {
	case ByVector:
		return math.Hypot(a, b), math.Atan2(b, a)
	case ByRoot:
		return a*a + b*b, math.Atan2(b, a)
	}
	return a, b
}

// Orbit returns the orbit that the elements describe. From an impact parameter
// follows an inclination of at most π/2; ω is 0 where it has no meaning. It is an
// error when there is no such orbit: names that no basis has, numbers outside
// their range, an impact parameter above the distance from the star, a duration
// that is too long for an orbit outside the star, or too short for the
// inclination. A duration is inverted to rounding.
func (e Elements) Orbit() (Orbit, error) {
	if err := e.Basis.check(); err != nil {
		return Orbit{}, err
	}
	o := Orbit{Period: e.Period, MidTransit: e.MidTransit, AxisRatio: e.Size, Inclination: e.Tilt, StarRadius: e.StarRadius}
	o.Eccentricity, o.Periastron = e.shape()
	if o.Eccentricity > maxEccentricity && o.Eccentricity < maxEccentricity*margin {
		o.Eccentricity = maxEccentricity // the sum of squares was rounded
	}
	// Tests what does not depend on size and tilt.
	some := o
	some.AxisRatio, some.Inclination, some.StarRadius = 1e6, 0, 0
	if err := some.Validate(); err != nil {
		return Orbit{}, err
	}
	near := o.near()
	if e.Basis.Tilt == ByImpact && !(e.Tilt >= 0 && e.Tilt <= maxAxisRatio) {
		return Orbit{}, fmt.Errorf("orbit: the impact parameter is %g, must be finite and not negative", e.Tilt)
	}
	if e.Basis.Tilt == ByInclination && !(e.Tilt >= 0 && e.Tilt <= math.Pi) {
		return Orbit{}, fmt.Errorf("orbit: Inclination is %g, must be 0 to π radians", e.Tilt)
	}
	at := func(axisRatio float64) Orbit {
		o := o
		o.AxisRatio = axisRatio
		if e.Basis.Tilt == ByImpact {
			o.Inclination = math.Acos(math.Min(1, e.Tilt/(axisRatio*near)))
		}
		return o
	}
	switch e.Basis.Size {
	case ByDensity:
		if !(e.Size > 0) {
			return Orbit{}, fmt.Errorf("orbit: the stellar density is %g kg m-3, must be above 0", e.Size)
		}
		o.AxisRatio = AxisRatio(e.Period, e.Size)
	case ByDuration:
		if !(e.RadiusRatio >= 0) || math.IsInf(e.RadiusRatio, 1) {
			return Orbit{}, fmt.Errorf("orbit: RadiusRatio is %g, must be finite and not negative", e.RadiusRatio)
		}
		// Outside of the star, and not touching it beside.
		eccentric := o.Eccentricity
		beside := (1 + e.RadiusRatio) * (1 + eccentric*math.Abs(math.Cos(o.Periastron))) / ((1 - eccentric) * (1 + eccentric))
		least := margin * math.Max(1/(1-eccentric), beside)
		if e.Basis.Tilt == ByImpact {
			least = math.Max(least, e.Tilt/near)
		}
		axisRatio, err := axisRatioOf(e.Size, e.RadiusRatio, least, at)
		if err != nil {
			return Orbit{}, err
		}
		o.AxisRatio = axisRatio
	}
	if e.Basis.Tilt == ByImpact && e.Tilt > o.AxisRatio*near {
		return Orbit{}, fmt.Errorf("orbit: the impact parameter is %g, but the planet passes the star at only %g stellar radii", e.Tilt, o.AxisRatio*near)
	}
	o = at(o.AxisRatio)
	return o, o.Validate()
}

// near returns the distance of the planet from the star at inferior conjunction,
// in semi-major axes.
func (o Orbit) near() float64 {
	e := o.Eccentricity
	return (1 - e) * (1 + e) / (1 + e*math.Sin(o.Periastron))
}

// Elements returns the elements of a valid orbit in a basis. The radius ratio,
// ≥ 0, counts for a duration only; it is an error when there is no transit then.
// [Elements.Orbit] leads back, to the mirror image below π/2 of an inclination
// above where the basis has an impact parameter.
func (o Orbit) Elements(b Basis, radiusRatio float64) (Elements, error) {
	if err := b.check(); err != nil {
		return Elements{}, err
	}
	if err := o.Validate(); err != nil {
		return Elements{}, err
	}
	e := Elements{
		Basis: b, Period: o.Period, MidTransit: o.MidTransit, Size: o.AxisRatio, Tilt: o.Inclination,
		Shape: [2]float64{o.Eccentricity, o.Periastron}, RadiusRatio: radiusRatio, StarRadius: o.StarRadius,
	}
	sin, cos := math.Sincos(o.Periastron)
	switch b.Shape {
	case ByVector:
		e.Shape = [2]float64{o.Eccentricity * cos, o.Eccentricity * sin}
	case ByRoot:
		e.Shape = [2]float64{math.Sqrt(o.Eccentricity) * cos, math.Sqrt(o.Eccentricity) * sin}
	}
	if b.Tilt == ByImpact {
		e.Tilt = o.ImpactParameter()
	}
	switch b.Size {
	case ByDensity:
		e.Size = StellarDensity(o.Period, o.AxisRatio)
	case ByDuration:
		t14, _, err := o.DurationGradient(radiusRatio)
		if err != nil {
			return Elements{}, err
		}
		e.Size = t14
	}
	return e, nil
}

// Jacobian returns the orbit and the derivatives of its Period, MidTransit,
// AxisRatio, Inclination, e cos ω and e sin ω, a row each, by the elements'
// Period, MidTransit, Size, Tilt, Shape[0], Shape[1] and RadiusRatio. Together with
// [Path.VectorGradient] it gives the derivatives of a separation by the elements,
// see [Chain]. It is regular on circular orbits in every basis. Errors are those
// of [Elements.Orbit]; with an impact parameter also that the orbit is seen
// face-on.
func (e Elements) Jacobian() (Orbit, [6][7]float64, error) {
	var j [6][7]float64
	o, err := e.Orbit()
	if err != nil {
		return Orbit{}, j, err
	}
	if err := e.Basis.check(); err != nil {
		return Orbit{}, j, err
	}
	j[0][0], j[1][1] = 1, 1
	a, b := e.Shape[0], e.Shape[1]
	switch e.Basis.Shape {
	case ByPolar:
		sin, cos := math.Sincos(b)
		j[4][4], j[4][5], j[5][4], j[5][5] = cos, -a*sin, sin, a*cos
	case ByVector:
		j[4][4], j[5][5] = 1, 1
	case ByRoot:
		if size := math.Hypot(a, b); size > 0 {
			j[4][4], j[4][5] = size+a*a/size, a*b/size
			j[5][4], j[5][5] = a*b/size, size+b*b/size
		}
	}
	// Derivatives of the inclination: by the axis ratio, and with that held.
	var byAxis float64
	tilt := &j[3]
	if e.Basis.Tilt == ByInclination {
		tilt[3] = 1
	} else {
		sin, cos := math.Sincos(o.Inclination)
		if !(sin > 1e-9) {
			return Orbit{}, j, fmt.Errorf("orbit: the orbit is seen face-on, where the inclination has no derivative by the impact parameter")
		}
		p := o.Path()
		near, w := p.turning.near, &p.vector
		byAxis = cos / (sin * o.AxisRatio)
		tilt[3] = -1 / (o.AxisRatio * near * sin)
		for k := 4; k < 6; k++ {
			tilt[k] = cos / (sin * near) * (w.nearH*j[4][k] + w.nearK*j[5][k])
		}
	}
	axis := &j[2]
	switch e.Basis.Size {
	case ByAxisRatio:
		axis[2] = 1
	case ByDensity:
		axis[0], axis[2] = 2*o.AxisRatio/(3*o.Period), o.AxisRatio/(3*e.Size)
	case ByDuration:
		_, by, err := o.DurationGradient(e.RadiusRatio)
		if err != nil {
			return Orbit{}, j, err
		}
		axis[2], axis[6] = 1, -by[6]
		for k := range 6 {
			axis[k] -= by[0]*j[0][k] + by[3]*tilt[k] + by[4]*j[4][k] + by[5]*j[5][k]
		}
		for k := range axis {
			axis[k] /= by[2] + by[3]*byAxis
		}
	}
	for k := range tilt {
		tilt[k] += byAxis * axis[k]
	}
	return o, j, nil
}

// Chain returns the derivatives by elements of a quantity with the given
// derivatives by (Period, MidTransit, AxisRatio, Inclination, e cos ω, e sin ω):
// its product with a Jacobian.
func Chain(grad [6]float64, jacobian [6][7]float64) (by [7]float64) {
	for i, g := range grad {
		for k := range by {
			by[k] += g * jacobian[i][k]
		}
	}
	return by
}
