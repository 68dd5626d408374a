package figure

import (
	"fmt"
	"math"

	"gonum.org/v1/plot/vg"

	"rimlight/steps/diagnose"
	"rimlight/steps/lightcurve"
	"rimlight/steps/table"
)

// Map draws fluxes against time and wavelength, each channel divided by the
// median of its usable samples, as colours. Samples are averaged to at most 320
// columns; a cell is grey when at least half of its samples are masked. Hours
// count from the begin of the first integration. It is an error when the cube has
// no times or channels, when its slices differ in length, and when no sample is
// usable.
func Map(cube lightcurve.Cube) (Figure, error) {
	const where = "figure of the fluxes"
	if err := checkCube(where, cube); err != nil {
		return Figure{}, err
	}
	rows := make([]mapRow, len(cube.Channels))
	flux := make([]float64, len(cube.Time))
	for j := range rows {
		var err error
		if rows[j], err = newMapRow(cube, j, flux); err != nil {
			return Figure{}, fmt.Errorf("%s: %w", where, err)
		}
	}
	return drawMap(where, rows, mapText{
		title:  "Fluxes against time and wavelength",
		what:   "Fluxes of %s in %s from %s, each channel divided by its median.",
		finish: "Time–wavelength map of the fluxes.",
	})
}

// Detrended draws the same as [Map] after division by the trend that was fitted to
// each channel, so that the transit and what depends on wavelength show. A
// channel of which nothing is known but that it is there is grey. It is an error
// when the channels do not share their times, when the slices of a summary differ
// in length, and when no sample is usable.
func Detrended(fits []diagnose.Summary) (Figure, error) {
	const where = "figure of the detrended fluxes"
	if len(fits) == 0 {
		return Figure{}, fmt.Errorf("%s: no channels; expected at least one", where)
	}
	rows := make([]mapRow, len(fits))
	full := -1 // a channel with samples, which tells what others have
	for j, f := range fits {
		if err := f.Check(); err != nil {
			return Figure{}, fmt.Errorf("%s: %w", where, err)
		}
		if err := checkChannel(where, j, f.Channel); err != nil {
			return Figure{}, err
		}
		rows[j] = mapRow{channel: f.Channel, flux: f.Flux, level: f.Level}
		for k, used := range f.Flux.Used {
			rows[j].used += used
			rows[j].masked += f.Flux.Samples[k] - used
		}
		switch {
		case len(f.Flux.Value) == 0:
			rows[j].level = nan
		case full < 0:
			full = j
		case !sameIntervals(f.Flux, fits[full].Flux):
			return Figure{}, fmt.Errorf("%s: channels %d and %d do not share their times; give the channels of one cube", where, fits[full].Channel.Index, f.Channel.Index)
		}
	}
	if full < 0 {
		return Figure{}, fmt.Errorf("%s: none of %d channels has a sample", where, len(fits))
	}
	for j := range rows {
		if len(rows[j].flux.Value) == 0 {
			rows[j].flux, rows[j].masked = masked(rows[full].flux), rows[full].used+rows[full].masked
		}
	}
	return drawMap(where, rows, mapText{
		title:  "Detrended fluxes against time and wavelength",
		what:   "Fluxes of %s in %s from %s after division by the trend fitted to each channel.",
		finish: "Time–wavelength map of the detrended fluxes.",
	})
}

// sameIntervals reports whether averages are over the same intervals of time.
func sameIntervals(a, b lightcurve.Averages) bool {
	return a.Begin == b.Begin && a.End == b.End && len(a.Value) == len(b.Value)
}

// masked gives averages over the same intervals, without a usable sample.
func masked(a lightcurve.Averages) lightcurve.Averages {
	out := a
	out.Value, out.Used = make([]float64, len(a.Value)), make([]int, len(a.Value))
	for k := range out.Value {
		out.Value[k] = nan
	}
	return out
}

// A mapText is what differs between the two maps in words.
type mapText struct{ title, what, finish string }

