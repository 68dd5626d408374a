package reports

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"time"

	"rimlight/steps/check"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/table"
)

// The sample is a run of an invented reduction, with results of every type
// that a report knows and steps in every state.

const sampleRecipe = "# Transmission spectrum of an invented warm Saturn\n" + `
One transit, observed by nobody with no telescope. The light curves are cleaned,
the white light curve fixes the orbit, and each channel gives a depth. See the
[channel fits](#channel-fits) and the [FITS standard](https://fits.gsfc.nasa.gov/).

## Data

The raw light curves come as one table per visit.

| input | file | layout | about |
|---|---|---|---|
| raw | visit1.fits | light-curve table | extracted spectra, one row per integration |
| limb | limb.csv | limb-darkening table | model coefficients, optional |

| setting | value | unit | also try | about |
|---|---:|---|---|---|
| clipSigma | 5 | | 4; 6 | outlier threshold, in robust standard deviations |
| period | 3.2147 | d | | from radial velocities |
| limbPolicy | free | | fixed; prior | how limb darkening is treated in the channels |

## Cleaning

Single-integration outliers are cosmic-ray hits. They are masked, *not* replaced: a
sample that was never measured cannot be made up.

` + "```go" + `
// Clean masks samples further than clipSigma from a running median
// of their channel.
func Clean(raw lightcurve.Cube, clipSigma float64) (clean lightcurve.Cube, err error) {
	const window = 21 // integrations; about 12 min
	return lightcurve.MaskOutliers(raw, lightcurve.RunningMedian{Window: window, Sigma: clipSigma})
}

// Map draws the cleaned fluxes against time and wavelength.
func Map(clean lightcurve.Cube) (fluxMap figure.Figure, err error) {
	return figure.FluxMap(clean, figure.Style{Width: 504})
}
` + "```" + `

## White light

| parameter | prior | unit | about |
|---|---|---|---|
| radiusRatio | U(0.05, 0.2) | | planet to star |
| midTransit | N(2461234.51, 0.01) | d | |
| axisRatio | N(11.2, 0.4) | | from the stellar density |

The sum over all channels, weighted by inverse variance, is fitted with a transit
(Mandel & Agol 2002) times a trend: a slope, an exponential settling, and linear
terms in the pointing offsets.

` + "```go" + `
// FitWhite fits the white light curve.
//
// The orbit found here is held in the channel fits.
func FitWhite(clean lightcurve.Cube, period float64, priors fit.Priors, seed uint64) (white fit.Posterior, whiteFit fit.CurveFit, whitePlot figure.Figure, err error) {
	curve, err := lightcurve.White(clean)
	if err != nil {
		return
	}
	white, whiteFit, err = fit.Transit(curve, period, priors, "free")
	if err != nil {
		return white, whiteFit, whitePlot, fmt.Errorf("white light curve: %w", err)
	}
	whitePlot, err = figure.Curve(whiteFit)
	return
}
` + "```" + `

## Channel fits

### One fit per channel

` + "```go" + `
// FitChannel fits one channel with the orbit held.
//each:channel in channels
func FitChannel(channel lightcurve.Curve, white fit.Posterior, limbPolicy string) (depth spectrum.Point, channelFit fit.CurveFit, err error) {
	return fit.Channel(channel, white, limbPolicy)
}
` + "```" + `

### The spectrum

` + "```go" + `
// Assemble puts the channels together.
func Assemble(depth []spectrum.Point, channelFit []fit.CurveFit) (result spectrum.Spectrum, spectrumPlot figure.Figure, limbPlot figure.Figure, err error) {
	result, err = spectrum.Assemble(depth)
	return
}
` + "```" + `

## Quality

A spectrum is only as good as its weakest assumption; each is tested.

` + "```go" + `
// Verify holds the fits against what is known.
func Verify(result spectrum.Spectrum, white fit.Posterior) (checks []check.Check, bands table.Table, err error) {
	return
}
` + "```" + `

Text that is not run:

` + "```text" + `
depth = (Rp / R*)^2
` + "```" + `
`

