package sample

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// mostStarts bounds the points of [Around], and the chains and walkers of a call.
const mostStarts = 10000

// Around gives n points to start chains or walkers from: normal numbers of the
// standard deviations sd about centre, within the limits, from the random numbers
// of seed. For chains, an sd wider than the posterior's makes R-hat a sharper test.
//
// Errors: parameters without names or ranges; lengths that differ; a centre
// outside the limits; an sd below 0; n that is not from 1 to 10000.
func Around(parameters []Parameter, centre, sd []float64, n int, seed uint64) ([][]float64, error) {
	const what = "starting points"
	if err := checkParameters(parameters); err != nil {
		return nil, fmt.Errorf("%s: %w", what, err)
	}
	if err := checkStart(parameters, centre); err != nil {
		return nil, fmt.Errorf("%s: %w", what, err)
	}
	if len(sd) != len(parameters) {
		return nil, fmt.Errorf("%s: %d standard deviations; expected one for each of %d parameters", what, len(sd), len(parameters))
	}
	for k, s := range sd {
		if !(s >= 0) || math.IsInf(s, 0) {
			return nil, fmt.Errorf("%s: a standard deviation of %g for %.40s; expected a finite number from 0 up", what, s, parameters[k].Name)
		}
	}
	if n < 1 || n > mostStarts {
		return nil, fmt.Errorf("%s: %d of them; expected 1 to %d", what, n, mostStarts)
	}
	rng := rand.New(rand.NewPCG(seed, streamStart))
	out := make([][]float64, n)
	for i := range out {
		out[i] = make([]float64, len(parameters))
		for k, p := range parameters {
			out[i][k] = centre[k]
			// Beyond the limits one tries again, ever nearer to the centre.
			for scale := 1.0; scale > 1e-3; scale *= 0.9 {
				if x := centre[k] + scale*sd[k]*rng.NormFloat64(); p.inside(x) && x-x == 0 {
					out[i][k] = x
					break
				}
			}
		}
	}
	return out, nil
}

// Second halves of seeds, of uses that are not chains: these have small ones.
const (
	streamStart      = 0x7374617274 << 20
	streamNested     = 0x6e6573746564 << 12
	streamImportance = 0x696d706f7274 << 12
)
