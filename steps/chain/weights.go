package chain

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
)

// Weighted draws are samples of a posterior that do not count alike: of
// importance and of nested sampling.
type Weighted struct {
	Names      []string  // of the parameters
	Units      []string  // FITS-standard unit string of each; may be empty
	X          []float64 // parameter p of draw i is X[i*len(Names)+p]
	LogWeight  []float64 // natural logarithm of each draw's weight, up to a constant; -Inf for none
	LogDensity []float64 // of the target, or of the likelihood from nested sampling; may be empty
}

// Check reports the first thing about the shape of w that does not fit.
func (w Weighted) Check() error {
	p, n := len(w.Names), len(w.LogWeight)
	switch {
	case p == 0:
		return errors.New("weighted draws without parameters; expected at least one name")
	case len(w.X) > MostNumbers || len(w.X)/p != n || len(w.X)%p != 0:
		return fmt.Errorf("weighted draws have %d numbers for %d weights and %d parameters; expected one for each weight and parameter, at most %d", len(w.X), n, p, MostNumbers)
	case len(w.Units) != 0 && len(w.Units) != p:
		return fmt.Errorf("weighted draws have %d units; expected one for each of %d parameters, or none", len(w.Units), p)
	case len(w.LogDensity) != 0 && len(w.LogDensity) != n:
		return fmt.Errorf("weighted draws have %d log densities; expected %d, or none", len(w.LogDensity), n)
	}
	if _, err := checkWeights(w.LogWeight); err != nil {
		return fmt.Errorf("weights: %w", err)
	}
	return nil
}

// Column gives the draws of one parameter. Errors: a shape that does not fit; a
// name that is none of the parameters.
func (w Weighted) Column(name string) ([]float64, error) {
	if err := w.Check(); err != nil {
		return nil, err
	}
	p, err := find(w.Names, name)
	if err != nil {
		return nil, err
	}
	return column(w.X, len(w.Names), p), nil
}

// WeightESS is the number of draws of equal weight that weighted draws are worth,
// (Σ w)² / Σ w² (Kish 1965). It is an honest number only where the weights have a
// finite variance; see [ParetoSmooth]. Errors: no weights; NaN or +Inf; no weight
// above 0.
func WeightESS(logWeight []float64) (float64, error) {
	weight, err := weights(logWeight)
	if err != nil {
		return 0, fmt.Errorf("effective sample size of weights: %w", err)
	}
	return weightSize(weight), nil
}

func weightSize(weight []float64) float64 {
	squares := 0.0
	for _, w := range weight {
		squares += w * w
	}
	return 1 / squares
}

// LogMeanWeight is the natural logarithm of the mean of weights, and its standard
// error: of the ratios of an unnormalised target to a proposal, the evidence. The
// error is as honest as the effective sample size, √(1/ESS - 1/n) for n weights;
// see [WeightESS], also for errors.
func LogMeanWeight(logWeight []float64) (value, sd float64, err error) {
	most, err := checkWeights(logWeight)
	if err != nil {
		return 0, 0, fmt.Errorf("mean weight: %w", err)
	}
	var sum, squares float64
	for _, w := range logWeight {
		v := math.Exp(w - most)
		sum += v
		squares += v * v
	}
	n := float64(len(logWeight))
	return most + math.Log(sum/n), math.Sqrt(max(0, squares/sum/sum-1/n)), nil
}

// weights are the weights of those logarithms, with the sum 1.
func weights(logWeight []float64) ([]float64, error) {
	most, err := checkWeights(logWeight)
	if err != nil {
		return nil, err
	}
	out := make([]float64, len(logWeight))
	sum := 0.0
	for i, w := range logWeight {
		out[i] = math.Exp(w - most)
		sum += out[i]
	}
	for i := range out {
		out[i] /= sum
	}
	return out, nil
}

