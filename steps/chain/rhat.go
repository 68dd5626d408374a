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
func RHat(x []float64, chains int) (float64, error) {
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("potential scale reduction R-hat: %w", err)
	}
	folded := fold(x)
	x, count := split(x, chains)
	folded, _ = split(folded, chains)
	return math.Max(scaleReduction(rankNormalise(x), count), scaleReduction(rankNormalise(folded), count)), nil
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
