// Package spectrum holds transmission spectra: transit depth as a function of
// wavelength, with its uncertainty and the channels that gave none.
package spectrum

import "rimlight/steps/lightcurve"

// A Point is the result of one channel's light-curve fit.
//
// A channel that could not be measured keeps its place: Depth and the other
// measured numbers are NaN, and Flag says why.
type Point struct {
	Channel        lightcurve.Channel
	Depth          float64   // (planet radius / stellar radius)^2, a pure number
	DepthErr       float64   // one standard deviation
	RadiusRatio    float64   // planet radius / stellar radius
	RadiusRatioErr float64   // one standard deviation
	Limb           []float64 // limb-darkening coefficients used or fitted (u1, u2 of the quadratic law)
	LimbErr        []float64 // their standard deviations; 0 where held fixed
	Chi2           float64   // of the fit, with the errors as given
	Dof            int       // degrees of freedom of the fit
	Used           int       // samples fitted
	Masked         int       // samples left out
	Scatter        float64   // standard deviation of the relative residuals of one integration
	ShiftGeometry  []float64 // derivative of Depth in each held geometry parameter of the white fit, in the order of its free parameters; empty when unknown
	Flag           string    // why there is no depth, or what is doubtful; empty when good
}

// Good reports whether the point holds a measured depth.
func (p Point) Good() bool { return p.DepthErr > 0 && p.Depth == p.Depth }

// A Spectrum is an assembled transmission spectrum, channels in order of
// increasing wavelength.
type Spectrum struct {
	Points []Point
	Cov    [][]float64 // covariance of the depths, rows and columns as Points; NaN where a point has none
	Law    string      // limb-darkening law of the fits
	Policy string      // how limb darkening was treated: "free", "fixed" or "prior"
}
