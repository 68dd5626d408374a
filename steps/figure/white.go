package figure

import (
	"fmt"
	"math"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
	"rimlight/steps/table"
)

// Limits of what is drawn of one light curve, so that a figure stays small.
const (
	whiteBins = 90
	leastBins = 15
	rawPoints = 2500
	fewPoints = 400 // below this number, single integrations are drawn larger
)

// WhiteFit draws a light curve with its fit: above, the flux divided by the trend
// (averages of equal intervals of time, single integrations behind them) and the
// transit model; below, the residuals in ppm. It is an error when the slices of f
// differ in length or no sample is usable.
func WhiteFit(f fit.CurveFit) (Figure, error) {
	s, err := newSeries(f)
	if err != nil {
		return Figure{}, fmt.Errorf("figure of the white fit: %w", err)
	}
	if s.used == 0 {
		return Figure{}, fmt.Errorf("figure of the white fit: none of %d samples is usable; look at the mask", len(f.Time))
	}
	flux, err := s.binned(s.flux)
	if err != nil {
		return Figure{}, fmt.Errorf("figure of the white fit: %w", err)
	}
	residual, err := s.binned(s.residual)
	if err != nil {
		return Figure{}, fmt.Errorf("figure of the white fit: %w", err)
	}
	summary, err := diagnose.Summarise(f)
	if err != nil {
		return Figure{}, fmt.Errorf("figure of the white fit: %w", err)
	}
	dot := 0.9
	if s.used < fewPoints {
		dot = 1.6
	}
	single := rms(s.residual)
	index, every := thin(len(s.hours), rawPoints)
	x := newSpan(extent(s.hours)).padded(0.015, 0.015)

	sorted := finites(s.flux)
	modelLo, modelHi := extent(s.model)
	fluxes := newSpan(min(quantile(sorted, 0.005), modelLo), max(quantile(sorted, 0.995), modelHi)).padded(0.06, 0.06)
	ppms := scaled(s.residual, perMillion)
	spread := finites(ppms)
	reach := max(math.Abs(quantile(spread, 0.005)), math.Abs(quantile(spread, 0.995)))
	ppmSpan := newSpan(-reach, reach).padded(0.05, 0.05)

	const upLabels, downLabels, downHeight, upHeight, gap = 5, 4, 22, 42, 2
	p := newPage(singleColumn, bottomMargin+downHeight+gap+upHeight+1)
	from := max(p.margin(upLabels, fluxes), p.margin(downLabels, ppmSpan))
	box := singleColumn - 1.5 - from
	up := p.newPanel(from, bottomMargin+downHeight+gap, box, upHeight, x, fluxes)
	up.dots(pick(s.hours, index), pick(s.flux, index), dot, faint(teal, 0.45))
	up.rings(flux.x, flux.y, 2.9, indigo, color(0xe4e3f6))
	up.line(s.since(summary.ModelTime), summary.Model, stroke{color: amber, width: 0.9})
	up.axes(axes{yTitle: "Relative flux", xLabels: 6, yLabels: upLabels, hideX: true, margin: from})

	down := p.newPanel(from, bottomMargin, box, downHeight, x, ppmSpan)
	down.dots(pick(s.hours, index), pick(ppms, index), dot, faint(teal, 0.45))
	down.level(0, stroke{color: amber, width: 0.9})
	means := scaled(residual.y, perMillion)
	errs := make([]float64, len(means))
	for k, n := range residual.count {
		errs[k] = single * perMillion / math.Sqrt(float64(n))
	}
	down.errorBars(residual.x, means, errs, stroke{color: indigo, width: 0.6})
	down.rings(residual.x, means, 2.9, indigo, color(0xe4e3f6))
	down.axes(axes{xTitle: s.title(), yTitle: "Residual (ppm)", xLabels: 6, yLabels: downLabels, margin: from})

	depth, duration := s.depth()
	expected := expectedRMS(residual.count, single)
	alt := fmt.Sprintf("Light curve and residuals. The transit model is %s deep at its deepest and %s h long; residuals scatter by %s in one integration and by %s in bins, where uncorrelated noise would give %s.",
		plain(depth*perCent, 3)+" %", plain(duration, 3), ppm(single), ppm(rms(residual.y)), ppm(expected))
	if depth == 0 {
		alt = fmt.Sprintf("Light curve and residuals. The model has no transit; residuals scatter by %s in one integration.", ppm(single))
	}
	raw := "Dots are single integrations"
	if every > 1 {
		raw += fmt.Sprintf(", one in %d of them", every)
	}
	caption := sentences(
		fmt.Sprintf("Light curve from %s (%s fitted, %d masked) after division by the fitted trend, with the transit model (line).",
			waveRange(f.Channel.Lo, f.Channel.Hi), counted(s.used, "integration"), s.masked),
		fmt.Sprintf("Circles are averages over %s min; %s.", plain(flux.width*minutes, 2), lowerFirst(raw)),
		fmt.Sprintf("Below: residuals, with a root mean square of %s in one integration and %s in the averages, where uncorrelated noise would give %s.",
			ppm(single), ppm(rms(residual.y)), ppm(expected)),
		s.sentence())
	title := "White light curve and its fit"
	if f.Channel.Index >= 0 {
		title = "Light curve at " + wave(f.Channel) + " µm and its fit"
	}
	return finish(p, Figure{
		Title: title, Caption: caption, Alt: alt,
		Data: table.Table{Title: "Averages of the light curve", Columns: []table.Column{
			table.Number("time", "h", "mean time from the zero of the figure", 6, flux.x),
			table.Number("flux", "", "mean flux divided by the trend", 8, flux.y),
			table.Number("residual_ppm", "", "mean residual, parts per million", 4, means),
			table.Number("residual_err_ppm", "", "its expected standard deviation for uncorrelated noise, parts per million", 3, errs),
			table.Number("integrations", "", "how many were averaged", 6, floats(flux.count)),
		}},
	})
}

// expectedRMS returns the root mean square of averages of count values each,
// when the values are independent and scatter by single.
func expectedRMS(count []int, single float64) float64 {
	sum := 0.0
	for _, n := range count {
		sum += single * single / float64(n)
	}
	return math.Sqrt(sum / float64(len(count)))
}
