package chain

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mathext"
)

// leastLength is the shortest chain that is looked at: two halves of which each
// has a variance and an autocovariance.
const leastLength = 8

// checkColumn is the error for a column that chains cannot have.
func checkColumn(x []float64, chains int) error {
	switch {
	case chains < 1 || len(x)%max(chains, 1) != 0:
		return fmt.Errorf("%d draws in %d chains; expected at least one chain, and chains of the same length", len(x), chains)
	case len(x)/chains < leastLength:
		return fmt.Errorf("chains of %d draws; expected at least %d", len(x)/chains, leastLength)
	}
	for i, v := range x {
		if v-v != 0 {
			return fmt.Errorf("draw %d of chain %d is %g; expected finite numbers", i%(len(x)/chains)+1, i/(len(x)/chains)+1, v)
		}
	}
	if slices.Min(x) == slices.Max(x) {
		return errConstant
	}
	return nil
}

var errConstant = errors.New("all draws are equal")

// split cuts each chain in two halves, which are chains of their own; the middle
// draw of an odd number is dropped.
func split(x []float64, chains int) (halves []float64, count int) {
	n := len(x) / chains
	if n%2 == 0 {
		return x, 2 * chains
	}
	halves = make([]float64, 0, len(x)-chains)
	for c := range chains {
		halves = append(halves, x[c*n:c*n+n/2]...)
		halves = append(halves, x[c*n+n/2+1:(c+1)*n]...)
	}
	return halves, 2 * chains
}

// rankNormalise replaces each of x by the normal quantile of its rank r among S,
// at (r - 3/8) / (S + 1/4) (Blom 1958; Vehtari et al. 2021, eq. 14). Equal
// numbers share the mean of their ranks.
func rankNormalise(x []float64) []float64 {
	order := make([]int, len(x))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(i, j int) int { return cmp.Compare(x[i], x[j]) })
	out := make([]float64, len(x))
	for from := 0; from < len(x); {
		to := from + 1
		for to < len(x) && x[order[to]] == x[order[from]] {
			to++
		}
		rank := float64(from+to+1) / 2
		z := mathext.NormalQuantile((rank - 0.375) / (float64(len(x)) + 0.25))
		for _, i := range order[from:to] {
			out[i] = z
		}
		from = to
	}
	return out
}

// fold replaces each of x by its distance from the median.
func fold(x []float64) []float64 {
	sorted := slices.Clone(x)
	slices.Sort(sorted)
	median := quantile(sorted, 0.5)
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = math.Abs(v - median)
	}
	return out
}

// quantile interpolates between the order statistics of sorted numbers: that at
// position p (n-1), from 0 (definition 7 of Hyndman & Fan 1996).
func quantile(sorted []float64, p float64) float64 {
	at := p * float64(len(sorted)-1)
	i := min(int(at), len(sorted)-1)
	lo := sorted[i]
	hi := sorted[min(i+1, len(sorted)-1)]
	share := at - float64(i)
	return lo*(1-share) + hi*share
}

// meanVariance gives the mean of x and its variance with the divisor n - 1.
func meanVariance(x []float64) (mean, variance float64) {
	for _, v := range x {
		mean += v
	}
	mean /= float64(len(x))
	for _, v := range x {
		variance += (v - mean) * (v - mean)
	}
	return mean, variance / float64(len(x)-1)
}
