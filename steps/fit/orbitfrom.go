package fit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"rimlight/steps/check"
	"rimlight/steps/lightcurve"
)

// Where the orbit comes from that channels are fitted with, for [WhiteOrbit].
const (
	OrbitFitted    = "fitted"    // from the white light curve; its uncertainty is shared by all channels
	OrbitPublished = "published" // from the model, as if exact
	OrbitTested    = "tested"    // published, unless the white light curve contradicts it
)

// leastChance is the chance below which a published orbit is taken to be
// contradicted: rare enough that a right orbit is dropped once in a hundred
// visits. Common practice, no source.
const leastChance = 0.01

// WhiteOrbit fits a white light curve as [White] does, and decides which axis
// ratio and inclination (or impact parameter) the channels are to be held at:
// the fitted ones, or those of the model ("published"), with everything else
// fitted to go with them.
//
// The two are compared by a likelihood ratio: the chi-square that holding the
// published values costs, divided by the reduced chi-square of the free fit
// where that is above 1, is held against the chi-square distribution with as
// many degrees of freedom as values are held (Wilks 1938). With "tested" the
// published orbit is used when the chance is at least 0.01. The check carries
// the chance; it fails only for a published orbit that was asked for and is
// contradicted. Where the priors leave neither of the two free there is nothing
// to decide, and the chance is 1.
//
// Errors: those of White; an orbitFrom that is none of the three.
func WhiteOrbit(curve lightcurve.Curve, model Model, orbitFrom string) (Posterior, CurveFit, check.Check, error) {
	if orbitFrom != OrbitFitted && orbitFrom != OrbitPublished && orbitFrom != OrbitTested {
		return Posterior{}, CurveFit{}, check.Check{}, fmt.Errorf("white fit: the orbit is to come from %.40q; expected fitted, published or tested", orbitFrom)
	}
	free, freeFit, err := White(curve, model)
	if err != nil {
		return Posterior{}, CurveFit{}, check.Check{}, err
	}
	verdict := check.Check{Name: "published orbit: chance of a misfit as large", Value: 1, Passed: true,
		Why: "a wrong axis ratio or inclination bends every channel's transit the same way"}
	published, dropped := model, 0
	published.White, dropped = withoutOrbit(model.White)
	if dropped == 0 {
		verdict.Limit = "nothing to test, the priors hold the orbit"
		return free, freeFit, verdict, nil
	}
	held, heldFit, err := White(curve, published)
	if err != nil {
		return Posterior{}, CurveFit{}, check.Check{}, fmt.Errorf("with the published orbit: %w", err)
	}
	cost := (held.Chi2 - free.Chi2) / math.Max(1, free.Chi2/float64(free.Dof))
	verdict.Value = distuv.ChiSquared{K: float64(dropped)}.Survival(math.Max(0, cost))
	fits := verdict.Value >= leastChance
	switch orbitFrom {
	case OrbitPublished:
		verdict.Limit, verdict.Passed = fmt.Sprintf("at least %g", leastChance), fits
		return held, heldFit, verdict, nil
	case OrbitTested:
		if fits {
			verdict.Limit = fmt.Sprintf("at least %g: the published orbit is used", leastChance)
			return held, heldFit, verdict, nil
		}
		verdict.Limit = fmt.Sprintf("below %g: the fitted orbit is used", leastChance)
		return free, freeFit, verdict, nil
	}
	verdict.Limit = "none: the fitted orbit is used"
	return free, freeFit, verdict, nil
}

// withoutOrbit takes the rows out of a priors table that leave axis ratio and
// inclination free, and counts them.
func withoutOrbit(priors Priors) (kept Priors, dropped int) {
	for _, p := range priors {
		switch p.Name {
		case "axisRatio", "stellarDensity", "duration", "inclination", "impact":
			if p.Kind != Fixed {
				dropped++
				continue
			}
		}
		kept = append(kept, p)
	}
	return kept, dropped
}