// A mapRow is one channel of a map. All rows of a map have the same intervals of
// time.
type mapRow struct {
	channel lightcurve.Channel
	flux    lightcurve.Averages // about 1
	used    int
	masked  int
	level   float64 // what the fluxes were divided by, in the unit of the input; NaN when nothing was usable
}

// newMapRow divides the usable fluxes of channel j by their median, and averages
// them. It overwrites flux, which has the length of a channel.
func newMapRow(cube lightcurve.Cube, j int, flux []float64) (mapRow, error) {
	for i, f := range cube.Flux[j] {
		flux[i] = nan
		if cube.Mask[j][i] == 0 && finite(f) {
			flux[i] = f
		}
	}
	row := mapRow{channel: cube.Channels[j], level: median(flux)}
	for i := range flux {
		if flux[i] /= row.level; finite(flux[i]) {
			row.used++
		} else {
			flux[i] = nan
		}
	}
	row.masked = len(flux) - row.used
	var err error
	row.flux, err = lightcurve.Average(cube.Time, flux, diagnose.Intervals)
	return row, err
}

// checkCube reports what keeps a cube from being drawn.
func checkCube(where string, cube lightcurve.Cube) error {
	n, m := len(cube.Time), len(cube.Channels)
	if n == 0 || m == 0 {
		return fmt.Errorf("%s: %d times and %d channels; expected at least one of each", where, n, m)
	}
	if len(cube.Flux) != m || len(cube.Mask) != m {
		return fmt.Errorf("%s: %d series of fluxes and %d of flags; expected one for each of %d channels", where, len(cube.Flux), len(cube.Mask), m)
	}
	for j, c := range cube.Channels {
		if len(cube.Flux[j]) != n || len(cube.Mask[j]) != n {
			return fmt.Errorf("%s: channel %d has %d fluxes and %d flags; expected one of each for %d times", where, j, len(cube.Flux[j]), len(cube.Mask[j]), n)
		}
		if err := checkChannel(where, j, c); err != nil {
			return err
		}
	}
	if lo, _ := extent(cube.Time); !finite(lo) {
		return fmt.Errorf("%s: no time is a finite number", where)
	}
	return nil
}

// checkChannel reports what keeps a channel from being drawn.
func checkChannel(where string, j int, c lightcurve.Channel) error {
	if !(c.Lo < c.Hi) || !finite(c.Lo) || !finite(c.Hi) {
		return fmt.Errorf("%s: channel %d reaches from %g to %g um; expected an interval, lower edge first", where, j, c.Lo, c.Hi)
	}
	return nil
}

