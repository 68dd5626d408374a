package fit

import (
	"fmt"
	"math"
	"runtime"
	"slices"
	"strings"
	"sync"
	"sync/atomic"

	"rimlight/steps/compress"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
	"rimlight/steps/spectrum"
	"rimlight/steps/transit"
)

// Channels samples the posteriors of spectroscopic channels with the orbit held at the
// white fit's values, as [Channel] fits them: free are the parameters of model.Channel,
// which are the radius ratio, limb darkening as model.LimbPolicy has it, and the settling
// time, and the coefficients of the trend, which are integrated over. errorScale in
// model.Channel, log-uniform, is integrated over between 0 and infinity; jitter can be
// held, but not free. Curves must have the same times and auxiliary columns. All cores are
// used; the result does not depend on how many there are, nor on which other channels a
// call is for.
//
// The likelihood is evaluated from tables made once for each channel or for all, at a
// cost that does not depend on the number of integrations; [SamplingChecks] shows by how
// much it differs from the exact one. Draws are weighted by importance, from t
// distributions about the modes at 16 or 32 settling times; where k-hat shows that they
// are unlike the posterior, walkers sample instead. The law of limb darkening is one
// linear in its coefficients, of which there are two at most: not power-2.
//
// A point has the means of the posterior and its standard deviations; Chi2, Scatter and
// ShiftGeometry are those at the mode. With model.Inflate, errors are multiplied by the
// root of the reduced chi-square there where that is above 1, and the channel sampled
// again. Channels that cannot be measured are as those of Channel. A Flag also says where
// the posterior could not be sampled well.
//
// Errors: those of Channel; curves with other times than the first; a law or a parameter
// that this method cannot have; settings out of range.
func Channels(curves []lightcurve.Curve, white Posterior, model Model, sampling Sampling) ([]spectrum.Point, []ChannelPosterior, error) {
	return channels(curves, white, model, sampling, false)
}

// channels is Channels; quick, for means and errors, without walkers.
func channels(curves []lightcurve.Curve, white Posterior, model Model, sampling Sampling, quick bool) ([]spectrum.Point, []ChannelPosterior, error) {
	b, err := newBatch(curves, white, model, sampling)
	if err != nil {
		return nil, nil, fmt.Errorf("channels: %w", err)
	}
	b.quick = quick
	points, posteriors := make([]spectrum.Point, len(curves)), make([]ChannelPosterior, len(curves))
	faults := make([]error, len(curves))
	b.each(func(i int) { points[i], posteriors[i], faults[i] = b.sample(i) })
	for i, err := range faults {
		if err != nil {
			return nil, nil, fmt.Errorf("%s: %w", whatChannel(curves[i].Channel), err)
		}
	}
	return points, posteriors, nil
}

// ChannelCurves are the light curves of channels beside the models at the modes of their
// posteriors, for the white fit and the model that [Channels] had. Trends are those that
// fit best with them. Errors: those of Channels; another number of posteriors than of
// curves.
func ChannelCurves(curves []lightcurve.Curve, posteriors []ChannelPosterior, white Posterior, model Model) ([]CurveFit, error) {
	if len(curves) != len(posteriors) {
		return nil, fmt.Errorf("channel curves: %d posteriors; expected one for each of %d curves", len(posteriors), len(curves))
	}
	b, err := newBatch(curves, white, model, Sampling{})
	if err != nil {
		return nil, fmt.Errorf("channel curves: %w", err)
	}
	out, faults := make([]CurveFit, len(curves)), make([]error, len(curves))
	b.each(func(i int) { out[i], faults[i] = b.curveFit(i, posteriors[i]) })
	for _, err := range faults {
		if err != nil {
			return nil, err
		}
	}
	return out, nil
}

// A batch is channels to be sampled.
type batch struct {
	curves     []lightcurve.Curve
	white      Posterior
	model      Model
	sampling   Sampling
	shared     *compress.Shared
	priors     []Priors // of each channel, limb darkening settled
	start      *space   // at the white fit's values
	whole      *space   // of the white fit
	star       compress.Star
	settling   float64 // held, d; 0 without one, NaN where it is free
	quick      bool    // without walkers
	scaled     bool    // the scale of the errors is integrated over
	finite     []bool  // integrations at which all columns are known
	inTransit  []bool
	directions [][7]float64
}