// sample is the run; channels is how many channels it has, integrations how
// many samples in time.
func sample(channels, integrations int) Document {
	rng := rand.New(rand.NewPCG(7, 11))
	cube := sampleCube(rng, channels, integrations)
	points, fits := samplePoints(rng, cube)
	white, whiteFit := sampleWhite(rng, cube)
	start := time.Date(2031, 3, 4, 21, 17, 5, 0, time.UTC)
	line := func(s string) int {
		return 1 + strings.Count(sampleRecipe[:strings.Index(sampleRecipe, "func "+s+"(")], "\n")
	}
	priors := fit.Priors{
		{Name: "radiusRatio", Kind: fit.Uniform, A: 0.05, B: 0.2},
		{Name: "midTransit", Kind: fit.Normal, A: 2461234.51, B: 0.01, Unit: "d"},
		{Name: "axisRatio", Kind: fit.Normal, A: 11.2, B: 0.4},
	}
	d := Document{
		Title: "Transmission spectrum of an invented warm Saturn", Source: []byte(sampleRecipe), File: "warm-saturn.md",
		Outcome: CheckFailed, Started: start, Ended: start.Add(47 * time.Second),
		Command: "rimlight run warm-saturn.md --set clipSigma=4",
		Inputs: []Input{
			{Name: "raw", Layout: "light-curve table", Files: []InputFile{{"visit1.fits", 5_793_120, hash("visit1")}}, Type: "rimlight/steps/lightcurve.Cube",
				Value: cube, Hash: hash("raw"), Key: hash("rawkey"), State: Computed, Why: "first time", Took: 312 * time.Millisecond},
			{Name: "limb", Layout: "limb-darkening table"},
		},
		Settings: []Setting{
			{Name: "clipSigma", Value: "4", Recipe: "5", Changed: true, AlsoTry: []string{"4", "6"}, About: "outlier threshold"},
			{Name: "period", Value: "3.2147", Recipe: "3.2147", Unit: "d"},
			{Name: "limbPolicy", Value: "free", Recipe: "free"},
		},
		Host: Host{OS: "linux", Arch: "amd64", CPUs: 8, GoVersion: "go1.26.8", Version: "v0.1.0", Revision: "3f2a9c1", Executable: hash("binary"),
			Settings: []string{"GOAMD64=v1", "CGO_ENABLED=0", "-trimpath"}, Confinement: []string{"empty environment", "fresh process", "memory limit"}},
		Modules: []Module{{"example.org/numbers", "v0.17.0", "h1:qk2bN0kzL7Z8xJ0c4e3v5Yw9p1s6m2a8d4f7g0h3j6="}, {"example.org/text", "v1.8.7", "h1:w9p1s6m2a8d4f7g0h3j6qk2bN0kzL7Z8xJ0c4e3v5Y="}},
		Library: []Package{{"rimlight/steps/fit", hash("fit")}, {"rimlight/steps/lightcurve", hash("lc")}, {"rimlight/steps/transit", hash("tr")}},
		Record:  []byte(`{"format":"rimlight run 1","title":"Wärme </script> & more"}`),
	}
	result := func(name, typ string, size int64, v any) Result {
		return Result{Name: name, Type: typ, Hash: hash(name), Size: size, Value: v}
	}
	var elements []Element
	for i := range points {
		e := Element{Label: fmt.Sprint(i + 1), State: Reused, Key: hash(fmt.Sprint("k", i)), Hash: hash(fmt.Sprint("h", i)),
			Took: time.Duration(180+rng.IntN(90)) * time.Millisecond}
		if i%4 == 0 {
			e.State, e.Why = Computed, "input clean changed"
		}
		elements = append(elements, e)
	}
	d.Steps = []Step{
		{Name: "Clean", Fence: 0, Section: "Cleaning", Line: line("Clean"), Doc: "Clean masks samples further than clipSigma from a running median\nof their channel.",
			Args: []Argument{{Name: "raw", Type: "rimlight/steps/lightcurve.Cube", Source: "input", Hash: hash("raw")},
				{Name: "clipSigma", Type: "float64", Source: "setting", Text: "4"}},
			Results: []Result{result("clean", "rimlight/steps/lightcurve.Cube", 5_012_331, cube)},
			State:   Computed, Why: "setting clipSigma changed", Key: hash("k-clean"), Took: 840 * time.Millisecond, When: start.Add(time.Second)},
		{Name: "Map", Fence: 0, Section: "Cleaning", Line: line("Map"), Doc: "Map draws the cleaned fluxes against time and wavelength.",
			Args:    []Argument{{Name: "clean", Type: "rimlight/steps/lightcurve.Cube", Source: "result", From: "Clean", Hash: hash("clean")}},
			Results: []Result{result("fluxMap", "rimlight/steps/figure.Figure", 81_220, sampleMap(rng))},
			State:   Computed, Why: "input clean changed", Key: hash("k-map"), Took: 92 * time.Millisecond, When: start.Add(2 * time.Second)},
		{Name: "FitWhite", Fence: 1, Section: "White light", Line: line("FitWhite"), Doc: "FitWhite fits the white light curve.\n\nThe orbit found here is held in the channel fits.",
			Args: []Argument{{Name: "clean", Type: "rimlight/steps/lightcurve.Cube", Source: "result", From: "Clean", Hash: hash("clean")},
				{Name: "period", Type: "float64", Source: "setting", Text: "3.2147 d"},
				{Name: "priors", Type: "rimlight/steps/fit.Priors", Source: "priors", From: "White light", Value: priors},
				{Name: "seed", Type: "uint64", Source: "seed", Text: "1442695040888963407"}},
			Results: []Result{result("white", "rimlight/steps/fit.Posterior", 1_904, white), result("whiteFit", "rimlight/steps/fit.CurveFit", 150_233, whiteFit),
				result("whitePlot", "rimlight/steps/figure.Figure", 50_114, curveFigure(whiteFit))},
			State: Computed, Why: "input clean changed", Key: hash("k-white"), Seed: 1442695040888963407, Took: 3210 * time.Millisecond, When: start.Add(5 * time.Second),
			Log: "optimiser: 14 iterations\n"},
		{Name: "FitChannel", Fence: 2, Section: "One fit per channel", Line: line("FitChannel"), Doc: "FitChannel fits one channel with the orbit held.", Each: "channel in channels",
			Args: []Argument{{Name: "channel", Type: "rimlight/steps/lightcurve.Curve", Source: "element", From: "Clean"},
				{Name: "white", Type: "rimlight/steps/fit.Posterior", Source: "result", From: "FitWhite", Hash: hash("white")},
				{Name: "limbPolicy", Type: "string", Source: "setting", Text: "free"}},
			Results: []Result{result("depth", "[]rimlight/steps/spectrum.Point", 21_300, points), result("channelFit", "[]rimlight/steps/fit.CurveFit", 12_020_300, fits)},
			State:   Computed, Why: "input clean changed (20 of 80 elements)", Took: 17 * time.Second, When: start.Add(30 * time.Second), Elements: elements},
		{Name: "Assemble", Fence: 3, Section: "The spectrum", Line: line("Assemble"), Doc: "Assemble puts the channels together.",
			Args: []Argument{{Name: "depth", Type: "[]rimlight/steps/spectrum.Point", Source: "result", From: "FitChannel", Hash: hash("depth")},
				{Name: "channelFit", Type: "[]rimlight/steps/fit.CurveFit", Source: "result", From: "FitChannel", Hash: hash("channelFit")}},
			Results: []Result{result("result", "rimlight/steps/spectrum.Spectrum", 74_100, spectrum.Spectrum{Points: points, Law: "quadratic", Policy: "free"}),
				result("spectrumPlot", "rimlight/steps/figure.Figure", 31_000, spectrumFigureOf(points)), result("limbPlot", "rimlight/steps/figure.Figure", 1200, figure.Figure{Title: "Limb darkening", Alt: "two coefficients against wavelength", SVG: "<svg"})},
			State: Reused, Key: hash("k-assemble"), Took: 8 * time.Millisecond, When: start.Add(-26 * time.Hour)},
		{Name: "Verify", Fence: 4, Section: "Quality", Line: line("Verify"), Doc: "Verify holds the fits against what is known.",
			Args:    []Argument{{Name: "result", Type: "rimlight/steps/spectrum.Spectrum", Source: "result", From: "Assemble", Hash: hash("result")}},
			Results: []Result{result("checks", "[]rimlight/steps/check.Check", 900, sampleChecks()), result("bands", "rimlight/steps/table.Table", 700, sampleTable())},
			State:   Reused, Key: hash("k-verify"), Took: 3 * time.Millisecond, When: start.Add(-26 * time.Hour)},
	}
	return d
}

