package fit

import (
	"fmt"
	"math"
	"slices"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// doubtfulChi2 is the reduced chi-square above which a channel's flag says so.
const doubtfulChi2 = 2

// Channel fits one spectroscopic channel with the orbit held at the white fit's
// values. Free are the radius ratio, which priors must name, limb darkening as
// model.LimbPolicy has it, and the coefficients of the trend:
//
//   - "free": under the rows of priors for u1 and u2, or q1 and q2;
//   - "fixed": at the values of model.Limb for the channel's wavelengths;
//   - "prior": normal about these values, with the table's errors.
//
// Under the last two, rows for limb darkening in priors are passed over. The
// settling time is held at the white fit's value too, unless priors has a row for
// it. Rows for parameters of the orbit are an error. The start is the white fit's, radius
// ratio and trend being solved for linearly first.
//
// The point's errors are those of the channel's own noise, the orbit held; the
// error that all channels share through the orbit is the business of
// [SharedCovariance], by way of the point's ShiftGeometry, which has one element
// for each name of the white posterior (zero for those that are not held here).
// Chi2 is that of the samples with the errors as given.
//
// A channel that cannot be measured is not an error: with fewer than 50 usable
// samples, fewer than 10 in transit or out of it, or a median flux not above
// zero, depth and errors are NaN and Flag says why. Flag also names what is
// doubtful: a fit that did not converge, a radius ratio at the end of its range,
// a reduced chi-square above 2.
func Channel(curve lightcurve.Curve, white Posterior, model Model) (spectrum.Point, CurveFit, error) {
	if err := model.plain(); err != nil {
		return spectrum.Point{}, CurveFit{}, fmt.Errorf("%s: %w", whatChannel(curve.Channel), err)
	}
	return channel(curve, white, model, nil)
}

// whatChannel starts the messages of a channel fit.
func whatChannel(c lightcurve.Channel) string {
	return fmt.Sprintf("channel %d (%.6g to %.6g um)", c.Index, c.Lo, c.Hi)
}

// channel is Channel with a function of the recipe, or nil.
func channel(curve lightcurve.Curve, white Posterior, model Model, own *function) (spectrum.Point, CurveFit, error) {
	what := whatChannel(curve.Channel)
	fail := func(err error) (spectrum.Point, CurveFit, error) {
		return spectrum.Point{}, CurveFit{}, fmt.Errorf("%s: %w", what, err)
	}
	if err := model.check(); err != nil {
		return fail(err)
	}
	rows, _, err := limbRows(without(model.Channel, own), model, curve.Channel, true)
	if err != nil {
		return fail(err)
	}
	space, whole, err := channelSpace(model, white, rows, own)
	if err != nil {
		return fail(err)
	}
	if usable := countUsable(curve.Mask); usable < leastSamples {
		return unmeasured(curve, fmt.Sprintf("only %d usable samples; at least %d are needed", usable, leastSamples))
	}
	m, err := newObjective(curve, model, space, own)
	if err != nil {
		return fail(err)
	}
	if len(m.used) < leastSamples {
		return unmeasured(curve, fmt.Sprintf("only %d usable samples; at least %d are needed", len(m.used), leastSamples))
	}
	if err := m.usableLevel(); err != nil {
		return unmeasured(curve, err.Error())
	}
	if reason, err := m.coverage(&space.value); err != nil {
		return fail(err)
	} else if reason != "" {
		return unmeasured(curve, reason)
	}
	if err := m.search(); err != nil {
		return fail(err)
	}
	s, err := m.solve([][slots]float64{space.value}, model.Inflate)
	if err != nil {
		return fail(err)
	}
	point, err := s.point(curve, white, whole)
	if err != nil {
		return fail(err)
	}
	curveFit, err := s.curveFit(curve)
	if err != nil {
		return fail(err)
	}
	return point, curveFit, nil
}

func countUsable(mask []lightcurve.Flag) int {
	count := 0
	for _, flag := range mask {
		if flag == 0 {
			count++
		}
	}
	return count
}

// without leaves out the rows of a function's parameters.
func without(rows Priors, own *function) Priors {
	if own == nil {
		return rows
	}
	var rest Priors
	for _, p := range rows {
		if !slices.Contains(own.names, p.Name) {
			rest = append(rest, p)
		}
	}
	return rest
}

// channelSpace is the space of a channel fit: everything at the white fit's
// values, and the rows' parameters free. whole is the white fit's.
func channelSpace(model Model, white Posterior, rows Priors, own *function) (channel, whole *space, err error) {
	whole = newSpace(model)
	if err := whole.take(white, own); err != nil {
		return nil, nil, err
	}
	o, err := whole.orbit(&whole.value)
	if err != nil {
		return nil, nil, fmt.Errorf("white posterior: %w", err)
	}
	// The orbit is held, whatever parameters the white fit had for it, and limb
	// darkening starts from u1, u2, ...
	channel = newSpace(model)
	channel.reference, channel.value = whole.reference, whole.value
	channel.setOrbit(o)
	copy(channel.value[slotLimb1:slotLimb1+channel.limbs], whole.coefficients(&whole.value))
	for _, p := range rows {
		if named, err := findName(p.Name); err == nil && named.slot < slotRadius {
			return nil, nil, fmt.Errorf("%s is held at the white fit's value in channels; take its row out of this priors table", p.Name)
		}
	}
	if _, err := channel.apply(rows, model.Trend.Settling); err != nil {
		return nil, nil, err
	}
	if !channel.isFree(slotRadius) {
		return nil, nil, fmt.Errorf("no prior leaves radiusRatio free; add a row such as radiusRatio | U(0.01, 0.3)")
	}
	return channel, whole, nil
}

// take sets the values of a white posterior, free and held, but for those of the
// recipe's function, and of the noise, which is each channel's own.
func (s *space) take(white Posterior, own *function) error {
	values := map[int]float64{}
	set := func(name string, value float64) error {
		if own != nil && slices.Contains(own.names, name) {
			return nil
		}
		p, err := findName(name)
		if err != nil {
			return fmt.Errorf("white posterior: %w; if it comes from WhiteWith, fit the channels with ChannelWith", err)
		}
		if noisy(p.slot) || !s.exists(p.slot) {
			return nil
		}
		if family(name)[0] == "q1" && s.limbs != 2 {
			return nil
		}
		s.name[p.slot] = name
		values[p.slot] = value
		return nil
	}
	if n := len(white.Names); n == 0 || len(white.Value) != n || len(white.Err) != n {
		return fmt.Errorf("the white posterior has %d names, %d values and %d errors; expected the result of a white fit", n, len(white.Value), len(white.Err))
	}
	for _, p := range white.Held {
		if err := set(p.Name, p.A); err != nil {
			return err
		}
	}
	for k, name := range white.Names {
		if !isTrend(name) {
			if err := set(name, white.Value[k]); err != nil {
				return err
			}
		}
	}
	for slot := range slots {
		if value, ok := values[slot]; ok {
			s.value[slot] = s.coordinate(slot, value)
		}
	}
	return nil
}

// unmeasured is the result for a channel without a depth.
func unmeasured(curve lightcurve.Curve, reason string) (spectrum.Point, CurveFit, error) {
	nan := math.NaN()
	used := countUsable(curve.Mask)
	n := len(curve.Time)
	empty := func() []float64 {
		x := make([]float64, n)
		for i := range x {
			x[i] = nan
		}
		return x
	}
	point := spectrum.Point{
		Channel: curve.Channel, Depth: nan, DepthErr: nan, RadiusRatio: nan, RadiusRatioErr: nan,
		Limb: []float64{nan, nan}, LimbErr: []float64{nan, nan},
		Chi2: nan, Used: used, Masked: n - used, Scatter: nan, Flag: reason,
	}
	return point, CurveFit{
		Channel: curve.Channel,
		Time:    append([]float64(nil), curve.Time...), Flux: empty(), Err: empty(),
		Mask:    append([]lightcurve.Flag(nil), curve.Mask...),
		Transit: empty(), Trend: empty(), Level: nan, Mid: nan,
	}, nil
}
