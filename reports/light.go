package reports

import (
	"fmt"
	"math"
	"strings"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

// A Light is what the report shows of light curves, or of fits to them: little,
// of values that can be larger than memory. It can stand in a [Document] in the
// place of the value.
type Light struct {
	Kind         string // one of those below
	Channels     []lightcurve.Channel
	Integrations int     // of the first curve
	Begin, End   float64 // of the first curve, BJD_TDB; NaN without times
	Samples      int
	Masked       int
	Reasons      [8]int    // masked samples by reason, that is by bit of the flag
	Aux          []string  // auxiliaries of the first curve, with their units
	Scatter      []float64 // of each fit, the standard deviation of its relative residuals
	Ratio        []float64 // of each fit, that in units of the errors used
	Beta         []float64 // of each fit, how much its residuals scatter more than uncorrelated noise in bins of 10 to 30 min; NaN when it was not asked
	Level        float64   // of a single fit, see [fit.CurveFit]
	Mid          float64   // likewise
}

// Kinds of value that a Light is made of.
const (
	cubeLight   = "cube"
	curveLight  = "curve"
	curvesLight = "curves"
	fitLight    = "fit"
	fitsLight   = "fits"
)

// LightOf sums up a cube, a light curve, a fit of one or what a step has kept of
// it, or several of them.
// Of a Light it gives the Light itself, of any other value false.
func LightOf(value any) (Light, bool) {
	switch v := value.(type) {
	case Light:
		return v, true
	case lightcurve.Cube:
		l := newLight(cubeLight, v.Time, v.Aux)
		l.Channels = v.Channels
		for _, mask := range v.Mask {
			l.mask(mask)
		}
		return l, true
	case lightcurve.Curve:
		l := newLight(curveLight, v.Time, v.Aux)
		l.Channels = []lightcurve.Channel{v.Channel}
		l.mask(v.Mask)
		return l, true
	case fit.CurveFit:
		l := newLight(fitLight, v.Time, nil)
		l.Channels = []lightcurve.Channel{v.Channel}
		l.mask(v.Mask)
		sd, ratio := scatter(v)
		l.Scatter, l.Ratio, l.Beta, l.Level, l.Mid = []float64{sd}, []float64{ratio}, []float64{math.NaN()}, v.Level, v.Mid
		return l, true
	case diagnose.Summary:
		return Light{
			Kind: fitLight, Channels: []lightcurve.Channel{v.Channel}, Integrations: v.Samples(), Begin: v.Flux.Begin, End: v.Flux.End,
			Samples: v.Samples(), Masked: v.Scatter.Masked, Level: v.Level, Mid: v.Mid,
			Scatter: []float64{v.Scatter.RMS}, Ratio: []float64{v.Scatter.Ratio}, Beta: []float64{v.Beta.Value},
		}, true
	case []lightcurve.Curve:
		return sumOf(curvesLight, v), true
	case []fit.CurveFit:
		return sumOf(fitsLight, v), true
	case []diagnose.Summary:
		return sumOf(fitsLight, v), true
	}
	return Light{}, false
}

// sumOf is the sum of curves, or of fits.
func sumOf[T any](kind string, values []T) Light {
	out := Light{Kind: kind}
	for _, v := range values {
		l, _ := LightOf(v)
		out.Add(l)
	}
	return out
}

func newLight(kind string, time []float64, aux []lightcurve.Series) Light {
	l := Light{Kind: kind, Integrations: len(time), Begin: math.NaN(), End: math.NaN()}
	if lo, hi, ok := extent(time); ok {
		l.Begin, l.End = lo, hi
	}
	for i, a := range aux {
		if i == shownColumns {
			l.Aux = append(l.Aux, fmt.Sprintf("… and %d more", len(aux)-i))
			break
		}
		s := label(a.Name)
		if a.Unit != "" {
			s += " (" + label(a.Unit) + ")"
		}
		l.Aux = append(l.Aux, s)
	}
	return l
}

// Lights begins the sum of several curves, or fits, to which each is added, for
// the Go type of the slice of them; false for another type.
func Lights(typ string) (Light, bool) {
	switch typ {
	case "[]rimlight/steps/lightcurve.Curve":
		return Light{Kind: curvesLight}, true
	case "[]rimlight/steps/fit.CurveFit", "[]rimlight/steps/diagnose.Summary":
		return Light{Kind: fitsLight}, true
	}
	return Light{}, false
}

// Add adds one curve or fit to several.
func (l *Light) Add(one Light) {
	if l.Channels == nil {
		l.Integrations, l.Begin, l.End, l.Aux = one.Integrations, one.Begin, one.End, one.Aux
	}
	l.Channels = append(l.Channels, one.Channels...)
	l.Samples += one.Samples
	l.Masked += one.Masked
	for i, n := range one.Reasons {
		l.Reasons[i] += n
	}
	l.Scatter, l.Ratio, l.Beta = append(l.Scatter, one.Scatter...), append(l.Ratio, one.Ratio...), append(l.Beta, one.Beta...)
}

func (l *Light) mask(flags []lightcurve.Flag) {
	m := l.masks()
	m.add(flags)
	l.Samples, l.Masked, l.Reasons = m.all, m.masked, m.by
}

// masks are the counts of masked samples.
func (l Light) masks() maskCount { return maskCount{all: l.Samples, masked: l.Masked, by: l.Reasons} }

// facts are what is shown.
func (l Light) facts() []fact {
	switch l.Kind {
	case cubeLight:
		return facts("size", fmt.Sprintf("%s × %s", count(l.Integrations, "integration"), count(len(l.Channels), "channel")),
			"time", l.time(), "wavelengths", channelsText(l.Channels), "masked", l.masked(), "auxiliaries", strings.Join(l.Aux, ", "))
	case curveLight:
		return facts("size", count(l.Integrations, "integration"), "time", l.time(), "channel", l.channel(), "masked", l.masked(), "auxiliaries", strings.Join(l.Aux, ", "))
	case curvesLight:
		size := count(len(l.Channels), "light curve")
		if len(l.Channels) > 0 {
			size += " of " + count(l.Integrations, "integration")
		}
		return facts("size", size, "time", l.time(), "wavelengths", channelsText(l.Channels), "masked", l.masked())
	case fitLight:
		return facts("channel", l.channel(), "time", l.time(),
			"samples", fmt.Sprintf("%s of %s fitted", grouped(l.Samples-l.Masked), grouped(l.Integrations)),
			"residual scatter", l.scatterText(), "scatter in bins", l.betaText(), "baseline flux", number(l.Level, 6), "mid-transit time", fixed(l.Mid, 6)+" BJD_TDB")
	}
	out := facts("size", count(len(l.Channels), "fit"), "wavelengths", channelsText(l.Channels))
	if l.Samples > 0 {
		out = append(out, fact{"samples", fmt.Sprintf("%s of %s fitted", grouped(l.Samples-l.Masked), grouped(l.Samples))})
	}
	if lo, hi, ok := extent(l.Scatter); ok {
		out = append(out, facts(
			"residual scatter", fmt.Sprintf("%s to %s ppm, median %s", fixed(lo*1e6, 0), fixed(hi*1e6, 0), fixed(median(l.Scatter)*1e6, 0)),
			"scatter / errors used", "median "+fixed(median(l.Ratio), 2),
			"scatter in bins", l.betaText())...)
	}
	return out
}

// betaText says how much residuals scatter more in bins than uncorrelated noise
// does; it is empty when that was not asked.
func (l Light) betaText() string {
	_, hi, ok := extent(l.Beta)
	if !ok {
		return ""
	}
	const what = "times that of uncorrelated noise in bins of 10 to 30 min"
	if len(l.Beta) == 1 {
		return fixed(hi, 2) + " " + what
	}
	return fmt.Sprintf("median %s, at most %s %s", fixed(median(l.Beta), 2), fixed(hi, 2), what)
}

func (l Light) masked() string {
	m := l.masks()
	return m.String()
}

func (l Light) channel() string {
	if len(l.Channels) == 0 {
		return ""
	}
	return channelText(l.Channels[0])
}

// time is the range of times of the first curve.
func (l Light) time() string {
	if !(l.Begin <= l.End) || len(l.Channels) == 0 && l.Kind != cubeLight {
		return ""
	}
	return fmt.Sprintf("%s to %s BJD_TDB, %s h", fixed(l.Begin, 5), fixed(l.End, 5), fixed((l.End-l.Begin)*24, 2))
}

func (l Light) scatterText() string {
	if len(l.Scatter) == 0 || len(l.Ratio) == 0 || math.IsNaN(l.Scatter[0]) {
		return ""
	}
	return fmt.Sprintf("%s ppm, %s times the errors used", fixed(l.Scatter[0]*1e6, 0), fixed(l.Ratio[0], 2))
}

// scatter is the standard deviation of a fit's relative residuals, and its
// ratio to the root mean square of the errors used; NaN with fewer than two
// samples.
func scatter(f fit.CurveFit) (sd, ratio float64) {
	n := min(len(f.Flux), len(f.Transit), len(f.Trend), len(f.Mask), len(f.Err))
	var sum, sum2, err2 float64
	used := 0
	for i := range n {
		if f.Mask[i] != 0 {
			continue
		}
		r := f.Flux[i]/f.Trend[i] - f.Transit[i]
		sum += r
		sum2 += r * r
		err2 += f.Err[i] * f.Err[i]
		used++
	}
	if used < 2 {
		return math.NaN(), math.NaN()
	}
	k := float64(used)
	sd = math.Sqrt(max(0, sum2-sum*sum/k) / (k - 1))
	return sd, sd / math.Sqrt(err2/k)
}