func hash(s string) string {
	sum := sha256.Sum256([]byte(s))
	return hex.EncodeToString(sum[:])
}

func sampleCube(rng *rand.Rand, channels, integrations int) lightcurve.Cube {
	var c lightcurve.Cube
	for i := range integrations {
		c.Time = append(c.Time, 2461234.4+0.22*float64(i)/float64(integrations))
	}
	for j := range channels {
		lo := 0.6 * math.Pow(5.2/0.6, float64(j)/float64(channels))
		hi := 0.6 * math.Pow(5.2/0.6, float64(j+1)/float64(channels))
		c.Channels = append(c.Channels, lightcurve.Channel{Index: j, Lo: lo, Hi: hi})
		mask := make([]lightcurve.Flag, integrations)
		for i := range mask {
			switch rng.IntN(400) {
			case 0:
				mask[i] = lightcurve.Outlier
			case 1:
				mask[i] = lightcurve.Missing
			}
		}
		c.Flux, c.Err, c.Mask = append(c.Flux, make([]float64, integrations)), append(c.Err, make([]float64, integrations)), append(c.Mask, mask)
	}
	c.Aux = []lightcurve.Series{{Name: "X", Unit: "pixel"}, {Name: "Y", Unit: "pixel"}}
	return c
}

// dip is a transit-like shape.
func dip(t float64) float64 {
	x := math.Abs(t) / 0.052
	if x > 1 {
		return 1
	}
	return 1 - 0.0147*math.Min(1, 6*(1-x))*(1.04-0.06*x*x)
}