func newBatch(curves []lightcurve.Curve, white Posterior, model Model, sampling Sampling) (*batch, error) {
	b := &batch{curves: curves, white: white, model: model, sampling: sampling}
	if err := b.model.plain(); err != nil {
		return nil, err
	}
	if err := b.model.check(); err != nil {
		return nil, err
	}
	if err := b.sampling.check(); err != nil {
		return nil, err
	}
	if len(curves) == 0 {
		return b, nil
	}
	first := curves[0].Time
	for _, c := range curves {
		n := len(c.Time)
		if len(c.Flux) != n || len(c.Err) != n || len(c.Mask) != n {
			return nil, fmt.Errorf("%s has %d fluxes, %d errors and %d flags; expected one of each for %d times", whatChannel(c.Channel), len(c.Flux), len(c.Err), len(c.Mask), n)
		}
		if n == 0 || n != len(first) || &c.Time[0] != &first[0] && !slices.Equal(c.Time, first) {
			return nil, fmt.Errorf("%s has other times than the first channel; expected channels of one observation", whatChannel(c.Channel))
		}
	}
	for _, c := range curves {
		rows, _, err := limbRows(b.model.Channel, b.model, c.Channel, true)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", whatChannel(c.Channel), err)
		}
		b.priors = append(b.priors, rows)
	}
	var err error
	if b.start, b.whole, err = channelSpace(b.model, white, b.priors[0], nil); err != nil {
		return nil, err
	}
	if err := b.support(); err != nil {
		return nil, err
	}
	if err := b.share(); err != nil {
		return nil, err
	}
	return b, b.differentiate()
}

// support reports free parameters that tables are not made for.
func (b *batch) support() error {
	s := b.start
	for _, slot := range append(slices.Clone(s.free), s.noise...) {
		switch slot {
		case slotRadius, slotLimb1, slotLimb2, slotSettling:
		case slotErrorScale:
			if b.scaled = s.prior[slot].Kind == LogUniform; !b.scaled {
				return fmt.Errorf("errorScale has a prior of kind %s; expected logU, which is integrated over, or a value", s.prior[slot].Kind)
			}
		default:
			return fmt.Errorf("%s is free in channels, which the likelihood of this method cannot have; hold it, or use Channel", s.name[slot])
		}
	}
	if b.scaled && len(s.trend) > 0 {
		return fmt.Errorf("errorScale is free and coefficients of the trend have priors; expected one of the two")
	}
	return nil
}

// share prepares what channels have in common.
func (b *batch) share() error {
	v := b.start.value
	params, err := b.start.physical(&v)
	if err != nil {
		return err
	}
	b.star = compress.Star{Times: b.curves[0].Time, Orbit: params.Orbit, Exposure: params.Exposure, Law: b.model.LimbLaw, Companion: params.Companion}
	trend := b.model.Trend
	trend.SettlingTime = math.Exp(v[slotSettling])
	design, err := trend.Design(b.together())
	if err != nil {
		return err
	}
	n := len(b.star.Times)
	t := compress.Trend{Settling: trend.Settling, Start: design.Start, Least: leastSettling, Most: mostSettling}
	b.finite = make([]bool, n)
	for i := range b.finite {
		b.finite[i] = true
	}
	for k, column := range design.Columns {
		if k == design.Settling {
			continue
		}
		clean := slices.Clone(column)
		for i, x := range column {
			if !finite(x) {
				b.finite[i], clean[i] = false, 0
			}
		}
		t.Columns, t.Added = append(t.Columns, clean), append(t.Added, k >= design.Added)
	}
	b.settling = 0
	if trend.Settling {
		b.settling = trend.SettlingTime
		t.Settle = compress.Prior{Kind: compress.Fixed, A: trend.SettlingTime}
		if b.start.isFree(slotSettling) {
			b.settling = math.NaN()
			t.Settle = asPrior(b.start.prior[slotSettling], leastSettling, mostSettling)
		}
	}
	for _, p := range b.start.trend {
		k := slices.Index(design.Names, strings.TrimPrefix(p.Name, trendPrefix))
		switch {
		case k < 0:
			return fmt.Errorf("the trend has no term for the prior of %.40s; expected one of %s%s", p.Name, trendPrefix, strings.Join(design.Names, ", "+trendPrefix))
		case k == design.Settling:
			k = len(t.Columns) // it comes last
		case design.Settling >= 0 && k > design.Settling:
			k--
		}
		t.Normal = append(t.Normal, compress.Coefficient{Column: k, Mean: p.A, SD: p.B})
	}
	if b.shared, err = compress.NewShared(b.star, t); err != nil {
		return err
	}
	flux, err := transit.Curve(b.star.Times, params)
	if err != nil {
		return err
	}
	b.inTransit = make([]bool, n)
	for i, f := range flux {
		b.inTransit[i] = f < 1
	}
	return nil
}

