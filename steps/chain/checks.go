package chain

import (
	"fmt"
	"math"

	"rimlight/steps/check"
)

// Limits of the checks; see the package comment.
const (
	mostRHat            = 1.01
	leastESS            = 400
	leastEnergyFraction = 0.3
)

// Checks holds chains against the limits of the package comment: the largest
// R-hat and the smallest effective sample sizes of the parameters, each naming
// the parameter, and, of Hamiltonian samplers, divergences and energy fraction.
// Evaluations of the target that gave NaN or +Inf fail a check too. prefix says
// whose chains they are ("white light"); it may be empty.
func Checks(prefix string, d Draws) []check.Check {
	if prefix != "" {
		prefix += ": "
	}
	const (
		rhat    = "R-hat of the worst parameter"
		bulk    = "bulk effective sample size of the worst parameter"
		tail    = "tail effective sample size of the worst parameter"
		whyRHat = "chains that have not met do not show the posterior"
		whyBulk = "too few independent draws for a mean, a median or a diagnosis"
		whyTail = "too few independent draws for the ends of an interval"
	)
	summaries, err := Summaries(d)
	if err != nil {
		return []check.Check{check.NotComputed(prefix+rhat, err.Error(), whyRHat)}
	}
	worst := func(of func(s Summary) float64, sign float64) (value float64, why string) {
		at := 0
		for i, s := range summaries {
			v, known := of(s), of(summaries[at])
			if math.IsNaN(known) {
				break
			}
			if math.IsNaN(v) || sign*v > sign*known {
				at = i
			}
		}
		value = of(summaries[at])
		if math.IsNaN(value) {
			return value, fmt.Sprintf("; the draws of %.40s are all equal", summaries[at].Name)
		}
		return value, fmt.Sprintf("; it is that of %.40s", summaries[at].Name)
	}
	value, which := worst(func(s Summary) float64 { return s.RHat }, 1)
	out := []check.Check{check.AtMost(prefix+rhat, value, mostRHat, "", whyRHat+which)}
	value, which = worst(func(s Summary) float64 { return s.BulkESS }, -1)
	out = append(out, check.AtLeast(prefix+bulk, value, leastESS, "", whyBulk+which))
	value, which = worst(func(s Summary) float64 { return s.TailESS }, -1)
	out = append(out, check.AtLeast(prefix+tail, value, leastESS, "", whyTail+which))
	out = append(out, check.AtMost(prefix+"evaluations without a density", float64(d.Undefined), 0, "",
		"NaN or +Inf from the target was taken for zero density, which may hide a part of the posterior"))
	return append(out, hamiltonianChecks(prefix, d)...)
}

// hamiltonianChecks are those of the trajectories, none for other samplers. The
// shape of d was checked.
func hamiltonianChecks(prefix string, d Draws) []check.Check {
	var out []check.Check
	if len(d.Divergent) > 0 {
		count := 0
		for _, divergent := range d.Divergent {
			if divergent {
				count++
			}
		}
		out = append(out, check.AtMost(prefix+"divergent trajectories", float64(count), 0, "",
			"near them the posterior is too sharply curved for the step size, and the draws miss a part of it"))
	}
	if len(d.Energy) > 0 {
		const name, why = "energy fraction (E-BFMI) of the worst chain", "where it is small the chain moves too slowly between the levels of the density to see its tails"
		fractions, err := EnergyFraction(d.Energy, d.Chains)
		if err != nil {
			return append(out, check.NotComputed(prefix+name, err.Error(), why))
		}
		least := math.Inf(1)
		for _, f := range fractions {
			least = math.Min(least, f)
		}
		out = append(out, check.AtLeast(prefix+name, least, leastEnergyFraction, "", why))
	}
	return out
}

// ImportanceChecks holds the logarithms of importance ratios, before smoothing,
// against the limits of the package comment: k-hat, and the effective sample size
// of the smoothed weights. prefix says whose they are; it may be empty.
func ImportanceChecks(prefix string, logRatio []float64) []check.Check {
	if prefix != "" {
		prefix += ": "
	}
	const (
		shape     = "Pareto k-hat of the importance ratios"
		size      = "effective sample size of the weights"
		whyShape  = "above it a few draws decide the result, and more draws hardly help: the proposal is too unlike the posterior"
		whyWeight = "too few draws have any weight"
	)
	weight, k, err := ParetoSmooth(logRatio)
	if err != nil {
		return []check.Check{check.NotComputed(prefix+shape, err.Error(), whyShape)}
	}
	out := []check.Check{check.AtMost(prefix+shape, k, MostParetoK(len(logRatio)), "", whyShape)}
	ess, err := WeightESS(weight)
	if err != nil {
		return append(out, check.NotComputed(prefix+size, err.Error(), whyWeight))
	}
	return append(out, check.AtLeast(prefix+size, ess, leastESS, "", whyWeight))
}
