package figure

import (
	"fmt"
	"math"

	"gonum.org/v1/plot/vg"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/table"
)

// A falloff is how the scatter of one light curve's residuals falls with the size
// of bins.
type falloff struct {
	size     []float64 // integrations
	minutes  []float64 // of a bin; NaN when times do not tell
	rms      []float64 // ppm
	expected []float64 // of uncorrelated noise, ppm
}

// newFalloff measures the residuals of f; it has no element when there are too
// few.
func newFalloff(f fit.CurveFit) (falloff, error) {
	residual, err := diagnose.Residuals(f)
	if err != nil {
		return falloff{}, err
	}
	binning, err := lightcurve.Binned(residual)
	if err != nil || !(binning.RMS[0] > 0) {
		return falloff{}, nil
	}
	cadence := diagnose.Cadence(f.Time)
	var out falloff
	for k, size := range binning.Size {
		out.size = append(out.size, float64(size))
		out.minutes = append(out.minutes, float64(size)*cadence)
		out.rms = append(out.rms, binning.RMS[k]*perMillion)
		out.expected = append(out.expected, diagnose.Expected(binning.White[k], binning.Bins[k])*perMillion)
	}
	return out, nil
}

// excess is the mean ratio of measured to expected scatter in bins of 10 to 30
// minutes, NaN without any.
func (f falloff) excess() float64 {
	sum, n := 0.0, 0
	for k, m := range f.minutes {
		if m >= 10 && m <= 30 && k > 0 {
			sum += f.rms[k] / f.expected[k]
			n++
		}
	}
	return sum / float64(n)
}

// BinnedScatter draws the root mean square of residuals averaged in bins against
// the length of the bins, on logarithmic axes: the white light curve (the fit
// whose channel has Index -1) as a thick line, each channel as a thin one. Dashed
// lines are what uncorrelated noise gives, σ₁ / √N · √(M/(M-1)) for M bins of N
// integrations (Winn et al. 2008), for the white light curve and for the median
// channel. Fits with fewer than ten residuals are left out; it is an error when
// none is left, or when the slices of a fit differ in length.
func BinnedScatter(fits []fit.CurveFit) (Figure, error) {
	var white falloff
	var channels []falloff
	timed := true
	for _, f := range fits {
		one, err := newFalloff(f)
		if err != nil {
			return Figure{}, fmt.Errorf("figure of binned scatter: %w", err)
		}
		if len(one.size) == 0 {
			continue
		}
		timed = timed && one.minutes[0] > 0 && finite(one.minutes[0])
		if f.Channel.Index == -1 && len(white.size) == 0 {
			white = one
		} else {
			channels = append(channels, one)
		}
	}
	if len(white.size) == 0 && len(channels) == 0 {
		return Figure{}, fmt.Errorf("figure of binned scatter: none of %d fits has ten residuals; look at the masks", len(fits))
	}
	length := func(f falloff) []float64 {
		if timed {
			return f.minutes
		}
		return f.size
	}
	var xs, ys []float64
	for _, f := range append([]falloff{white}, channels...) {
		xs = append(xs, length(f)...)
		ys = append(append(ys, f.rms...), f.expected...)
	}
	panel, frame := newPage(singleColumn, 68).single(newLogSpan(extent(xs)).padded(0.02, 0.02), newLogSpan(extent(ys)).padded(0.05, 0.05), 5, 5)
	opacity := math.Max(0.15, math.Min(0.7, 6/float64(len(channels)+1)))
	for _, f := range channels {
		panel.line(length(f), f.rms, stroke{color: faint(teal, opacity), width: 0.6})
	}
	dashes := stroke{color: quiet, width: 0.8, dash: dashed}
	var keys []key
	middle := middleChannel(channels)
	if len(channels) > 0 {
		panel.line(length(middle), middle.expected, dashes)
		keys = append(keys, key{text: "Channels", line: stroke{color: faint(teal, 0.6), width: 0.8}})
	}
	if len(white.size) > 0 {
		panel.line(length(white), white.expected, dashes)
		panel.line(length(white), white.rms, stroke{color: indigo, width: 1.4})
		keys = append([]key{{text: "White light", line: stroke{color: indigo, width: 1.4}}}, keys...)
	}
	keys = append(keys, key{text: "Uncorrelated noise", line: dashes})
	xTitle := "Bin length (min)"
	if !timed {
		xTitle = "Bin size (integrations)"
	}
	frame.xTitle, frame.yTitle = xTitle, "Rms of binned residuals (ppm)"
	panel.axes(frame)
	panel.legend(0.04, 0.2, keys)

	var excesses []float64
	for _, f := range channels {
		excesses = append(excesses, f.excess())
	}
	var found []string
	if len(white.size) > 0 {
		found = append(found, fmt.Sprintf("White-light residuals scatter by %s unbinned%s.", ppm(white.rms[0]/perMillion), asExcess("", white.excess())))
	}
	if len(channels) > 0 {
		found = append(found, fmt.Sprintf("The median channel scatters by %s%s.", ppm(middle.rms[0]/perMillion), asExcess("the median over channels is ", median(excesses))))
	}
	caption := sentences(
		fmt.Sprintf("Root mean square of residuals averaged in bins, for %s.", what(len(white.size) > 0, len(channels))),
		"Dashed lines fall as uncorrelated noise does, σ₁ / √N · √(M/(M−1)) for M bins of N integrations (Winn et al. 2008).",
		sentences(found...))
	return finish(panel.page, Figure{
		Title: "Scatter against bin size", Caption: caption,
		Alt:  sentences(append([]string{"Scatter of binned residuals against the length of the bins."}, found...)...),
		Data: scatterTable(white, middle),
	})
}