// together is a curve whose samples are masked where those of all channels are.
func (b *batch) together() lightcurve.Curve {
	first := b.curves[0]
	out := lightcurve.Curve{Channel: first.Channel, Time: first.Time, Aux: first.Aux, Mask: slices.Clone(first.Mask)}
	for _, c := range b.curves[1:] {
		for i, flag := range c.Mask {
			out.Mask[i] &= flag
			if flag == 0 {
				out.Mask[i] = 0
			}
		}
	}
	return out
}

// asPrior turns a row of a table into a prior cut to what a parameter can be.
func asPrior(p Prior, least, most float64) compress.Prior {
	out := compress.Prior{A: p.A, B: p.B}
	switch p.Kind {
	case Uniform, LogUniform:
		out.Kind = compress.Uniform
		if p.Kind == LogUniform {
			out.Kind = compress.LogUniform
		}
		out.A, out.B = math.Max(p.A, least), math.Min(p.B, most)
	case Normal, TruncatedNormal:
		out.Kind, out.Lo, out.Hi = compress.TruncatedNormal, least, most
		if p.Kind == TruncatedNormal {
			out.Lo, out.Hi = math.Max(p.Lo, least), math.Min(p.Hi, most)
		}
		if math.IsInf(out.Lo, -1) && math.IsInf(out.Hi, 1) {
			out.Kind = compress.Normal
		}
	}
	return out
}

// parameters are those of channel i.
func (b *batch) parameters(i int) (compress.Parameters, *space, error) {
	s, _, err := channelSpace(b.model, b.white, b.priors[i], nil)
	if err != nil {
		return compress.Parameters{}, nil, err
	}
	p := compress.Parameters{Square: s.name[slotLimb1] == "q1"}
	lo, hi := s.allowed(slotRadius)
	p.Radius = asPrior(s.prior[slotRadius], lo, hi)
	for k, slot := range []int{slotLimb1, slotLimb2} {
		value, _ := s.named(slot, s.value[slot])
		p.Limb[k] = compress.Prior{Kind: compress.Fixed, A: value}
		if s.isFree(slot) {
			lo, hi := s.allowed(slot)
			p.Limb[k] = asPrior(s.prior[slot], lo, hi)
		}
	}
	return p, s, nil
}

// differentiate computes how the orbit changes with each parameter of the white fit.
func (b *batch) differentiate() error {
	elements := func(slot int, named float64) ([6]float64, error) {
		v := b.whole.value
		v[slot] = b.whole.coordinate(slot, named)
		o, err := b.whole.orbit(&v)
		return [6]float64{o.Period, o.MidTransit - b.star.Orbit.MidTransit, o.AxisRatio, o.Inclination, o.Eccentricity, o.Periastron}, err
	}
	b.directions = make([][7]float64, len(b.white.Names))
	for g, name := range b.white.Names {
		if isTrend(name) {
			continue
		}
		p, err := findName(name)
		if err != nil {
			return err
		}
		lo, hi := b.white.Value[g]-b.white.Err[g], b.white.Value[g]+b.white.Err[g]
		orbital := p.slot <= slotShape2 || p.slot == slotRadius && b.whole.name[slotSize] == "duration"
		settling := p.slot == slotSettling && !b.start.isFree(slotSettling)
		if !orbital && !settling || !(lo < hi) || math.IsInf(hi-lo, 0) {
			continue // a channel has its own, or nothing is known
		}
		if settling {
			b.directions[g][6] = 1
			continue
		}
		lo, hi = clipNamed(name, lo, hi)
		up, err := elements(p.slot, hi)
		if err != nil {
			return err
		}
		down, err := elements(p.slot, lo)
		if err != nil {
			return err
		}
		for k := range up {
			b.directions[g][k] = (up[k] - down[k]) / (hi - lo)
		}
	}
	return nil
}

// each calls use for all channels, on all cores.
func (b *batch) each(use func(i int)) {
	var next atomic.Int64
	var group sync.WaitGroup
	for range min(runtime.GOMAXPROCS(0), len(b.curves)) {
		group.Go(func() {
			for {
				i := int(next.Add(1)) - 1
				if i >= len(b.curves) {
					return
				}
				use(i)
			}
		})
	}
	group.Wait()
}