func sampleWhite(rng *rand.Rand, c lightcurve.Cube) (fit.Posterior, fit.CurveFit) {
	f := fit.CurveFit{Channel: lightcurve.Channel{Index: -1, Lo: 0.6, Hi: 5.2}, Time: c.Time, Level: 81234.5, Mid: 2461234.51}
	for _, t := range c.Time {
		transit := dip(t - f.Mid)
		f.Flux = append(f.Flux, transit+0.00012*rng.NormFloat64())
		f.Err = append(f.Err, 0.00012)
		f.Mask = append(f.Mask, 0)
		f.Transit = append(f.Transit, transit)
		f.Trend = append(f.Trend, 1)
	}
	names := []string{"radiusRatio", "midTransit", "axisRatio", "inclination", "u1", "u2", "slope", "settleAmplitude"}
	p := fit.Posterior{
		Names: names, Units: []string{"", "d", "", "deg", "", "", "d-1", ""},
		Value: []float64{0.121043, 2461234.5100213, 11.283, 88.431, 0.2134, 0.1821, -0.001342, 0.000412},
		Err:   []float64{0.000213, 0.0000311, 0.082, 0.121, 0.021, 0.038, 0.000061, 0.0000192},
		Held:  []fit.Prior{{Name: "period", Kind: fit.Fixed, A: 3.2147, Unit: "d"}, {Name: "eccentricity", Kind: fit.Fixed}},
		Derived: []fit.Quantity{{Name: "depth", Value: 0.0146514, Err: 0.0000516, About: "squared radius ratio"},
			{Name: "impactParameter", Value: 0.3089, Err: 0.0221}, {Name: "T14", Value: 0.10391, Err: 0.00021, Unit: "d", About: "first to fourth contact"}},
		Chi2: 2981.24, Dof: 2988, Samples: 2996, Iterations: 14, Status: "converged",
		Warnings: []string{"axisRatio and inclination are correlated by 0.97: the data give their combination only"},
		Model:    fit.Model{Period: 3.2, Trend: systematics.Trend{Polynomial: 1, Settling: true, Regressors: []string{"X"}}},
	}
	for i := range names {
		row := make([]float64, len(names))
		for j := range row {
			r := 0.83 * math.Exp(-0.9*math.Abs(float64(i-j))) * math.Cos(float64(i*j))
			if i == j {
				r = 1
			} else if i+j == 5 && i*j == 6 {
				r = 0.97
			}
			row[j] = r * p.Err[i] * p.Err[j]
		}
		p.Cov = append(p.Cov, row)
	}
	return p, f
}

