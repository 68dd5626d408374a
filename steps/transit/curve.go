package transit

import (
	"fmt"
	"math"

	"rimlight/steps/orbit"
)

// arguments is the number of parameters a curve has derivatives by: six of the
// orbit, the radius ratio and two limb-darkening coefficients.
const arguments = 9

// Params describe a light curve of one planet.
type Params struct {
	Orbit       orbit.Orbit
	RadiusRatio float64 // radius of the planet in stellar radii, ≥ 0
	U1, U2      float64 // limb-darkening coefficients, with 1 - U1/3 - U2/6 > 0
	Exposure    float64 // length of one exposure, seconds; 0 = instantaneous; shorter than half the period
}

// Validate returns nil for parameters that a curve can be computed with, or an
// error naming the first that is wrong and its valid range.
func (p Params) Validate() error {
	if err := p.Orbit.Validate(); err != nil {
		return fmt.Errorf("transit: %w", err)
	}
	switch {
	case !(p.RadiusRatio >= 0) || math.IsInf(p.RadiusRatio, 1):
		return fmt.Errorf("transit: RadiusRatio is %g, must be finite and not negative", p.RadiusRatio)
	case !newLaw(p.U1, p.U2).valid || 1-p.U1/3-p.U2/6 <= 0:
		return fmt.Errorf("transit: U1 is %g and U2 is %g, must be finite with 1 - U1/3 - U2/6 above 0, or the star gives no light", p.U1, p.U2)
	case !(p.Exposure >= 0 && p.Exposure/secondsPerDay < p.Orbit.Period/2):
		return fmt.Errorf("transit: Exposure is %g s, must be 0 or more and shorter than half the period of %g days", p.Exposure, p.Orbit.Period)
	}
	return nil
}

// Curve returns the relative flux at the given times, days on the scale of
// Orbit.MidTransit, one value for each; times are the middles of the exposures.
// The flux is 1 while the planet is behind the star. With an exposure the flux
// is averaged over it with an error below 1e-8. It returns an error
// for invalid parameters or a time that is not finite.
func Curve(times []float64, p Params) ([]float64, error) {
	c, err := newCurve(times, p)
	if err != nil {
		return nil, err
	}
	flux := make([]float64, len(times))
	for i, t := range times {
		since, _ := c.path.Fold(t)
		switch {
		case c.exposure > 0:
			flux[i] = c.average(since, 0, nil)
		case since < c.from || since > c.to:
			flux[i] = 1
		default:
			flux[i] = c.flux(since)
		}
	}
	return flux, nil
}

// CurveGradient returns the flux of [Curve] and its derivatives: nine slices as
// long as times, by (Period, MidTransit, AxisRatio, Inclination, Eccentricity,
// Periastron, RadiusRatio, U1, U2), angles in radians and times in days.
func CurveGradient(times []float64, p Params) (flux []float64, grad [][]float64, err error) {
	c, err := newCurve(times, p)
	if err != nil {
		return nil, nil, err
	}
	n := len(times)
	flux = make([]float64, n)
	all := make([]float64, arguments*n)
	grad = make([][]float64, arguments)
	for k := range grad {
		grad[k] = all[k*n : (k+1)*n : (k+1)*n]
	}
	var g [arguments]float64
	for i, t := range times {
		since, elapsed := c.path.Fold(t)
		switch {
		case c.exposure > 0:
			g = [arguments]float64{}
			flux[i] = c.average(since, elapsed, &g)
		case since < c.from || since > c.to:
			flux[i] = 1
			continue
		default:
			flux[i] = c.gradient(since, elapsed, &g)
		}
		for k := range grad {
			grad[k][i] = g[k]
		}
	}
	return flux, grad, nil
}

// curve holds what all samples of a light curve share.
type curve struct {
	path     *orbit.Path
	law      law
	radius   float64
	period   float64
	from, to float64 // days since mid-transit outside of which there is no transit
	exposure float64 // days
	pieces   []piece // of the transit, for averages over exposures
}

// newCurve validates the parameters and the times and prepares a curve.
func newCurve(times []float64, p Params) (*curve, error) {
	if err := p.Validate(); err != nil {
		return nil, err
	}
	for i, t := range times {
		if math.IsNaN(t) || math.IsInf(t, 0) {
			return nil, fmt.Errorf("transit: times[%d] is %g, must be a finite time in days", i, t)
		}
	}
	c := &curve{path: p.Orbit.Path(), law: newLaw(p.U1, p.U2), radius: p.RadiusRatio, period: p.Orbit.Period, exposure: p.Exposure / secondsPerDay}
	c.from, c.to = c.path.Window(1 + p.RadiusRatio)
	if c.exposure > 0 {
		c.split()
	}
	return c, nil
}

// flux returns the flux at a time since mid-transit.
func (c *curve) flux(since float64) float64 {
	z, front := c.path.Separation(since)
	if !front || z >= 1+c.radius {
		return 1
	}
	flux, _, _, _, _ := c.law.gradient(c.radius, z)
	return flux
}

// gradient returns the flux at a time since mid-transit and stores its
// derivatives in g; elapsed is the time since Orbit.MidTransit.
func (c *curve) gradient(since, elapsed float64, g *[arguments]float64) float64 {
	z, front, byOrbit := c.path.SeparationGradient(since, elapsed)
	if !front || z >= 1+c.radius {
		*g = [arguments]float64{}
		return 1
	}
	flux, dr, dz, du1, du2 := c.law.gradient(c.radius, z)
	for k, by := range byOrbit {
		g[k] = dz * by
	}
	g[6], g[7], g[8] = dr, du1, du2
	return flux
}