// dashed is the pattern of dashed lines, in points.
var dashed = []vg.Length{2.6, 2.4}

// asExcess says how much more bins of 10 to 30 min scatter than they should.
func asExcess(prefix string, excess float64) string {
	if !finite(excess) {
		return ""
	}
	return fmt.Sprintf("; in bins of 10 to 30 min %s%s times uncorrelated noise", orIt(prefix), plain(excess, 3))
}

func orIt(prefix string) string {
	if prefix == "" {
		return "by "
	}
	return prefix
}

// what names the light curves of the figure.
func what(white bool, channels int) string {
	switch {
	case white && channels > 0:
		return "the white light curve and " + counted(channels, "channel")
	case white:
		return "the white light curve"
	}
	return counted(channels, "channel")
}

// middleChannel returns the channel of median unbinned scatter.
func middleChannel(channels []falloff) falloff {
	if len(channels) == 0 {
		return falloff{}
	}
	var first []float64
	for _, f := range channels {
		first = append(first, f.rms[0])
	}
	middle := median(first)
	best := 0
	for k, v := range first {
		if math.Abs(v-middle) < math.Abs(first[best]-middle) {
			best = k
		}
	}
	return channels[best]
}

// scatterTable is the table behind the figure, one row per bin size of the longer
// of the two series.
func scatterTable(white, middle falloff) table.Table {
	long := white
	if len(middle.size) > len(white.size) {
		long = middle
	}
	fill := func(x []float64) []float64 {
		out := append([]float64(nil), x...)
		for len(out) < len(long.size) {
			out = append(out, nan)
		}
		return out
	}
	return table.Table{Title: "Scatter of binned residuals", Columns: []table.Column{
		table.Number("integrations", "", "in a bin", 6, long.size),
		table.Number("length", "min", "of a bin", 4, long.minutes),
		table.Number("white_ppm", "", "white light, parts per million", 4, fill(white.rms)),
		table.Number("white_expected_ppm", "", "for uncorrelated noise", 4, fill(white.expected)),
		table.Number("channel_ppm", "", "channel of median scatter, parts per million", 4, fill(middle.rms)),
		table.Number("channel_expected_ppm", "", "for uncorrelated noise", 4, fill(middle.expected)),
	}}
}