func samplePoints(rng *rand.Rand, c lightcurve.Cube) (points []spectrum.Point, fits []fit.CurveFit) {
	for j, ch := range c.Channels {
		w := (ch.Lo + ch.Hi) / 2
		depth := 0.0145 + 0.0004*math.Exp(-w) + 0.0003*math.Exp(-math.Pow((w-2.7)/0.25, 2)) + 0.00025*math.Exp(-math.Pow((w-4.3)/0.15, 2))
		err := 0.00004 + 0.00001*w
		depth += err * rng.NormFloat64()
		p := spectrum.Point{Channel: ch, Depth: depth, DepthErr: err, RadiusRatio: math.Sqrt(depth), RadiusRatioErr: err / 2 / math.Sqrt(depth),
			Limb: []float64{0.3 / w, 0.15}, LimbErr: []float64{0.02, 0.04}, Chi2: 2980 + 60*rng.NormFloat64(), Dof: 2990, Used: 2985, Masked: 15, Scatter: 0.0008 + 0.0002*w}
		if j%33 == 17 {
			p = spectrum.Point{Channel: ch, Depth: math.NaN(), DepthErr: math.NaN(), RadiusRatio: math.NaN(), RadiusRatioErr: math.NaN(), Chi2: math.NaN(), Masked: len(c.Time), Scatter: math.NaN(), Flag: "dead channel: no usable sample"}
		}
		points = append(points, p)
		n := len(c.Time)
		f := fit.CurveFit{Channel: ch, Time: c.Time, Mask: c.Mask[j], Level: 1000}
		for range n {
			f.Flux = append(f.Flux, 1+p.Scatter*rng.NormFloat64())
			f.Err, f.Transit, f.Trend = append(f.Err, p.Scatter), append(f.Transit, 1), append(f.Trend, 1)
		}
		fits = append(fits, f)
	}
	return points, fits
}

func sampleChecks() []check.Check {
	return []check.Check{
		{Name: "residual scatter against photon noise", Value: 1.08, Limit: "between 0.8 and 1.3", Passed: true, Why: "More scatter than photons explain means an unmodelled systematic."},
		{Name: "white-light reduced chi-square", Value: 0.998, Limit: "between 0.9 and 1.2", Passed: true},
		{Name: "correlated noise over 20 minutes", Value: 212, Unit: "ppm", Limit: "below 150 ppm", Passed: false, Why: "Noise that is correlated over the length of ingress biases the depth."},
		{Name: "odd against even channels", Value: math.NaN(), Limit: "within 3 standard deviations", Passed: true, Why: "Neighbouring channels must agree."},
	}
}

func sampleTable() table.Table {
	return table.Table{Title: "Depth by band", Columns: []table.Column{
		{Name: "band", Text: []string{"blue", "water", "=carbon dioxide"}, About: "a range of wavelengths"},
		{Name: "from", Unit: "um", Number: []float64{0.6, 2.5, 4.1}}, {Name: "to", Unit: "um", Number: []float64{1.0, 2.9, 4.5}},
		{Name: "depth", Number: []float64{0.0148123456, 0.01491, math.NaN()}, Digits: 4},
		{Name: "error", Number: []float64{4.1e-5, 3.9e-5, 5e-7}, Digits: 2},
	}}
}

