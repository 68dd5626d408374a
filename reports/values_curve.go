package reports

import (
	"cmp"
	"fmt"
	"math"
	"strings"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// facts pairs names and texts, leaving out those without a text.
func facts(pairs ...string) []fact {
	var out []fact
	for i := 0; i+1 < len(pairs); i += 2 {
		if pairs[i+1] != "" {
			out = append(out, fact{pairs[i], pairs[i+1]})
		}
	}
	return out
}

func channelsText(channels []lightcurve.Channel) string {
	lo, hi, ok := span(channels)
	if !ok {
		return ""
	}
	return fmt.Sprintf("%s from %s to %s µm", count(len(channels), "channel"), number(lo, 4), number(hi, 4))
}

func channelText(c lightcurve.Channel) string {
	s := fmt.Sprintf("%s to %s µm", number(c.Lo, 5), number(c.Hi, 5))
	if c.Index < 0 {
		return "white light, " + s
	}
	return fmt.Sprintf("number %d, %s", c.Index, s)
}

// points shows depths that are not yet a spectrum. Where one follows, their
// table is folded away.
func (b *builder) points(title string, points []spectrum.Point) []block {
	blocks := b.spectrum(title, spectrum.Spectrum{Points: points})
	if b.assembled && len(points) > 1 {
		blocks[0].Grid.Folded = count(len(points), "transit depth")
	}
	return blocks
}

// spectrum shows a spectrum as a table, by wavelength.
func (b *builder) spectrum(title string, s spectrum.Spectrum) []block {
	points := byWavelength(s.Points)
	b.tables++
	g := &gridView{Number: b.tables, Named: true, Scroll: len(points) > scrolledRows, Wide: true,
		Caption: "Transit depths by wavelength"}
	g.Columns = append(g.Columns, []columnView{
		{Name: "channel"}, {Name: "from", Unit: "um", Number: true}, {Name: "to", Unit: "um", Number: true},
		{Name: "depth", Unit: "ppm", Number: true}, {Name: "Rp/Rs", Number: true},
		{Name: "χ²/dof", Number: true}, {Name: "scatter", Unit: "ppm", Number: true},
		{Name: "fitted", Number: true}, {Name: "masked", Number: true},
	}...)
	limb := 0
	for _, p := range points {
		limb = max(limb, min(len(p.Limb), 4))
	}
	for i := range limb {
		g.Columns = append(g.Columns, columnView{Name: "u" + string([]rune("₁₂₃₄")[i]), Number: true})
	}
	g.Columns = append(g.Columns, columnView{Name: "flag"})
	for i, p := range points {
		if i == 4*shownRows {
			g.Note = fmt.Sprintf("The first %d of %d channels are shown. ", i, len(points))
			break
		}
		g.Rows = append(g.Rows, pointRow(p, limb))
	}
	t := spectrumTable(points)
	g.File = b.tableFile(t, len(points), title)
	if s.Law != "" || s.Policy != "" {
		g.Note += strings.Trim(fmt.Sprintf("Limb darkening: %s law, %s.", label(s.Law), label(s.Policy)), ", ")
	}
	return []block{{Grid: g}}
}

func pointRow(p spectrum.Point, limb int) rowView {
	if !p.Good() {
		return rowView{Class: "flagged", Rest: "no depth: " + cmp.Or(label(p.Flag), "no reason was given"),
			Cells: []string{fmt.Sprint(p.Channel.Index), fixed(p.Channel.Lo, 4), fixed(p.Channel.Hi, 4)}}
	}
	row := rowView{Cells: []string{
		fmt.Sprint(p.Channel.Index), fixed(p.Channel.Lo, 4), fixed(p.Channel.Hi, 4),
		ppm(p.Depth, p.DepthErr), "", "", "", grouped(p.Used), grouped(p.Masked),
	}}
	for i := range limb {
		row.Cells = append(row.Cells, limbText(p, i))
	}
	row.Cells = append(row.Cells, label(p.Flag))
	if !math.IsNaN(p.RadiusRatio) && p.RadiusRatio != 0 {
		row.Cells[4] = measured(p.RadiusRatio, p.RadiusRatioErr)
	}
	if p.Dof > 0 && !math.IsNaN(p.Chi2) {
		row.Cells[5] = fixed(p.Chi2/float64(p.Dof), 3)
	}
	if p.Scatter > 0 {
		row.Cells[6] = fixed(p.Scatter*1e6, 0)
	}
	if p.Flag != "" {
		row.Class = "flagged"
	}
	return row
}

// limbText is limb-darkening coefficient number i; without an error when it
// was held.
func limbText(p spectrum.Point, i int) string {
	switch {
	case i >= len(p.Limb):
		return ""
	case i < len(p.LimbErr) && p.LimbErr[i] > 0:
		return measured(p.Limb[i], p.LimbErr[i])
	}
	return number(p.Limb[i], 3)
}

// spectrumTable is the spectrum with its numbers in full, for a file.
func spectrumTable(points []spectrum.Point) table.Table {
	columns := []table.Column{{Name: "wave_lo", Unit: "um"}, {Name: "wave_hi", Unit: "um"}, {Name: "depth"}, {Name: "depth_err"},
		{Name: "channel"}, {Name: "radius_ratio"}, {Name: "radius_ratio_err"}, {Name: "chi2"}, {Name: "dof"}, {Name: "used"},
		{Name: "masked"}, {Name: "scatter"}, {Name: "flag", Text: []string{}}}
	for _, p := range points {
		for i, v := range []float64{p.Channel.Lo, p.Channel.Hi, p.Depth, p.DepthErr, float64(p.Channel.Index), p.RadiusRatio,
			p.RadiusRatioErr, p.Chi2, float64(p.Dof), float64(p.Used), float64(p.Masked), p.Scatter} {
			columns[i].Number = append(columns[i].Number, v)
		}
		last := &columns[len(columns)-1]
		last.Text = append(last.Text, p.Flag)
	}
	return table.Table{Columns: columns}
}
