package compress

import (
	"fmt"

	"rimlight/steps/limb"
)

// mostTerms bounds the terms of a law.
const mostTerms = 3

// A law is a limb-darkening law whose intensity is a sum of terms with weights linear
// in the coefficients: I = Σ (base + Σ u_i slope_i) term, divided by a mean linear in
// them too, 1 + Σ u_i norm_i.
type law struct {
	name  string
	count int   // coefficients
	terms []int // indices of the terms among those of transit.CurveTerms
	slope [2][mostTerms]float64
	norm  [2]float64
	share float64 // of the star in all the light
}

// newLaw knows the laws of up to two coefficients that are linear in both.
func newLaw(name string) (law, error) {
	switch name {
	case limb.Uniform:
		return law{name: name, terms: []int{0}}, nil
	case limb.Linear:
		return law{name: name, count: 1, terms: []int{0, 1}, slope: [2][mostTerms]float64{{-1, 1}}, norm: [2]float64{-1. / 3}}, nil
	case limb.Quadratic:
		return law{name: name, count: 2, terms: []int{0, 1, 2}, slope: [2][mostTerms]float64{{-1, 1}, {-1, 2, -1}}, norm: [2]float64{-1. / 3, -1. / 6}}, nil
	case limb.SquareRoot:
		return law{name: name, count: 2, terms: []int{0, 1, 3}, slope: [2][mostTerms]float64{{-1, 1}, {-1, 0, 1}}, norm: [2]float64{-1. / 3, -1. / 5}}, nil
	case limb.Logarithmic:
		return law{name: name, count: 2, terms: []int{0, 1, 3}, slope: [2][mostTerms]float64{{-1, 1}, {0, 0, -1}}, norm: [2]float64{-1. / 3, 2. / 9}}, nil
	}
	return law{}, fmt.Errorf("the %.40s law of limb darkening is not linear in its coefficients; expected uniform, linear, quadratic, square-root or logarithmic", name)
}

// weights sets gamma to the weights of the terms over the mean intensity, as far as the
// light is the star's, and by to
// their derivatives in the coefficients; it reports whether the star gives light.
func (l *law) weights(u *[2]float64, gamma *[mostTerms]float64, by *[2][mostTerms]float64) bool {
	mean := 1 + u[0]*l.norm[0] + u[1]*l.norm[1]
	if !(mean > 0) {
		return false
	}
	inverse := l.share / mean
	for n := range gamma {
		g := u[0]*l.slope[0][n] + u[1]*l.slope[1][n]
		if n == 0 {
			g++
		}
		gamma[n] = g * inverse
	}
	for i := range by {
		for n := range gamma {
			by[i][n] = l.slope[i][n]*inverse - gamma[n]*l.norm[i]/mean
		}
	}
	return true
}