// A chart is SVG as plotting libraries write it: styles, groups, flipped axes.
type chart struct{ b strings.Builder }

func newChart(w, h float64) *chart {
	c := &chart{}
	fmt.Fprintf(&c.b, `<?xml version="1.0"?>
<!-- made for tests -->
<svg width="%gpt" height="%gpt" viewBox="0 0 %g %g" xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink">
<g transform="scale(1, -1) translate(0, -%g)">
<path d="M0,0L%g,0L%g,%gL0,%gZ" style="fill:#FFFFFF" />
`, w, h, w, h, h, w, w, h, h)
	return c
}

func (c *chart) text(x, y float64, anchor, s string) {
	fmt.Fprintf(&c.b, `<text x="%g" y="%g" transform="scale(1, -1)" style="font-family:Liberation Serif;font-variant:normal;font-weight:normal;font-style:normal;font-size:9px;text-anchor:%s">%s</text>`+"\n", x, -y, anchor, s)
}

func (c *chart) path(d, style string) {
	fmt.Fprintf(&c.b, `<path d="%s" style="%s" />`+"\n", d, style)
}

func (c *chart) axes(w, h float64, x, y string) {
	c.path(fmt.Sprintf("M44,%gL44,34L%g,34", h-8, w-8), "fill:none;stroke:#000000;stroke-width:0.6")
	c.text(w/2+20, 8, "middle", x)
	c.text(46, h-6, "start", y)
}

func (c *chart) end() string { return c.b.String() + "</g>\n</svg>\n" }

func spectrumFigureOf(points []spectrum.Point) figure.Figure {
	c := newChart(504, 250)
	c.axes(504, 250, "wavelength (µm)", "depth (ppm)")
	x := func(w float64) float64 { return 50 + 440*math.Log(w/0.6)/math.Log(5.2/0.6) }
	y := func(d float64) float64 { return 50 + 180*(d-0.0143)/0.0009 }
	data := table.Table{Columns: []table.Column{{Name: "wavelength", Unit: "um"}, {Name: "depth"}, {Name: "error"}}}
	for _, w := range []float64{0.6, 1, 2, 3, 4, 5} {
		c.path(fmt.Sprintf("M%g,34L%g,38", x(w), x(w)), "fill:none;stroke:#000000;stroke-width:0.6")
		c.text(x(w), 22, "middle", fmt.Sprint(w))
	}
	for d := 14400.0; d < 15200; d += 200 {
		c.path(fmt.Sprintf("M44,%gL48,%g", y(d*1e-6), y(d*1e-6)), "fill:none;stroke:#000000;stroke-width:0.6")
		c.text(40, y(d*1e-6)-3, "end", fmt.Sprint(d))
	}
	for _, p := range points {
		w := (p.Channel.Lo + p.Channel.Hi) / 2
		for i, v := range []float64{w, p.Depth, p.DepthErr} {
			data.Columns[i].Number = append(data.Columns[i].Number, v)
		}
		if !p.Good() {
			continue
		}
		c.path(fmt.Sprintf("M%.2f,%.2fL%.2f,%.2fM%.2f,%.2fL%.2f,%.2f", x(p.Channel.Lo), y(p.Depth), x(p.Channel.Hi), y(p.Depth), x(w), y(p.Depth-p.DepthErr), x(w), y(p.Depth+p.DepthErr)), "fill:none;stroke:#2A2F6B;stroke-width:0.8")
		c.path(fmt.Sprintf("M%.2f,%.2fA2,2 0 1 1 %.2f,%.2fA2,2 0 1 1 %.2f,%.2fZ", x(w)+2, y(p.Depth), x(w)-2, y(p.Depth), x(w)+2, y(p.Depth)), "fill:#2A2F6B")
	}
	return figure.Figure{Title: "Transmission spectrum", Alt: "Transit depth against wavelength, with a slope in the blue and two bands", SVG: c.end(), Data: data,
		Caption: fmt.Sprintf("Transit depth in %d channels. Vertical bars are one standard deviation, horizontal bars are channel widths.", len(points))}
}

