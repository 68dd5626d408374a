package sample

import (
	"math"
	"slices"

	"rimlight/steps/chain"
	"rimlight/steps/check"
)

// Limits of [EvidenceChecks].
const (
	leastRankP     = 1e-3 // of a thousand sound runs one fails
	leastNestedESS = 400  // as of chains (Vehtari et al. 2021)
)

// EvidenceChecks holds nested sampling against what it should look like. The rank
// of a new point among the live ones is as often low as high if new points are
// drawn from all of the prior above the worst point, as they should; uneven ranks
// mean a wrong evidence (Fowlie, Handley & Su 2020); even ones do not prove a right
// one, see [Nested]. The draws should be worth 400
// of equal weight. Evaluations that gave NaN or +Inf fail a check. prefix says
// whose evidence it is; it may be empty.
func EvidenceChecks(prefix string, w chain.Weighted, e Evidence) []check.Check {
	if prefix != "" {
		prefix += ": "
	}
	const (
		size    = "effective sample size of the weights"
		whySize = "too few draws for the ends of an interval; take more live points"
	)
	out := []check.Check{
		check.AtLeast(prefix+"probability of ranks of new points as uneven as these", e.RankP, leastRankP, "",
			"new points do not fill the prior above the worst point, and the evidence is wrong; take more slices"),
		check.AtMost(prefix+"evaluations without a likelihood", float64(e.Undefined), 0, "",
			"NaN or +Inf from the likelihood was taken for zero, which may hide a part of the posterior"),
	}
	ess, err := chain.WeightESS(w.LogWeight)
	if err != nil {
		return append(out, check.NotComputed(prefix+size, err.Error(), whySize))
	}
	return append(out, check.AtLeast(prefix+size, ess, leastNestedESS, "", whySize))
}

// uniformRanks is the probability of ranks from 0 to count - 1 as uneven as these,
// by the test of Kolmogorov and Smirnov with the approximation of Stephens (1970);
// 1 when there are none.
func uniformRanks(ranks []int, count int) float64 {
	if len(ranks) == 0 {
		return 1
	}
	sorted := slices.Clone(ranks)
	slices.Sort(sorted)
	n := float64(len(ranks))
	distance := 0.0
	for i, r := range sorted {
		at := (float64(r) + 0.5) / float64(count)
		distance = max(distance, float64(i+1)/n-at, at-float64(i)/n)
	}
	// What lies within half a rank of the step is not known.
	distance = max(0, distance-0.5/float64(count))
	root := math.Sqrt(n)
	z := (root + 0.12 + 0.11/root) * distance
	if z < 0.2 { // the series converges slowly, to 1
		return 1
	}
	sum, sign := 0.0, 1.0
	for j := 1.0; j <= 100; j++ {
		sum += sign * math.Exp(-2*j*j*z*z)
		sign = -sign
	}
	return min(max(2*sum, 0), 1)
}
