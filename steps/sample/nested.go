package sample

import (
	"fmt"
	"math"

	"rimlight/steps/chain"
)

const (
	defaultLive = 500
	leastLive   = 20
	mostLive    = 100_000
	// nestedRest is the share of the evidence that may be left among the live
	// points when they stop shrinking: it is added, so that it only has to be small
	// enough for its own error not to matter.
	nestedRest = 1e-3
	// slicesEach is the number of slices that a new point takes for each parameter,
	// and leastSlices at least. Fewer leave it too near to where it began, which
	// biases the evidence; the tests hold both.
	slicesEach  = 3
	leastSlices = 6
	// sliceWidth is the width of a slice at first, in root mean square distances of
	// two live points along a direction, which are √2 standard deviations each: some
	// six standard deviations.
	sliceWidth = 4
	mostShrink = 200 // of one slice
)

// NestedSettings says how to run [Nested]. The zero value is sound.
type NestedSettings struct {
	Seed        uint64 // of all random numbers
	Stream      int    // which stream of them; from 0
	Live        int    // live points; 0 for 500. The error of the evidence goes as 1 / √Live, the cost as Live
	Slices      int    // slices from one point to the next; 0 for 3 for each parameter, at least 6
	Evaluations int    // of the likelihood, at most; 0 for 10,000,000
}

// Evidence is the outcome of nested sampling beside its draws.
type Evidence struct {
	LogZ        float64 // natural logarithm of the evidence, the mean of the likelihood over the prior
	Err         float64 // standard error of LogZ; see Nested for what it leaves out
	Information float64 // of the likelihood, in natural units: the prior is exp(Information) times as wide as the posterior
	Live        int     // live points
	Iterations  int     // points that were replaced
	Evaluations int     // of the likelihood
	Undefined   int     // evaluations that gave NaN or +Inf, which were taken for zero
	RankP       float64 // probability of ranks of new points as uneven as these, if they were drawn as they should be
	Stuck       int     // slices that found no other point
}

// Nested integrates a likelihood over a prior by nested sampling (Skilling 2006):
// live points from the prior shrink towards the peaks of the likelihood, the worst
// one being replaced, time and again, by a new one that is better. The volume of
// the prior that they fill shrinks by a known factor each time, on average; the
// sum of the likelihoods of the points replaced, times the volumes lost, is the
// evidence, and by these terms they are draws from the posterior.
//
// logLikelihood gets parameters. prior turns numbers between 0 and 1, one for each
// parameter, into parameters, and is increasing in each in turn: a vector of
// quantiles, see [NormalQuantile] and those beside it. When it is nil, the prior
// is flat between the limits of each parameter, which must then be finite; limits
// are not used otherwise.
//
// A new point begins as a copy of a live one and moves by slice sampling (Neal
// 2003, without stepping out) in the unit cube, along differences of pairs of
// other live points, which follow scales, correlations and, mostly, several modes.
// Ties of the likelihood are broken at random. Err combines the scatter of the
// shrinkage factors, √(Information / Live), with that of the share of the prior
// where the likelihood is zero. It does not know how the numbers of live points in
// separate modes drift while they shrink, which matters for a mode that begins with
// few: runs of several streams show it, and more live points lessen it. Nor does it
// know of new points that have stayed near the ones they began from: try twice the
// Slices.
//
// Errors: parameters without names or ranges; nil functions; settings outside
// their ranges; a prior that gives another number of parameters, or parameters
// that are not finite; more evaluations than allowed.
func Nested(parameters []Parameter, prior func(u []float64) []float64, logLikelihood func(x []float64) float64, settings NestedSettings) (chain.Weighted, Evidence, error) {
	const what = "nested sampling"
	fail := func(err error) (chain.Weighted, Evidence, error) {
		return chain.Weighted{}, Evidence{}, fmt.Errorf("%s: %w", what, err)
	}
	if err := checkParameters(parameters); err != nil {
		return fail(err)
	}
	if logLikelihood == nil {
		return fail(errNoTarget)
	}
	s := settings.filled(len(parameters))
	if err := s.check(len(parameters)); err != nil {
		return fail(err)
	}
	if prior == nil {
		for _, p := range parameters {
			if lo, hi := p.limits(); math.IsInf(hi-lo, 0) {
				return fail(fmt.Errorf("parameter %.40s has no finite range; expected one, or a prior", p.Name))
			}
		}
	}
	n := newNest(parameters, prior, logLikelihood, s)
	if err := n.fill(); err != nil {
		return fail(err)
	}
	if err := n.shrink(); err != nil {
		return fail(err)
	}
	w, e := n.result()
	return w, e, nil
}

func (s NestedSettings) filled(parameters int) NestedSettings {
	s.Live, s.Slices = otherwise(s.Live, defaultLive), otherwise(s.Slices, max(leastSlices, slicesEach*parameters))
	s.Evaluations = otherwise(s.Evaluations, 10*defaultEvaluations)
	return s
}

func (s NestedSettings) check(parameters int) error {
	switch {
	case s.Stream < 0 || s.Stream > math.MaxInt32:
		return fmt.Errorf("stream %d; expected 0 to %d", s.Stream, math.MaxInt32)
	case s.Live < max(leastLive, 2*parameters) || s.Live > mostLive:
		return fmt.Errorf("%d live points; expected %d to %d, for %d parameters", s.Live, max(leastLive, 2*parameters), mostLive, parameters)
	case s.Slices < 1 || s.Slices > 100*mostParameters:
		return fmt.Errorf("%d slices for a point; expected 1 to %d", s.Slices, 100*mostParameters)
	case s.Evaluations < 1 || s.Evaluations > mostEvaluations:
		return fmt.Errorf("%d evaluations; expected 1 to %d", s.Evaluations, mostEvaluations)
	}
	return nil
}