func curveFigure(f fit.CurveFit) figure.Figure {
	c := newChart(252, 190)
	c.axes(252, 190, "time from mid-transit (h)", "relative flux")
	x := func(t float64) float64 { return 140 + 900*(t-f.Mid) }
	y := func(v float64) float64 { return 60 + 110*(v-0.984)/0.018 }
	var line strings.Builder
	data := table.Table{Columns: []table.Column{{Name: "time", Unit: "d"}, {Name: "flux"}, {Name: "model"}}}
	for i := range f.Time {
		if i%max(1, len(f.Time)/400) == 0 {
			c.path(fmt.Sprintf("M%.1f,%.1fh0.9v0.9h-0.9Z", x(f.Time[i]), y(f.Flux[i])), "fill:#9AA0D0")
			cmd := "L"
			if line.Len() == 0 {
				cmd = "M"
			}
			fmt.Fprintf(&line, "%s%.1f,%.1f", cmd, x(f.Time[i]), y(f.Transit[i]))
		}
		for k, v := range []float64{f.Time[i], f.Flux[i], f.Transit[i]} {
			data.Columns[k].Number = append(data.Columns[k].Number, v)
		}
	}
	c.path(line.String(), "fill:none;stroke:#C77700;stroke-width:1.2")
	return figure.Figure{Title: "White light curve", Alt: "A transit light curve with its model", Caption: "Sum of all channels (points) and the fitted model (line).", SVG: c.end(), Data: data}
}

func sampleMap(rng *rand.Rand) figure.Figure {
	c := newChart(504, 200)
	c.axes(504, 200, "time from mid-transit (h)", "wavelength (µm)")
	for i := range 55 {
		for j := range 18 {
			v := int(255 * math.Min(1, math.Max(0, 0.75+0.1*rng.NormFloat64()-0.5*(1-dip((float64(i)-27)/300))/0.0147)))
			c.path(fmt.Sprintf("M%d,%dh8v8h-8Z", 48+i*8, 38+j*8), fmt.Sprintf("fill:#%02X%02X%02X", v/2, v*3/5, v))
		}
	}
	fmt.Fprintf(&c.b, `<image x="10" y="10" width="5" height="5" xlink:href="data:image/png;base64,%s" />`, onePixel)
	return figure.Figure{Title: "Cleaned fluxes", Alt: "Flux as colour, against time and wavelength", Caption: "Relative flux of every channel; the transit is the dark band.", SVG: c.end()}
}

const onePixel = "iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAYAAAAfFcSJAAAADUlEQVR42mNkYPhfDwAChwGA60e6kgAAAABJRU5ErkJggg=="

// failing is the sample with a step that failed, in part, and what that leads to.
func failing() Document {
	d := sample(80, 300)
	d.Outcome = StepFailed
	d.Inputs[0].Changed, d.Inputs[0].Recipe, d.Inputs[0].Files[0].Name = true, "visit1.fits", "visit2.fits"
	s := &d.Steps[3]
	s.State, s.Results = Failed, nil
	s.Err = "2 of 80 elements failed; element 18: warm-saturn.md:79:9: channel 17: no usable sample: all 300 are masked (300 missing);\nleave the channel out, or look at the reader's column table"
	for _, i := range []int{17, 50} {
		s.Elements[i].State, s.Elements[i].Hash = Failed, ""
		s.Elements[i].Err = fmt.Sprintf("warm-saturn.md:79:9: channel %d: no usable sample: all 300 are masked (300 missing)", i)
	}
	for i := 4; i < 6; i++ {
		d.Steps[i] = Step{Name: d.Steps[i].Name, Fence: d.Steps[i].Fence, Line: d.Steps[i].Line, Doc: d.Steps[i].Doc, Args: d.Steps[i].Args, State: NotReached}
	}
	d.Notes = []string{"object 3f9a1c2b77 was damaged; step Clean was computed again"}
	return d
}
