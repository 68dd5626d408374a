package transit

import (
	"fmt"
	"math"

	"rimlight/steps/orbit"
)

// EclipseParams describe the light of a planet that passes behind its star: that
// of a disc of even brightness.
type EclipseParams struct {
	Orbit       orbit.Orbit
	RadiusRatio float64 // radius of the planet in stellar radii, above 0
	Depth       float64 // light of the planet in units of the star's, finite
	Exposure    float64 // length of one exposure, seconds; 0 = instantaneous; shorter than half the period
	Companion   float64 // light of other stars in the same measurement, in units of the star's, ≥ 0
}

// Arguments names what [EclipseGradient] has derivatives by, in their order.
func (p EclipseParams) Arguments() []string {
	return []string{"Period", "MidTransit", "AxisRatio", "Inclination", "Eccentricity", "Periastron", "RadiusRatio", "Depth", "Companion"}
}

// Validate returns nil for parameters that a curve can be computed with, or an
// error naming the first that is wrong and its valid range.
func (p EclipseParams) Validate() error {
	if err := p.Orbit.Validate(); err != nil {
		return fmt.Errorf("transit: %w", err)
	}
	switch {
	case !(p.RadiusRatio > 0) || math.IsInf(p.RadiusRatio, 1):
		return fmt.Errorf("transit: RadiusRatio is %g, must be finite and above 0", p.RadiusRatio)
	case p.Depth-p.Depth != 0:
		return fmt.Errorf("transit: Depth is %g, must be finite", p.Depth)
	case !(p.Exposure >= 0 && p.Exposure/secondsPerDay < p.Orbit.Period/2):
		return fmt.Errorf("transit: Exposure is %g s, must be 0 or more and shorter than half the period of %g days", p.Exposure, p.Orbit.Period)
	case !(p.Companion >= 0) || math.IsInf(p.Companion, 1):
		return fmt.Errorf("transit: Companion is %g, must be finite and not negative", p.Companion)
	}
	return nil
}

// Eclipse returns the flux at the given times, days on the scale of
// Orbit.MidTransit, relative to that without the planet: 1 while it is behind the
// star and 1 + Depth/(1+Companion) while none of it is. With an exposure the flux
// is averaged over it with an error below 1e-8 of the depth. It returns an error
// for invalid parameters or a time that is not finite.
func Eclipse(times []float64, p EclipseParams) ([]float64, error) {
	flux, _, err := EclipseGradient(times, p)
	return flux, err
}

// EclipseGradient returns the flux of [Eclipse] and its derivatives: a slice as
// long as times for each of [EclipseParams.Arguments].
func EclipseGradient(times []float64, p EclipseParams) (flux []float64, grad [][]float64, err error) {
	if err := p.Validate(); err != nil {
		return nil, nil, err
	}
	grad = make([][]float64, len(p.Arguments()))
	for k := range grad {
		grad[k] = make([]float64, len(times))
	}
	flux = make([]float64, len(times))
	path, exposure, share := p.Orbit.Path(), p.Exposure/secondsPerDay, 1/(1+p.Companion)
	for i, t := range times {
		if t-t != 0 {
			return nil, nil, fmt.Errorf("transit: times[%d] is %g, must be a finite time in days", i, t)
		}
		since, elapsed := path.Fold(t)
		visible := 1.0
		add := func(since, elapsed, weight float64) {
			z, front, byOrbit := path.SeparationGradient(since, elapsed)
			hidden, byR, byZ := 0.0, 0.0, 0.0
			if !front {
				hidden, byR, byZ = eclipsed(p.RadiusRatio, z)
			}
			visible -= weight * hidden
			weight *= p.Depth * share
			for k, by := range byOrbit {
				grad[k][i] -= weight * byZ * by
			}
			grad[orbital][i] -= weight * byR
		}
		if exposure == 0 {
			add(since, elapsed, 1)
		} else {
			value := func(at float64) float64 {
				if z, front := path.Separation(at); !front {
					hidden, _, _ := eclipsed(p.RadiusRatio, z)
					return hidden
				}
				return 0
			}
			halve(since-exposure/2, since+exposure/2, averageTolerance*exposure, value, func(at, weight float64) {
				add(at, elapsed-since+at, weight/exposure)
			})
		}
		flux[i] = 1 + p.Depth*share*visible
		grad[orbital+1][i] = share * visible
		grad[orbital+2][i] = -p.Depth * share * share * visible
	}
	return flux, grad, nil
}

// eclipsed returns which share of a planet's disc is behind the star, and its
// derivatives by the radius and the separation.
func eclipsed(r, z float64) (hidden, byR, byZ float64) {
	var d deficits
	d.cover(&profile{}, r, z, nil)
	area := r * r
	hidden = d.value[0] / area
	return min(1, hidden), (d.byR[0] - 2*hidden*r) / area, d.byZ[0] / area
}
