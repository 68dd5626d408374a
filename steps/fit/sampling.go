package fit

import (
	"fmt"
	"math"

	"rimlight/steps/check"
	"rimlight/steps/lightcurve"
)

const (
	defaultEffective = 4000
	mostEffective    = 20_000
	defaultCompared  = 6
	// comparedDraws is how many draws of a channel are held against the exact likelihood.
	comparedDraws = 30
)

// Sampling says how [Channels] samples. The zero value is sound.
type Sampling struct {
	Effective int    // draws of each channel that its weighted ones are to be worth; 0 for 4000, at most 20,000
	Seed      uint64 // of all random numbers
	Compared  int    // channels whose draws are held against the exact likelihood; 0 for 6, -1 for none
}

// check fills in defaults.
func (s *Sampling) check() error {
	if s.Effective == 0 {
		s.Effective = defaultEffective
	}
	if s.Compared == 0 {
		s.Compared = defaultCompared
	}
	switch {
	case s.Effective < 100 || s.Effective > mostEffective:
		return fmt.Errorf("%d effective draws; expected 100 to %d, or 0 for %d", s.Effective, mostEffective, defaultEffective)
	case s.Compared < -1:
		return fmt.Errorf("%d channels to compare; expected a number from 0 up, or -1 for none", s.Compared)
	}
	return nil
}

// An Interval is the posterior of one quantity, with equal-tailed intervals.
type Interval struct {
	Name   string
	Unit   string
	Mean   float64
	SD     float64 // standard deviation
	Lo95   float64 // quantile at 2.5 %
	Lo68   float64 // at 16 %
	Median float64
	Hi68   float64 // at 84 %
	Hi95   float64 // at 97.5 %
}

// A ChannelPosterior is what sampling says of one channel. That of a channel without a
// depth has no Quantities.
type ChannelPosterior struct {
	Channel    lightcurve.Channel
	Quantities []Interval // radiusRatio, depth, u1 and u2 as far as the law has them, settlingTime where it is free

	How       string  // how it was sampled: "importance sampling", or "ensemble of walkers" where that failed
	Draws     int     // kept
	Effective float64 // independent draws of equal weight that they are worth
	KHat      float64 // of the importance ratios (Vehtari et al. 2024); NaN of walkers
	RHat      float64 // of the walkers; NaN of importance sampling
	Reliable  bool    // whether k-hat, or R-hat, is below its limit

	Tables      int     // of deficits that cover the radius ratio
	TableError  float64 // of the light curves they give, in units of the noise: the root of the sum of squares over all samples
	Compared    int     // draws held against the exact likelihood
	ComparedSD  float64 // standard deviation of the difference of log likelihoods among them
	ShiftOfMean float64 // of the radius ratio that the exact likelihood would bring, in standard deviations

	RadiusRatio float64   // at the mode, as all that follows
	Limb        []float64 // coefficients of the law
	Settling    float64   // settling time, d; 0 without such a term
}

// Quantity is the interval of this name; its numbers are NaN when there is none.
func (p ChannelPosterior) Quantity(name string) Interval {
	for _, q := range p.Quantities {
		if q.Name == name {
			return q
		}
	}
	nan := math.NaN()
	return Interval{Name: name, Mean: nan, SD: nan, Lo95: nan, Lo68: nan, Median: nan, Hi68: nan, Hi95: nan}
}

// Limits of the checks of [SamplingChecks].
const (
	mostKHat      = 0.5  // above which the ratios have no finite variance (Vehtari et al. 2024)
	mostRHat      = 1.02 // of walkers
	mostCompareSD = 0.05 // of the log likelihood, which moves a quantile by less than a hundredth of a standard deviation
	mostShift     = 0.02 // standard deviations
)

// SamplingChecks holds the posteriors of channels against what sampling has to show:
// k-hat and effective draws of the worst channel, R-hat of the worst channel that walkers
// sampled, and the difference from the exact likelihood in the channels where that was
// computed. It gives no checks for no posteriors.
func SamplingChecks(posteriors []ChannelPosterior) []check.Check {
	var sampled, compared, walked int
	var k, rhat, sd, shift float64
	size := math.Inf(1)
	k = math.Inf(-1)
	var atK, atSize, atR, atSD int
	worse := func(x float64, worst *float64, channel int, at *int) {
		if !(x <= *worst) {
			*worst, *at = x, channel
		}
	}
	for _, p := range posteriors {
		if len(p.Quantities) == 0 {
			continue
		}
		sampled++
		if p.Effective < size {
			size, atSize = p.Effective, p.Channel.Index
		}
		if math.IsNaN(p.RHat) {
			worse(p.KHat, &k, p.Channel.Index, &atK)
		} else {
			walked++
			worse(p.RHat, &rhat, p.Channel.Index, &atR)
		}
		if p.Compared > 0 {
			compared++
			worse(p.ComparedSD, &sd, p.Channel.Index, &atSD)
			shift = math.Max(shift, math.Abs(p.ShiftOfMean))
		}
	}
	if sampled == 0 {
		return nil
	}
	var out []check.Check
	if sampled > walked {
		out = append(out, check.AtMost("channel posteriors: Pareto k-hat of the worst channel", k, mostKHat, "",
			fmt.Sprintf("above it a few draws decide the result; it is that of channel %d", atK)))
	}
	if walked > 0 {
		out = append(out, check.AtMost("channel posteriors: R-hat of the worst channel sampled by walkers", rhat, mostRHat, "",
			fmt.Sprintf("walkers that have not met do not show the posterior; it is that of channel %d, and %d of %d channels were sampled so", atR, walked, sampled)))
	}
	out = append(out, check.AtLeast("channel posteriors: effective draws of the worst channel", size, 1000, "",
		fmt.Sprintf("too few independent draws for the ends of an interval; it is that of channel %d", atSize)))
	if compared > 0 {
		out = append(out, check.AtMost("channel posteriors: scatter of the log likelihood about the exact one", sd, mostCompareSD, "",
			fmt.Sprintf("the likelihood is evaluated from tables, which must not change it; computed for draws of %d channels, worst in channel %d", compared, atSD)),
			check.AtMost("channel posteriors: shift of a mean radius ratio by the exact likelihood, in standard deviations", shift, mostShift, "",
				"as above"))
	}
	return out
}
