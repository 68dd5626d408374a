package figure

import (
	"fmt"
	"math"

	"gonum.org/v1/plot/vg"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
	"rimlight/steps/table"
)

// A falloff is how the scatter of one light curve's residuals falls with the size
// of bins.
type falloff struct {
	size     []float64 // integrations
	minutes  []float64 // of a bin; NaN when times do not tell
	rms      []float64 // ppm
	expected []float64 // of uncorrelated noise, ppm
	excess   float64   // how much bins of 10 to 30 minutes scatter more than that, a factor; NaN when it cannot be told
}

// newFalloff takes the scatter of residuals from a summary; it has no element when
// there are too few of them.
func newFalloff(s diagnose.Summary) falloff {
	b := s.Binning
	out := falloff{excess: s.Beta.Value}
	if len(b.RMS) == 0 || !(b.RMS[0] > 0) {
		return out
	}
	for k, size := range b.Size {
		out.size = append(out.size, float64(size))
		out.minutes = append(out.minutes, float64(size)*s.Cadence)
		out.rms = append(out.rms, b.RMS[k]*perMillion)
		out.expected = append(out.expected, diagnose.Expected(b.White[k], b.Bins[k])*perMillion)
	}
	return out
}

// BinnedScatter draws the root mean square of residuals averaged in bins against
// the length of the bins, on logarithmic axes: the white light curve as a thick
// line, each channel as a thin one. Dashed lines are what uncorrelated noise
// gives, σ₁ / √N · √(M/(M-1)) for M bins of N integrations (Winn et al. 2008), for
// the white light curve and for the median channel. Light curves with fewer than
// ten residuals are left out; it is an error when none is left, or when slices
// differ in length.
func BinnedScatter(whiteFit fit.CurveFit, fits []diagnose.Summary) (Figure, error) {
	const where = "figure of binned scatter"
	sum, err := diagnose.Summarise(whiteFit)
	if err != nil {
		return Figure{}, fmt.Errorf("%s: %w", where, err)
	}
	white := newFalloff(sum)
	timed := len(white.size) == 0 || finite(sum.Cadence) && sum.Cadence > 0
	var channels []falloff
	for _, f := range fits {
		if err := f.Check(); err != nil {
			return Figure{}, fmt.Errorf("%s: %w", where, err)
		}
		if one := newFalloff(f); len(one.size) > 0 {
			timed = timed && finite(f.Cadence) && f.Cadence > 0
			channels = append(channels, one)
		}
	}
	if len(white.size) == 0 && len(channels) == 0 {
		return Figure{}, fmt.Errorf(where+": neither the white light curve nor any of %d channels has ten residuals; look at the masks", len(fits))
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
		excesses = append(excesses, f.excess)
	}
	var found []string
	if len(white.size) > 0 {
		found = append(found, fmt.Sprintf("White-light residuals scatter by %s unbinned%s.", ppm(white.rms[0]/perMillion), asExcess("", white.excess)))
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
