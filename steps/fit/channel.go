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
// setup.LimbPolicy has it, and the coefficients of the trend:
//
//   - "free": under the rows of priors for u1 and u2, or q1 and q2;
//   - "fixed": at the values of setup.Limb for the channel's wavelengths;
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
func Channel(curve lightcurve.Curve, white Posterior, setup Setup, priors Priors) (spectrum.Point, CurveFit, error) {
	return channel(curve, white, setup, priors, nil)
}

// whatChannel starts the messages of a channel fit.
func whatChannel(c lightcurve.Channel) string {
	return fmt.Sprintf("channel %d (%.6g to %.6g um)", c.Index, c.Lo, c.Hi)
}

// channel is Channel with a function of the recipe, or nil.
func channel(curve lightcurve.Curve, white Posterior, setup Setup, priors Priors, own *function) (spectrum.Point, CurveFit, error) {
	what := whatChannel(curve.Channel)
	fail := func(err error) (spectrum.Point, CurveFit, error) {
		return spectrum.Point{}, CurveFit{}, fmt.Errorf("%s: %w", what, err)
	}
	if err := setup.check(what); err != nil {
		return spectrum.Point{}, CurveFit{}, err
	}
	rows, _, err := limbRows(priors, setup, curve.Channel, true)
	if err != nil {
		return fail(err)
	}
	space, err := channelSpace(setup, white, rows, own)
	if err != nil {
		return fail(err)
	}
	if usable := countUsable(curve.Mask); usable < leastSamples {
		return unmeasured(curve, fmt.Sprintf("only %d usable samples; at least %d are needed", usable, leastSamples))
	}
	m, err := newModel(curve, setup, space, own)
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
	s, err := m.solve([][slots]float64{space.value}, setup.Inflate)
	if err != nil {
		return fail(err)
	}
	point, err := s.point(curve, white)
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

// channelSpace is the space of a channel fit: everything at the white fit's
// values, and the rows' parameters free.
func channelSpace(setup Setup, white Posterior, rows Priors, own *function) (*space, error) {
	space := newSpace(setup)
	if err := space.take(white, own); err != nil {
		return nil, err
	}
	for _, p := range rows {
		named, err := findName(p.Name)
		if err != nil {
			return nil, err
		}
		if slot := named.slot; slot < slotRadius {
			return nil, fmt.Errorf("%s is held at the white fit's value in channels; take its row out of this priors table", p.Name)
		}
	}
	if _, err := space.apply(rows, setup.Trend.Settling); err != nil {
		return nil, err
	}
	if !space.isFree(slotRadius) {
		return nil, fmt.Errorf("no prior leaves radiusRatio free; add a row such as radiusRatio | U(0.01, 0.3)")
	}
	return space, nil
}

// take sets the values of a white posterior, free and held, but for those of the
// recipe's function.
func (s *space) take(white Posterior, own *function) error {
	set := func(name string, value float64) error {
		if own != nil && slices.Contains(own.names, name) {
			return nil
		}
		p, err := findName(name)
		if err != nil {
			return fmt.Errorf("white posterior: %w; if it comes from WhiteWith, fit the channels with ChannelWith", err)
		}
		s.name[p.slot] = name
		s.value[p.slot] = s.coordinate(p.slot, value)
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
	// The channel's own limb darkening starts from u1 and u2, whatever the white
	// fit used.
	u := s.physical(&s.value).Law.Coefficients
	s.name[slotLimb1], s.name[slotLimb2] = "u1", "u2"
	s.value[slotLimb1], s.value[slotLimb2] = u[0], u[1]
	return nil
}

func isTrend(name string) bool {
	return len(name) > len(trendPrefix) && name[:len(trendPrefix)] == trendPrefix
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