// WeightedQuantile is the quantile at p, from 0 to 1, of x, whose elements have
// those logarithms of weights: interpolated between neighbours, each of which
// stands at the middle of its weight (definition 5 of Hyndman & Fan 1996 for equal
// weights). Errors: lengths that differ; a p outside; numbers with weight that are
// not finite; and those of [WeightESS].
func WeightedQuantile(x, logWeight []float64, p float64) (float64, error) {
	const what = "weighted quantile"
	if len(x) != len(logWeight) {
		return 0, fmt.Errorf("%s: %d numbers and %d weights; expected as many", what, len(x), len(logWeight))
	}
	if !(p >= 0 && p <= 1) {
		return 0, fmt.Errorf("%s at %g; expected a number from 0 to 1", what, p)
	}
	weight, err := weights(logWeight)
	if err != nil {
		return 0, fmt.Errorf("%s: %w", what, err)
	}
	if err := checkFinite(x, weight); err != nil {
		return 0, fmt.Errorf("%s: %w", what, err)
	}
	return newDistribution(x, weight).quantile(p), nil
}

func checkFinite(x, weight []float64) error {
	for i, v := range x {
		if v-v != 0 && weight[i] > 0 {
			return fmt.Errorf("draw %d is %g; expected finite numbers", i+1, v)
		}
	}
	return nil
}

// A distribution is sorted numbers and where they stand between 0 and 1.
type distribution struct{ x, at []float64 }

// newDistribution sorts the numbers that have weight. The weights sum to 1.
func newDistribution(x, weight []float64) distribution {
	var order []int
	for i, w := range weight {
		if w > 0 {
			order = append(order, i)
		}
	}
	slices.SortFunc(order, func(i, j int) int { return cmp.Or(cmp.Compare(x[i], x[j]), i-j) })
	d := distribution{x: make([]float64, len(order)), at: make([]float64, len(order))}
	sum := 0.0
	for i, j := range order {
		d.x[i], d.at[i] = x[j], sum+weight[j]/2
		sum += weight[j]
	}
	return d
}

func (d distribution) quantile(p float64) float64 {
	i, _ := slices.BinarySearch(d.at, p)
	switch {
	case i == 0:
		return d.x[0]
	case i == len(d.at):
		return d.x[i-1]
	}
	share := (p - d.at[i-1]) / (d.at[i] - d.at[i-1])
	return d.x[i-1]*(1-share) + d.x[i]*share
}

// Resample draws n samples of equal weight from weighted ones, as one chain. Each
// is taken as often as its weight says, up to one more or less (systematic
// resampling, Kitagawa 1996), in random order. Samples of great weight are
// repeated, so that an effective sample size of the result means nothing: look at
// [WeightESS] of the weights. Errors: a shape that does not fit; an n that is not
// from 1 to [MostNumbers] over the number of parameters.
func Resample(w Weighted, n int, seed uint64) (Draws, error) {
	if err := w.Check(); err != nil {
		return Draws{}, fmt.Errorf("resampling: %w", err)
	}
	p := len(w.Names)
	if n < 1 || n > MostNumbers/p {
		return Draws{}, fmt.Errorf("resampling of %d draws; expected a number from 1 to %d", n, MostNumbers/p)
	}
	weight, err := weights(w.LogWeight)
	if err != nil {
		return Draws{}, fmt.Errorf("resampling: %w", err)
	}
	rng := rand.New(rand.NewPCG(seed, resampleStream))
	taken := make([]int, 0, n)
	sum, last, offset := 0.0, 0, rng.Float64()
	for i, share := range weight {
		if share > 0 {
			last = i
		}
		sum += share
		for len(taken) < n && float64(len(taken))+offset < sum*float64(n) {
			taken = append(taken, i)
		}
	}
	for len(taken) < n { // the sum was rounded
		taken = append(taken, last)
	}
	rng.Shuffle(n, func(i, j int) { taken[i], taken[j] = taken[j], taken[i] })
	d := Draws{Names: slices.Clone(w.Names), Units: slices.Clone(w.Units), Chains: 1, Length: n, X: make([]float64, 0, n*p)}
	for _, i := range taken {
		d.X = append(d.X, w.X[i*p:(i+1)*p]...)
		if len(w.LogDensity) > 0 {
			d.LogDensity = append(d.LogDensity, w.LogDensity[i])
		}
	}
	return d, nil
}

// resampleStream is the second half of the seed of [Resample].
const resampleStream = 0x7265736d706c65