// drawMap draws rows, of which there is at least one.
func drawMap(where string, rows []mapRow, words mapText) (Figure, error) {
	raster := newRaster(rows)
	values := finites(raster.value)
	if len(values) == 0 {
		return Figure{}, fmt.Errorf("%s: none of the samples of %d channels is usable; look at the mask", where, len(rows))
	}
	lo, hi := quantile(values, 0.005)-1, quantile(values, 0.995)-1
	factor, unit := perCent, "%"
	if hi-lo < 2e-3 {
		factor, unit = perMillion, "ppm"
	}
	scale := newSpan(lo*factor, hi*factor)

	const height, barHeight = 68.0, 58.0
	p := newPage(doubleColumn, bottomMargin+height+1)
	waves := newSpan(raster.lo, raster.hi)
	from := p.margin(8, waves)
	barAt := doubleColumn - 20.5
	length := newSpan(0, (raster.to-raster.from)*hours)
	panel := p.newPanel(from, bottomMargin, barAt-3-from, height, length, waves)
	panel.image(panel.box, raster.picture(func(v float64) float64 { return scale.at((v - 1) * factor) }))
	panel.axes(axes{
		xTitle: fmt.Sprintf("Time from BJD_TDB %.5f (h)", raster.from), yTitle: waveTitle,
		xLabels: 8, yLabels: 8, margin: from,
	})
	bar := p.newPanel(barAt, bottomMargin+height-barHeight, 3.5, barHeight, newSpan(0, 1), scale)
	bar.image(bar.box, rampPicture())
	bar.colorAxis("Relative flux − 1 ("+unit+")", 6)
	legend := p.newPanel(barAt, bottomMargin, 3.5, 3.5, newSpan(0, 1), newSpan(0, 1))
	legend.fill(legend.box, noData)
	legend.stroke(legend.box.Path(), stroke{color: ink, width: axisWidth})
	legend.write(legend.point(1.35, 0.5), label{text: "masked", size: tickSize, up: center, color: ink})

	var dead []string
	used, all, integrations := 0, 0, 0
	columns := make([][]float64, 6)
	for _, r := range rows {
		used, all = used+r.used, all+r.used+r.masked
		integrations = max(integrations, r.used+r.masked)
		if r.used == 0 {
			dead = append(dead, wave(r.channel)+" µm")
		}
		for k, v := range []float64{float64(r.channel.Index), r.channel.Lo, r.channel.Hi, r.level, float64(r.used), float64(r.masked)} {
			columns[k] = append(columns[k], v)
		}
	}
	masked := fmt.Sprintf("%s %% of the samples are masked.", plain(perCent*float64(all-used)/float64(all), 2))
	lost := ""
	if len(dead) > 0 {
		lost = fmt.Sprintf("%s without a usable sample (%s).", counted(len(dead), "channel"), listed(dead, 6))
	}
	how := "Each cell is one sample."
	if raster.most > 1 {
		how = fmt.Sprintf("A cell averages up to %s.", counted(raster.most, "sample"))
	}
	colours := fmt.Sprintf("Colours span %s to %s %s, which holds 99 %% of the cells.", plain(scale.lo, 3), plain(scale.hi, 3), unit)
	return finish(p, Figure{
		Title: words.title,
		Caption: sentences(fmt.Sprintf(words.what, counted(integrations, "integration"), counted(len(rows), "channel"), waveRange(raster.lo, raster.hi)),
			how, colours, masked, lost, "Grey: at least half of a cell is masked."),
		Alt: sentences(words.finish, fmt.Sprintf("Over %s h the relative flux varies from %s to %s %s.", plain(length.hi-length.lo, 3), plain(scale.lo, 3), plain(scale.hi, 3), unit), masked, lost),
		Data: table.Table{Title: "Channels of the map", Columns: []table.Column{
			table.Number("channel", "", "position in the input", 6, columns[0]),
			table.Number("wave_lo", "um", "lower edge", 6, columns[1]),
			table.Number("wave_hi", "um", "upper edge", 6, columns[2]),
			table.Number("level", "", "flux that the channel was divided by, in the unit of the input", 7, columns[3]),
			table.Number("usable", "", "samples", 6, columns[4]),
			table.Number("masked", "", "samples", 6, columns[5]),
		}},
	})
}

// colorAxis draws the frame of a colour bar, and marks, numbers and a title to
// its right.
func (p *panel) colorAxis(title string, labels int) {
	p.stroke(p.box.Path(), stroke{color: ink, width: axisWidth})
	widest := 0.0
	for _, t := range p.y.ticks(labels) {
		if t.label == "" {
			continue
		}
		y := p.y.at(t.value)
		at := p.point(1, y)
		var mark vg.Path
		mark.Move(at)
		mark.Line(at.Add(vg.Point{X: vg.Points(tickLength)}))
		p.stroke(mark, stroke{color: ink, width: axisWidth})
		at.X += vg.Points(tickLength + tickGap)
		p.write(at, label{text: t.label, size: tickSize, up: center, color: ink})
		widest = math.Max(widest, p.width(t.label, tickSize).Points())
	}
	at := p.point(1, 0.5)
	at.X += vg.Points(tickLength + tickGap + widest + 3.5 + labelSize*capHeight)
	p.write(at, label{text: title, size: labelSize, along: center, turn: true, color: ink})
}
