package sample

import (
	"fmt"
	"math"
	"math/rand/v2"

	"rimlight/steps/chain"
)

// A StudentT is a multivariate t distribution, which has heavier tails than a
// normal one: the proposal of [Importance].
type StudentT struct {
	Mean    []float64
	Scale   [][]float64 // that of a normal distribution with its core: Degrees / (Degrees - 2) less than its covariance
	Degrees float64     // of freedom, above 0; 5 is usual
}

// Importance draws n times from a proposal, and weighs each draw by the ratio of
// the target to it. The weights are smoothed ([chain.ParetoSmooth]); logRatio is
// what they were before, for [chain.ImportanceChecks] and the evidence
// ([chain.LogMeanWeight]). Draws outside the limits of the parameters have no
// weight. f gives the logarithm of the density of the target at x.
//
// Errors: parameters without names or ranges; a nil target; a proposal whose
// lengths differ from the parameters', whose numbers are not finite, or whose
// scale is not positive definite; n that is not from 1 to 1,000,000; no draw with
// weight.
func Importance(parameters []Parameter, f func(x []float64) float64, proposal StudentT, n int, seed uint64) (w chain.Weighted, logRatio []float64, err error) {
	const what = "importance sampling"
	fail := func(err error) (chain.Weighted, []float64, error) {
		return chain.Weighted{}, nil, fmt.Errorf("%s: %w", what, err)
	}
	if err := checkParameters(parameters); err != nil {
		return fail(err)
	}
	if f == nil {
		return fail(errNoTarget)
	}
	dim := len(parameters)
	if n < 1 || n > mostDraws || n > chain.MostNumbers/dim {
		return fail(fmt.Errorf("%d draws; expected 1 to %d", n, min(mostDraws, chain.MostNumbers/dim)))
	}
	factor, err := proposal.factor(dim)
	if err != nil {
		return fail(err)
	}
	w.Names, w.Units = namesAndUnits(parameters)
	w.X = make([]float64, n*dim)
	w.LogDensity = make([]float64, n)
	logRatio = make([]float64, n)
	e := newEvaluator(f, dim, n)
	rng := rand.New(rand.NewPCG(seed, streamImportance))
	constant := proposal.logDensity(factor)
	z := make([]float64, dim)
	for i := range n {
		square := 0.0
		for k := range z {
			z[k] = rng.NormFloat64()
			square += z[k] * z[k]
		}
		stretch := math.Sqrt(proposal.Degrees / chiSquared(rng, proposal.Degrees))
		x := w.X[i*dim : (i+1)*dim]
		copy(x, proposal.Mean)
		factor.add(x, stretch, z)
		logRatio[i], w.LogDensity[i] = math.Inf(-1), math.Inf(-1)
		inside := true
		for k, p := range parameters {
			inside = inside && x[k]-x[k] == 0 && p.inside(x[k])
		}
		if !inside {
			continue
		}
		if w.LogDensity[i], err = e.value(x, nil); err != nil {
			return fail(err)
		}
		logRatio[i] = w.LogDensity[i] - constant + (proposal.Degrees+float64(dim))/2*math.Log1p(square*stretch*stretch/proposal.Degrees)
	}
	if w.LogWeight, _, err = chain.ParetoSmooth(logRatio); err != nil {
		return fail(fmt.Errorf("of %d draws: %w", n, err))
	}
	return w, logRatio, nil
}

// logDensity is the logarithm of the density at the mean.
func (p StudentT) logDensity(factor metric) float64 {
	n := float64(factor.n)
	above, _ := math.Lgamma((p.Degrees + n) / 2)
	below, _ := math.Lgamma(p.Degrees / 2)
	log := above - below - n/2*math.Log(math.Pi*p.Degrees)
	for k := range factor.n {
		log -= math.Log(factor.factor[factor.diagonal(k)])
	}
	return log
}

// factor is the Cholesky factor of the scale.
func (p StudentT) factor(n int) (metric, error) {
	m := metric{n: n, dense: true}
	if len(p.Mean) != n {
		return m, fmt.Errorf("a proposal with a mean of %d numbers; expected one for each of %d parameters", len(p.Mean), n)
	}
	for k, x := range p.Mean {
		if x-x != 0 {
			return m, fmt.Errorf("a proposal with the mean %g of parameter %d; expected finite numbers", x, k+1)
		}
	}
	if !(p.Degrees > 0) || math.IsInf(p.Degrees, 1) {
		return m, fmt.Errorf("a proposal of %g degrees of freedom; expected a number above 0", p.Degrees)
	}
	var err error
	if m.factor, err = flatCovariance(p.Scale, n); err != nil {
		return m, err
	}
	if !cholesky(m.factor, n) {
		return m, errCovariance
	}
	return m, nil
}

// chiSquared draws from the chi-squared distribution: twice a gamma variate of half
// its degrees (Marsaglia & Tsang 2000), which is never 0.
func chiSquared(rng *rand.Rand, degrees float64) float64 {
	shape, boost := degrees/2, 1.0
	if shape < 1 {
		boost = math.Pow(1-rng.Float64(), 1/shape)
		shape++
	}
	d := shape - 1.0/3
	c := 1 / math.Sqrt(9*d)
	for {
		z := rng.NormFloat64()
		v := 1 + c*z
		if v <= 0 {
			continue
		}
		v = v * v * v
		if math.Log(1-rng.Float64()) < z*z/2+d-d*v+d*math.Log(v) {
			return max(2*d*v*boost, math.SmallestNonzeroFloat64)
		}
	}
}
