package orbit

import (
	"fmt"
	"math"
)

// Eclipse describes how the planet passes behind the star.
type Eclipse struct {
	After           float64  // time from a mid-transit to the mid-eclipse (superior conjunction) that follows, days
	Phase           float64  // After in periods
	ImpactParameter float64  // separation at mid-eclipse, stellar radii
	Contacts        Contacts // days since mid-eclipse; its Transit says whether there is an eclipse, its Full whether it is total
}

// Eclipse returns the eclipse of a planet of the given radius in stellar radii,
// ≥ 0. With [Orbit].StarRadius, After includes the time that light takes from
// behind the star: about 2 a/c for a circular orbit. For small e,
// e cos ω ≈ π/2 (Phase - 1/2) and e sin ω is the difference of the durations of
// eclipse and transit over their sum (Winn 2010, eq. 33 and 34; numbers from
// memory). It is an error when the orbit is not valid.
func (o Orbit) Eclipse(radiusRatio float64) (Eclipse, error) {
	if err := o.Validate(); err != nil {
		return Eclipse{}, err
	}
	if !(radiusRatio >= 0) || math.IsInf(radiusRatio, 1) {
		return Eclipse{}, fmt.Errorf("orbit: the radius ratio is %g, must be finite and not negative", radiusRatio)
	}
	after := o.Path().timeAt(math.Pi)
	behind := o.path(true)
	return Eclipse{
		After: after, Phase: after / o.Period,
		ImpactParameter: math.Abs(o.AxisRatio * math.Cos(o.Inclination) * behind.turning.near),
		Contacts:        behind.Contacts(radiusRatio),
	}, nil
}
