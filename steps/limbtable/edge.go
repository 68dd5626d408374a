package limbtable

import (
	"fmt"
	"math"
)

// SteepestEdge returns the distance from the centre of the disc, in radii of the
// table's disc, at which the intensity of a profile falls fastest with distance:
// half-way between the two neighbouring mu with the largest slope. Models of
// spherical atmospheres give intensities out to the top of the atmosphere, beyond
// the edge that a transit sees; this is what [Choice].Edge asks for (as of Espinoza
// & Jordán 2015, MNRAS 450, 1879; from memory). For plane models it is next to 1
// and of no use. It is an error when the profile is not as its type says.
func SteepestEdge(p Profile) (float64, error) {
	if err := p.check(); err != nil {
		return 0, fmt.Errorf("edge of the disc: %w", err)
	}
	edge, steepest := 1.0, math.Inf(-1)
	for i := 1; i < len(p.Mu); i++ {
		inner, outer := radius(p.Mu[i]), radius(p.Mu[i-1])
		if slope := (p.Intensity[i] - p.Intensity[i-1]) / (outer - inner); slope > steepest {
			edge, steepest = (inner+outer)/2, slope
		}
	}
	return edge, nil
}

// radius returns the distance from the centre of the disc at mu.
func radius(mu float64) float64 { return math.Sqrt((1 - mu) * (1 + mu)) }

// within returns the part of a profile inside an edge, with mu counted from there.
func (p Profile) within(edge float64) Profile {
	out := Profile{Lo: p.Lo, Hi: p.Hi, Wave: p.Wave}
	for i, mu := range p.Mu {
		// 1 - r²/edge² without cancellation near the centre.
		square := (mu*mu - (1-edge)*(1+edge)) / (edge * edge)
		if mu == 1 {
			square = 1
		}
		if square >= 0 {
			out.Mu, out.Intensity = append(out.Mu, math.Sqrt(square)), append(out.Intensity, p.Intensity[i])
		}
	}
	return out
}

// mostIntensity bounds what a profile may hold, relative to the centre.
const mostIntensity = 1e6

// check reports a profile that is not as its type says.
func (p Profile) check() error {
	n := len(p.Mu)
	if n < 2 || len(p.Intensity) != n {
		return fmt.Errorf("the profile has %d values of mu and %d intensities, expected as many and at least 2", n, len(p.Intensity))
	}
	for i, mu := range p.Mu {
		if !(mu >= 0 && mu <= 1) || i > 0 && !(mu > p.Mu[i-1]) || !(p.Intensity[i] >= 0 && p.Intensity[i] <= mostIntensity) {
			return fmt.Errorf("the profile has intensity %g at mu %g after %g, expected mu increasing from 0 to 1 and intensities from 0 to %g", p.Intensity[i], mu, p.Mu[max(i-1, 0)], mostIntensity)
		}
	}
	if p.Mu[n-1] != 1 || p.Intensity[n-1] != 1 {
		return fmt.Errorf("the profile ends with intensity %g at mu %g, expected 1 at 1", p.Intensity[n-1], p.Mu[n-1])
	}
	return nil
}