// unusable says why a channel cannot be measured, or nothing.
func (b *batch) unusable(used []bool) string {
	var in, out int
	for i, ok := range used {
		switch {
		case ok && b.inTransit[i]:
			in++
		case ok:
			out++
		}
	}
	switch {
	case in+out < leastSamples:
		return fmt.Sprintf("only %d usable samples; at least %d are needed", in+out, leastSamples)
	case in < leastInTransit:
		return fmt.Sprintf("only %d usable samples in transit; at least %d are needed", in, leastInTransit)
	case out < leastInTransit:
		return fmt.Sprintf("only %d usable samples out of transit; at least %d are needed", out, leastInTransit)
	}
	return ""
}

// curve is light curve i for the sampler.
func (b *batch) curve(i int) (*compress.Curve, error) {
	p, s, err := b.parameters(i)
	if err != nil {
		return nil, err
	}
	c := b.curves[i]
	out := &compress.Curve{Flux: c.Flux, Err: c.Err, Used: make([]bool, len(c.Time)), Parameters: p, Radius: s.value[slotRadius]}
	if !b.scaled {
		out.Factor, out.Jitter = s.noiseOf(&s.value)
	}
	for k, flag := range c.Mask {
		out.Used[k] = flag == 0 && b.finite[k] && finite(c.Time[k]) && finite(c.Flux[k]) && c.Err[k] > 0 && finite(c.Err[k])
	}
	for k, slot := range []int{slotLimb1, slotLimb2} {
		out.Limb[k], _ = s.named(slot, s.value[slot])
	}
	return out, nil
}

// compared reports whether channel i is among those held against the exact likelihood,
// which are spread evenly.
func (b *batch) compared(i int) bool {
	n, want := len(b.curves), b.sampling.Compared
	if want < 0 {
		return false
	}
	want = min(want, n)
	return (i+1)*want/n > i*want/n
}

// sample is the result for channel i.
func (b *batch) sample(i int) (spectrum.Point, ChannelPosterior, error) {
	curve := b.curves[i]
	none := func(reason string) (spectrum.Point, ChannelPosterior, error) {
		point, _, err := unmeasured(lightcurve.Curve{Channel: curve.Channel, Mask: curve.Mask}, reason)
		point.Masked = len(curve.Mask) - point.Used
		nan := math.NaN()
		return point, ChannelPosterior{Channel: curve.Channel, KHat: nan, RHat: nan, RadiusRatio: nan}, err
	}
	in, err := b.curve(i)
	if err != nil {
		return spectrum.Point{}, ChannelPosterior{}, err
	}
	if reason := b.unusable(in.Used); reason != "" {
		return none(reason)
	}
	settings := compress.Settings{Effective: b.sampling.Effective, Quick: b.quick, Scale: b.scaled, Seed: b.sampling.Seed,
		Stream: curve.Channel.Index, Directions: b.directions}
	if b.compared(i) {
		settings.Compare = comparedDraws
	}
	p, err := b.shared.Posterior(in, settings)
	if err != nil {
		return none(err.Error())
	}
	if reduced := p.Chi2 / float64(p.Samples-p.Free); b.model.Inflate && !b.scaled && reduced > 1 {
		chi2 := p.Chi2 // with the errors as given
		in.Factor, in.Jitter = in.Factor*math.Sqrt(reduced), in.Jitter*math.Sqrt(reduced)
		if p, err = b.shared.Posterior(in, settings); err != nil {
			return none(err.Error())
		}
		p.Chi2 = chi2
	}
	return b.point(i, in, p), b.posterior(i, p), nil
}

