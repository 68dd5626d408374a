package diagnose

import (
	"fmt"
	"strings"

	"rimlight/steps/check"
	"rimlight/steps/fit"
	"rimlight/steps/spectrum"
)

// Limits of the checks; see the package comment.
const (
	leastMeasured  = 0.8  // share of channels with a depth
	mostDoubtful   = 0.1  // share of measured channels with a flag
	leastChi2      = 0.8  // reduced chi-square, and the square of the scatter in units of the errors
	mostChi2       = 1.3  //
	mostBeta       = 1.5  // of one light curve: beta of a few bin sizes of a dozen bins is itself uncertain by 10-20%
	mostMedianBeta = 1.3  // of the median channel, which is less uncertain
	mostMasked     = 0.1  // share of the samples of channels that were fitted
	shortestBin    = 10.0 // minutes; correlated noise on the scale of ingress and egress is what biases a depth
	longestBin     = 30.0 // minutes
)

// SpectrumChecks looks at a spectrum as a whole: the share of channels that have
// a depth, the share of those that are flagged as doubtful (a parameter at a
// bound, for example), and the median reduced chi-square of the fits.
func SpectrumChecks(s spectrum.Spectrum) []check.Check {
	const (
		measured = "channels with a depth"
		doubtful = "channels with a depth that is flagged"
		quality  = "median reduced chi-square of the channels"
	)
	var good, flagged int
	var chi2 []float64
	for _, p := range s.Points {
		if !p.Good() {
			continue
		}
		good++
		if p.Flag != "" {
			flagged++
		}
		if c := p.ReducedChi2(); finite(c) {
			chi2 = append(chi2, c)
		}
	}
	if len(s.Points) == 0 {
		return []check.Check{check.NotComputed(measured, "the spectrum is empty", "without channels there is no spectrum")}
	}
	out := []check.Check{check.AtLeast(measured, float64(good)/float64(len(s.Points)), leastMeasured, "",
		"channels lost in numbers point to a wrong mask, wrong columns or wrong start values")}
	if good == 0 {
		return out
	}
	out = append(out, check.AtMost(doubtful, float64(flagged)/float64(good), mostDoubtful, "",
		"limb darkening or a depth at a bound in many channels makes errors too small"))
	if len(chi2) == 0 {
		return append(out, check.NotComputed(quality, "no channel has degrees of freedom", "errors that do not match the residuals give wrong errors of the depths"))
	}
	return append(out, check.Between(quality, median(chi2), leastChi2, mostChi2, "",
		"errors that do not match the residuals give wrong errors of the depths"))
}

// ResidualChecks looks at what the fits leave over: of the white light curve,
// the mean square of residual over error and beta in bins of 10 to 30 minutes; of
// the channels, the median of both, and the share of masked samples in channels
// that were fitted. Channels without a single fitted sample are passed over. See
// [TimeAveraging] for beta.
func ResidualChecks(white fit.CurveFit, channels []Summary) []check.Check {
	const (
		whiteScatter   = "white light: mean square residual in units of the errors"
		whiteBeta      = "white light: scatter in bins of 10 to 30 min in units of white noise"
		channelScatter = "channels: median mean square residual in units of the errors"
		channelBeta    = "channels: median scatter in bins of 10 to 30 min in units of white noise"
		masked         = "masked samples in channels that were fitted"
		whyScatter     = "residuals larger than the errors mean a wrong model or wrong errors; smaller ones, too many terms"
		whyBeta        = "noise correlated over minutes makes the errors of the depth too small by about this factor"
		whyMasked      = "a mask that takes much away may take the signal"
	)
	var out []check.Check
	if scatter, err := ResidualScatter(white); err != nil {
		out = append(out, check.NotComputed(whiteScatter, err.Error(), whyScatter))
	} else {
		out = append(out, check.Between(whiteScatter, scatter.Ratio*scatter.Ratio, leastChi2, mostChi2, "", whyScatter))
	}
	if beta, err := TimeAveraging(white, shortestBin, longestBin); err != nil {
		out = append(out, check.NotComputed(whiteBeta, err.Error(), whyBeta))
	} else {
		out = append(out, check.AtMost(whiteBeta, beta.Value, mostBeta, "", whyBeta))
	}
	var ratios, betas []float64
	lost, all := 0, 0
	reason := "no channel was fitted"
	for _, c := range channels {
		if !c.Fitted() {
			continue
		}
		lost += c.Scatter.Masked
		all += c.Samples()
		if finite(c.Scatter.Ratio) {
			ratios = append(ratios, c.Scatter.Ratio*c.Scatter.Ratio)
		}
		if finite(c.Beta.Value) {
			betas = append(betas, c.Beta.Value)
		}
		reason = "no channel has residuals enough, and errors, for it"
	}
	if len(ratios) == 0 {
		out = append(out, check.NotComputed(channelScatter, reason, whyScatter))
	} else {
		out = append(out, check.Between(channelScatter, median(ratios), leastChi2, mostChi2, "", whyScatter))
	}
	if len(betas) == 0 {
		out = append(out, check.NotComputed(channelBeta, reason, whyBeta))
	} else {
		out = append(out, check.AtMost(channelBeta, median(betas), mostMedianBeta, "", whyBeta))
	}
	if all == 0 {
		return append(out, check.NotComputed(masked, reason, whyMasked))
	}
	return append(out, check.AtMost(masked, float64(lost)/float64(all), mostMasked, "", whyMasked))
}

// FitChecks looks at one fit, named by what ("white light"): whether the
// optimiser converged, whether every free parameter has an error, and the reduced
// chi-square. What the fit itself warned of is said beside its convergence.
func FitChecks(what string, p fit.Posterior) []check.Check {
	prefix := what
	if prefix != "" {
		prefix += ": "
	}
	converged := check.Check{
		Name:   prefix + "iterations to convergence",
		Value:  float64(p.Iterations),
		Limit:  "the fit ends converged",
		Passed: p.Status == "converged",
		Why:    "a fit that stopped early has neither the best values nor their errors",
	}
	if !converged.Passed {
		converged.Limit += fmt.Sprintf("; it ended %.40q", p.Status)
	}
	if len(p.Warnings) > 0 {
		converged.Why += "; the fit warned: " + strings.Join(p.Warnings, "; ")
	}
	undetermined := 0
	for i := range p.Names {
		if i >= len(p.Err) || !(p.Err[i] > 0) || !finite(p.Err[i]) {
			undetermined++
		}
	}
	out := []check.Check{converged, check.AtMost(prefix+"parameters without an error", float64(undetermined), 0, "",
		"a parameter that the data do not determine should be held fixed or given a prior")}
	const why = "a model that fits, with errors that match the noise, has about 1"
	if p.Dof <= 0 {
		return append(out, check.NotComputed(prefix+"reduced chi-square", "no degrees of freedom", why))
	}
	return append(out, check.Between(prefix+"reduced chi-square", p.Chi2/float64(p.Dof), leastChi2, mostChi2, "", why))
}
