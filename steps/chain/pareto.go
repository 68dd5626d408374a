package chain

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"
)

// leastTail is the fewest ratios that a Pareto distribution is fitted to
// (Vehtari et al. 2024).
const leastTail = 5

// alike is the difference of logarithms below which ratios count as equal: what
// rounding leaves of a proposal that is the target.
const alike = 1e-9

// ParetoSmooth turns the logarithms of importance ratios, log target - log
// proposal up to a constant, into logarithms of weights that sum to 1: the
// largest ratios are replaced by expected order statistics of the generalised
// Pareto distribution that fits them best, and none exceeds the largest ratio
// (Pareto-smoothed importance sampling, Vehtari et al. 2024). A ratio of -Inf is
// a draw of no weight.
//
// k is the shape of that distribution, k-hat. Above 1/2 the ratios have no finite
// variance; above [MostParetoK] neither weights nor their effective sample size
// can be believed. It is +Inf when there are too few ratios to tell, fewer than
// 25, or when one of them outweighs all others beyond what numbers can hold, and
// -1, as for a uniform distribution, when the largest are equal to nine digits.
//
// Errors: no ratios; NaN or +Inf; no ratio above -Inf.
func ParetoSmooth(logRatio []float64) (logWeight []float64, k float64, err error) {
	most, err := checkWeights(logRatio)
	if err != nil {
		return nil, 0, fmt.Errorf("importance ratios: %w", err)
	}
	s := len(logRatio)
	logWeight = make([]float64, s)
	for i, r := range logRatio {
		logWeight[i] = r - most
	}
	k = math.Inf(1)
	if tail := min(s/5, int(math.Ceil(3*math.Sqrt(float64(s))))); tail >= leastTail {
		top := largest(logWeight, tail+1)
		k = smoothTail(logWeight, top[1:], logWeight[top[0]])
	}
	normaliseLog(logWeight)
	return logWeight, k, nil
}

// smoothTail smooths the weights at tail, which lists them in increasing order
// and of which the last is exp(0); exp(logCut) is the largest weight below.
func smoothTail(logWeight []float64, tail []int, logCut float64) (k float64) {
	if logWeight[tail[0]] > -alike {
		return -1
	}
	cut := math.Exp(logCut)
	excess := make([]float64, len(tail))
	for i, j := range tail {
		if cut > 0 {
			excess[i] = cut * math.Expm1(logWeight[j]-logCut)
		} else {
			excess[i] = math.Exp(logWeight[j])
		}
	}
	k, scale := fitPareto(excess)
	if k-k != 0 {
		return k
	}
	for i, j := range tail {
		p := (float64(i) + 0.5) / float64(len(tail))
		logWeight[j] = math.Min(0, math.Log(cut+paretoQuantile(p, k, scale)))
	}
	return k
}

// largest lists the n largest of x in increasing order.
func largest(x []float64, n int) []int {
	increasing := func(i, j int) int { return cmp.Or(cmp.Compare(x[i], x[j]), i-j) }
	var top []int
	least := math.Inf(-1) // nothing below is among them
	for i, v := range x {
		if v < least {
			continue
		}
		if top = append(top, i); len(top) == 2*n {
			slices.SortFunc(top, increasing)
			top = append(top[:0], top[n:]...)
			least = x[top[0]]
		}
	}
	slices.SortFunc(top, increasing)
	return top[len(top)-n:]
}

// MostParetoK is the limit of k-hat for a number of draws, above which they are
// too few: 1 - 1/log10(draws), and never more than 0.7 (Vehtari et al. 2024).
func MostParetoK(draws int) float64 {
	if draws <= 1 {
		return math.Inf(-1)
	}
	return math.Min(1-1/math.Log10(float64(draws)), 0.7)
}

// fitPareto fits the generalised Pareto distribution of the density
// (1 + k x / scale)^(-1/k - 1) / scale to increasing numbers above 0, by the
// posterior mean of Zhang & Stephens (2009) and with a prior on k worth 10
// numbers at 1/2 (Vehtari et al. 2024). k is +Inf when more than a quarter of the
// numbers are 0 beside the largest.
func fitPareto(x []float64) (k, scale float64) {
	n := float64(len(x))
	quartile, largest := x[max(int(n/4+0.5), 1)-1], x[len(x)-1]
	points := 30 + int(math.Sqrt(n))
	theta, like := make([]float64, points), make([]float64, points)
	shape := func(theta float64) float64 {
		sum := 0.0
		for _, v := range x {
			sum += math.Log1p(-theta * v)
		}
		return sum / n
	}
	most := math.Inf(-1)
	for j := range theta {
		theta[j] = 1/largest + (1-math.Sqrt(float64(points)/(float64(j)+0.5)))/(3*quartile)
		k := shape(theta[j])
		like[j] = n * (math.Log(-theta[j]/k) - k - 1)
		if like[j]-like[j] != 0 { // theta is 0 or infinite
			like[j] = math.Inf(-1)
		}
		most = math.Max(most, like[j])
	}
	var sum, mean float64
	for j := range theta {
		if like[j] == math.Inf(-1) {
			continue
		}
		w := math.Exp(like[j] - most)
		sum += w
		mean += w * theta[j]
	}
	mean /= sum
	k = shape(mean)
	scale = -k / mean
	if math.IsNaN(scale) || math.IsInf(scale, 0) {
		return math.Inf(1), 0
	}
	return (k*n + 5) / (n + 10), scale
}

// paretoQuantile is the quantile at p of the distribution of [fitPareto].
func paretoQuantile(p, k, scale float64) float64 {
	if k == 0 {
		return -scale * math.Log1p(-p)
	}
	return scale * math.Expm1(-k*math.Log1p(-p)) / k
}

// checkWeights gives the largest of logarithms of weights, or what is wrong with
// them.
func checkWeights(logWeight []float64) (most float64, err error) {
	if len(logWeight) == 0 {
		return 0, errors.New("there are none; expected at least one")
	}
	most = math.Inf(-1)
	for i, w := range logWeight {
		if math.IsNaN(w) || math.IsInf(w, 1) {
			return 0, fmt.Errorf("logarithm %d is %g; expected finite numbers, or -Inf for no weight", i+1, w)
		}
		most = math.Max(most, w)
	}
	if math.IsInf(most, -1) {
		return 0, errors.New("all are 0; expected some weight")
	}
	return most, nil
}

// normaliseLog makes the weights sum to 1. The largest is near 0.
func normaliseLog(logWeight []float64) {
	sum := 0.0
	for _, w := range logWeight {
		sum += math.Exp(w)
	}
	log := math.Log(sum)
	for i := range logWeight {
		logWeight[i] -= log
	}
}