// point is the channel's point of the spectrum.
func (b *batch) point(i int, in *compress.Curve, p *compress.Posterior) spectrum.Point {
	curve := b.curves[i]
	r, depth := p.Marginals[0], p.Marginals[1]
	out := spectrum.Point{
		Channel: curve.Channel,
		Depth:   depth.Mean, DepthErr: depth.SD, RadiusRatio: r.Mean, RadiusRatioErr: r.SD,
		Limb: []float64{0, 0}, LimbErr: []float64{0, 0},
		Chi2: p.Chi2, Dof: p.Samples - p.Free, Used: p.Samples, Masked: len(curve.Time) - p.Samples, Scatter: p.Scatter,
	}
	for _, m := range p.Marginals {
		switch m.Name {
		case "u1":
			out.Limb[0], out.LimbErr[0] = m.Mean, m.SD
		case "u2":
			out.Limb[1], out.LimbErr[1] = m.Mean, m.SD
		}
	}
	for k, prior := range in.Parameters.Limb {
		if prior.Kind == compress.Fixed {
			out.LimbErr[k] = 0
		}
	}
	var flags []string
	if !p.Mixed {
		flags = append(flags, fmt.Sprintf("the posterior was not sampled well: k-hat %.2f, R-hat of walkers %.3f", p.K, p.RHat))
	}
	if prior := in.Parameters.Radius; prior.Kind == compress.Uniform || prior.Kind == compress.LogUniform {
		if q := r.Quantiles; q[1]-prior.A < 0.5*r.SD || prior.B-q[3] < 0.5*r.SD {
			flags = append(flags, fmt.Sprintf("radius ratio at the end of its range, %.4g", r.Mean))
		}
	}
	if reduced := p.Chi2 / float64(out.Dof); reduced > doubtfulChi2 {
		flags = append(flags, fmt.Sprintf("reduced chi-square %.2f", reduced))
	}
	out.Flag = strings.Join(flags, "; ")
	out.ShiftGeometry = make([]float64, len(p.Shift))
	for g, shift := range p.Shift {
		out.ShiftGeometry[g] = 2 * p.Radius * shift
	}
	return out
}

// posterior is the channel's posterior.
func (b *batch) posterior(i int, p *compress.Posterior) ChannelPosterior {
	out := ChannelPosterior{
		Channel: b.curves[i].Channel,
		How:     p.By, Draws: p.Draws, Effective: p.Effective, KHat: p.K, RHat: p.RHat, Reliable: p.Mixed,
		Tables: p.Tables, TableError: p.Error, Compared: p.Compared.Draws, ComparedSD: p.Compared.SD, ShiftOfMean: p.Compared.Shift,
		RadiusRatio: p.Radius, Limb: []float64{p.Limb[0], p.Limb[1]}, Settling: b.settling,
	}
	if math.IsNaN(b.settling) {
		out.Settling = p.Settling
	}
	for _, m := range p.Marginals {
		q := m.Quantiles
		interval := Interval{Name: m.Name, Mean: m.Mean, SD: m.SD, Lo95: q[0], Lo68: q[1], Median: q[2], Hi68: q[3], Hi95: q[4]}
		if m.Name == "settlingTime" {
			interval.Unit = "d"
		}
		out.Quantities = append(out.Quantities, interval)
	}
	return out
}

// curveFit is the light curve of channel i at the mode of a posterior.
func (b *batch) curveFit(i int, p ChannelPosterior) (CurveFit, error) {
	curve := b.curves[i]
	in, err := b.curve(i)
	if err != nil {
		return CurveFit{}, err
	}
	law := limb.Law{Name: b.star.Law}
	count, _ := limb.Count(law.Name)
	if len(p.Limb) < count || len(p.Quantities) == 0 || !(p.RadiusRatio > 0) {
		_, none, err := unmeasured(curve, "no posterior")
		return none, err
	}
	law.Coefficients = p.Limb[:count]
	if err := law.Validate(); err != nil {
		return CurveFit{}, err
	}
	if b.model.Trend.Settling && !(p.Settling >= leastSettling && p.Settling <= mostSettling) {
		return CurveFit{}, fmt.Errorf("%s: the settling time of the posterior is %g d; expected that of a result of Channels", whatChannel(curve.Channel), p.Settling)
	}
	var u [2]float64
	copy(u[:], law.Coefficients)
	flux, trend, added, level, err := b.shared.Model(in, p.RadiusRatio, u, p.Settling)
	if err != nil {
		_, none, err := unmeasured(curve, err.Error())
		return none, err
	}
	out := CurveFit{Channel: curve.Channel, Time: slices.Clone(curve.Time), Flux: make([]float64, len(flux)), Err: make([]float64, len(flux)),
		Mask: slices.Clone(curve.Mask), Transit: flux, Trend: trend, Added: added, Level: level, Mid: b.star.Orbit.MidTransit}
	for k, used := range in.Used {
		out.Flux[k], out.Err[k] = curve.Flux[k]/level-added[k], curve.Err[k]/level
		if !used && out.Mask[k] == 0 {
			out.Mask[k] = lightcurve.Missing
		}
		if !b.finite[k] {
			out.Trend[k] = math.NaN()
		}
	}
	return out, nil
}
