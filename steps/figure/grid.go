package figure

import (
	"cmp"
	"fmt"
	"slices"

	"gonum.org/v1/plot/vg"

	"rimlight/steps/diagnose"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// Layout of the grid of channels.
const (
	gridColumns = 4
	gridPanels  = 24
	gridBins    = 64   // which the intervals of a summary can be joined to
	gridHeight  = 23.0 // of a panel, mm
)

// ChannelGrid draws the light curves of up to 24 channels, chosen evenly in
// wavelength among those with a usable sample: averages of equal intervals of
// time after division by the trend, and the transit model. All panels share their
// axes. points gives the depths that are written into the panels (by channel; it
// may be empty). It is an error when no channel has a usable sample, or when the
// slices of a summary differ in length.
func ChannelGrid(fits []diagnose.Summary, points []spectrum.Point) (Figure, error) {
	const where = "figure of the channels"
	var usable []diagnose.Summary
	for _, f := range fits {
		if err := f.Check(); err != nil {
			return Figure{}, fmt.Errorf("%s: %w", where, err)
		}
		if slices.ContainsFunc(f.Flux.Used, func(n int) bool { return n > 0 }) {
			usable = append(usable, f)
		}
	}
	if len(usable) == 0 {
		return Figure{}, fmt.Errorf("%s: none of %d fits has a usable sample; look at the masks", where, len(fits))
	}
	slices.SortStableFunc(usable, func(a, b diagnose.Summary) int { return cmp.Compare(a.Channel.Lo, b.Channel.Lo) })
	depths := make(map[lightcurve.Channel]spectrum.Point, len(points))
	for _, p := range points {
		depths[p.Channel] = p
	}
	chosen := spread(len(usable), gridPanels)
	cells := make([]cell, len(chosen))
	var xs, ys []float64
	width := 0.0
	for k, i := range chosen {
		f := usable[i]
		from := newZero(f.Mid, f.Flux.Begin)
		every := (len(f.Flux.Value) + gridBins - 1) / gridBins
		c := cell{channel: f.Channel, bins: newBins(f.Flux, every, from.at), rms: f.Scatter.RMS, title: from.title()}
		c.modelX, c.modelY = from.since(f.ModelTime), f.Model
		width = c.bins.width
		cells[k] = c
		xs = append(xs, c.bins.x...)
		ys = append(append(ys, c.bins.y...), c.modelY...)
	}
	sorted := finites(ys)
	x := newSpan(extent(xs)).padded(0.03, 0.03)
	y := newSpan(quantile(sorted, 0.003), quantile(sorted, 0.997)).padded(0.22, 0.08)

	columns := min(gridColumns, len(cells))
	rows := (len(cells) + columns - 1) / columns
	const gap, labels = 1.8, 3
	height := float64(rows)*(gridHeight+gap) - gap
	p := newPage(doubleColumn, bottomMargin+height+1)
	from := p.margin(labels, y)
	boxWidth := (doubleColumn-from-1.5+gap)/gridColumns - gap
	for k, c := range cells {
		row, column := k/columns, k%columns
		panel := p.newPanel(from+float64(column)*(boxWidth+gap), bottomMargin+float64(rows-1-row)*(gridHeight+gap), boxWidth, gridHeight, x, y)
		panel.dots(c.bins.x, c.bins.y, 2, indigo)
		panel.line(c.modelX, c.modelY, stroke{color: amber, width: 0.8})
		panel.note(0.035, 0.06, left, 0, wave(c.channel)+" µm", ink)
		panel.note(0.965, 0.06, right, 0, depthNote(depths, c.channel), quiet)
		panel.axes(axes{xLabels: 4, yLabels: labels, hideX: k+columns < len(cells), hideY: column > 0})
	}
	p.write(vg.Point{X: mm(from) + (mm(boxWidth)*vg.Length(columns)+mm(gap)*vg.Length(columns-1))/2, Y: vg.Points(2.2)},
		label{text: cells[0].title, size: labelSize, along: center, color: ink})
	p.write(vg.Point{X: vg.Points(labelSize - 1), Y: mm(bottomMargin + height/2)},
		label{text: "Relative flux", size: labelSize, along: center, turn: true, color: ink})

	var scatters, deep []float64
	for _, c := range cells {
		scatters = append(scatters, c.rms)
		if p, ok := depths[c.channel]; ok && p.Good() {
			deep = append(deep, p.Depth)
		}
	}
	which := fmt.Sprintf("Light curves of %s", counted(len(cells), "channel"))
	if len(usable) > len(cells) {
		which += fmt.Sprintf(", chosen evenly among the %d with usable samples", len(usable))
	}
	lo, hi := extent(scatters)
	scatter := fmt.Sprintf("Residuals of one integration have a root mean square of %s to %s.", wholeNumber(lo*perMillion), ppm(hi))
	depth := ""
	if d := median(deep); d > 0 {
		depth = fmt.Sprintf("Their median depth is %s.", ppm(d))
	}
	return finish(p, Figure{
		Title: "Channel light curves",
		Caption: sentences(which+fmt.Sprintf(", averaged over %s min after division by the fitted trend, with the transit model (line).", plain(width*minutes, 2)),
			"Numbers are the middle of the channel and its transit depth.", scatter, depth),
		Alt:  sentences(fmt.Sprintf("Small multiples of %s from %s with their transit models.", counted(len(cells), "channel light curve"), waveRange(cells[0].channel.Lo, cells[len(cells)-1].channel.Hi)), depth, scatter),
		Data: gridTable(cells),
	})
}

// depthNote writes the depth of a channel; nothing for a channel that is not
// among the points.
func depthNote(depths map[lightcurve.Channel]spectrum.Point, c lightcurve.Channel) string {
	switch p, ok := depths[c]; {
	case !ok:
		return ""
	case !p.Good():
		return "no depth"
	default:
		return ppmWithError(p.Depth, p.DepthErr)
	}
}

// A cell is one panel of the grid.
type cell struct {
	channel        lightcurve.Channel
	bins           bins
	modelX, modelY []float64
	rms            float64
	title          string
}

// gridTable lists the averages of all cells.
func gridTable(cells []cell) table.Table {
	var index, wave, time, flux []float64
	for _, c := range cells {
		for k := range c.bins.x {
			index = append(index, float64(c.channel.Index))
			wave = append(wave, (c.channel.Lo+c.channel.Hi)/2)
			time = append(time, c.bins.x[k])
			flux = append(flux, c.bins.y[k])
		}
	}
	return table.Table{Title: "Averages of channel light curves", Columns: []table.Column{
		table.Number("channel", "", "position in the input", 6, index),
		table.Number("wave", "um", "middle of the channel", 5, wave),
		table.Number("time", "h", "mean time from the zero of the figure", 6, time),
		table.Number("flux", "", "mean flux divided by the trend", 8, flux),
	}}
}
