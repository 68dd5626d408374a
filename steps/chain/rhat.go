package chain

import (
	"fmt"
	"math"
)

// RHat is the potential scale reduction of a column of draws: the root of the
// variance that all chains together have over that within chains, 1 when they
// tell the same. It is the rank-normalised split R-hat of Vehtari et al. (2021):
// each chain is cut in halves, so that a drift shows; draws are replaced by
// normal scores of their ranks, so that heavy tails do not hide a difference;
// and the greater of the value for the draws and that for their distances from
// the median is taken, so that chains of different width show.
//
// Errors: chains of fewer than 8 draws or of different lengths; draws that are
// not finite, or all equal.
func RHat(x []float64, chains int) (float64, error) { return NestedRHat(x, chains, 1) }

// NestedRHat is [RHat] for many chains: group of them, one after another, are taken
// together and compared with other groups (Margossian et al. 2024), since R-hat of
// chains which are each worth few draws is great even if they have met. Errors: a
// group that does not divide the number of chains; those of RHat.
func NestedRHat(x []float64, chains, group int) (float64, error) {
	const what = "potential scale reduction R-hat"
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("%s: %w", what, err)
	}
	if group < 1 || chains%group != 0 {
		return 0, fmt.Errorf("%s: groups of %d of %d chains; expected a number that divides that of the chains", what, group, chains)
	}
	halves, count := split(x, chains)
	return nestedRHat(x, rankNormalise(halves), chains, count, group), nil
}

// nestedRHat takes the draws, and the normal scores of their halves.
func nestedRHat(x, scores []float64, chains, count, group int) float64 {
	folded, _ := split(fold(x), chains)
	location := scaleReduction(pool(scores, count, group), count/group)
	return math.Max(location, scaleReduction(pool(rankNormalise(folded), count, group), count/group))
}

// pool puts the first halves of each group of chains together, and the second ones.
func pool(halves []float64, count, group int) []float64 {
	if group == 1 {
		return halves
	}
	n := len(halves) / count
	out := make([]float64, 0, len(halves))
	for from := 0; from < count; from += 2 * group {
		for half := range 2 {
			for c := range group {
				at := (from + 2*c + half) * n
				out = append(out, halves[at:at+n]...)
			}
		}
	}
	return out
}

// scaleReduction is the R-hat of Gelman & Rubin (1992), infinite for chains that
// do not vary in themselves but differ, 1 when all draws are equal.
func scaleReduction(x []float64, chains int) float64 {
	n := len(x) / chains
	means := make([]float64, chains)
	within := 0.0
	for c := range chains {
		mean, variance := meanVariance(x[c*n : (c+1)*n])
		means[c] = mean
		within += variance / float64(chains)
	}
	_, between := meanVariance(means) // B / n of the paper
	if between == 0 && within == 0 {
		return 1
	}
	return math.Sqrt(float64(n-1)/float64(n) + between/within)
}
