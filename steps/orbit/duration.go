package orbit

import (
	"fmt"
	"math"
)

// Duration returns the time from first to fourth contact and from second to
// third contact, in days, for a planet of the given radius in stellar radii,
// ≥ 0; each is 0 if there are no such contacts. Exact, see [Path.Contacts].
func (o Orbit) Duration(radiusRatio float64) (t14, t23 float64) {
	c := o.Path().Contacts(radiusRatio)
	return c.Fourth - c.First, c.Third - c.Second
}

// DurationGradient returns the duration from first to fourth contact, in days,
// and its derivatives by (Period, MidTransit, AxisRatio, Inclination, e cos ω,
// e sin ω, radius ratio); that by MidTransit is 0. It is an error when the orbit
// is not valid, radiusRatio not finite and ≥ 0, there is no transit, or the planet
// touches the star beside it, where contacts are not seen. The derivatives grow
// without bound towards orbits whose transits just graze.
func (o Orbit) DurationGradient(radiusRatio float64) (t14 float64, grad [7]float64, err error) {
	if err := o.Validate(); err != nil {
		return 0, grad, err
	}
	if !(radiusRatio >= 0) || math.IsInf(radiusRatio, 1) {
		return 0, grad, fmt.Errorf("orbit: the radius ratio is %g, must be finite and not negative", radiusRatio)
	}
	p := o.Path()
	c := p.Contacts(radiusRatio)
	if !c.Transit {
		return 0, grad, fmt.Errorf("orbit: there is no transit at an impact parameter of %g and a radius ratio of %g", o.ImpactParameter(), radiusRatio)
	}
	for _, side := range []float64{-1, 1} {
		if s, _ := p.separationAt(side, 0); !(s >= (1+radiusRatio)*(1+radiusRatio)) {
			return 0, grad, fmt.Errorf("orbit: the planet touches the star beside it, %.6g stellar radii from its centre; the transit has no duration", math.Sqrt(s))
		}
	}
	for i, at := range []float64{c.First, c.Fourth} {
		sign := float64(2*i - 1)
		// The separation is 1 + radiusRatio at the contact, whatever the parameters.
		_, _, by := p.VectorGradient(at, at)
		rate := -by[1]
		by[1] = 0
		for k, d := range by {
			grad[k] -= sign * d / rate
		}
		grad[6] += sign / rate
	}
	return c.Fourth - c.First, grad, nil
}

// axisRatioOf returns the semi-major axis, in stellar radii, of the orbit whose
// transit from first to fourth contact takes the given time. at gives the orbit
// at an axis ratio: with which it must be valid from least up.
func axisRatioOf(duration, radiusRatio, least float64, at func(axisRatio float64) Orbit) (float64, error) {
	take := func(axisRatio float64) float64 {
		t14, _ := at(axisRatio).Duration(radiusRatio)
		return t14
	}
	// The duration falls with the axis ratio, nearly as its inverse.
	longest := take(least)
	if !(duration > 0 && duration <= longest) {
		return 0, fmt.Errorf("orbit: no orbit has a transit of %g days; with these other parameters it lasts more than 0 and at most %.6g", duration, longest)
	}
	low, high := least, least
	for take(high) > duration {
		low, high = high, 2*high
		if high > maxAxisRatio {
			return 0, fmt.Errorf("orbit: a transit of %g days asks for an axis ratio above %g", duration, maxAxisRatio)
		}
	}
	if low == high {
		return low, nil
	}
	// Without a transit there is no logarithm.
	for take(high) == 0 {
		middle := low + (high-low)/2
		if middle == low || middle == high {
			return low, nil
		}
		if take(middle) > duration {
			low = middle
		} else {
			high = middle
		}
	}
	x := root(func(x float64) float64 { return math.Log(take(math.Exp(x)) / duration) }, math.Log(low), math.Log(high))
	return math.Exp(x), nil
}
