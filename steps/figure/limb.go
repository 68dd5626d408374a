package figure

import (
	"fmt"

	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// LimbDarkening draws the first two limb-darkening coefficients against
// wavelength, with one standard deviation; coefficients that were held have no
// vertical bar. It is an error when no channel has a coefficient.
func LimbDarkening(all []spectrum.Point) (Figure, error) {
	var u [2]points
	held, shown := 0, 0
	var edges []float64
	columns := make([][]float64, 6)
	for _, p := range all {
		c := p.Channel
		if !finite(c.Lo) || !finite(c.Hi) {
			continue
		}
		edges = append(edges, c.Lo, c.Hi)
		row := []float64{c.Lo, c.Hi, nan, nan, nan, nan}
		known, free := false, false
		for k := range u {
			if k >= len(p.Limb) || !finite(p.Limb[k]) {
				continue
			}
			err := 0.0
			if k < len(p.LimbErr) && finite(p.LimbErr[k]) {
				err = p.LimbErr[k]
			}
			u[k].add(c.Lo, c.Hi, p.Limb[k], err)
			row[2+2*k], row[3+2*k] = p.Limb[k], err
			known, free = true, free || err > 0
		}
		if !known {
			continue
		}
		shown++
		if !free {
			held++
		}
		for k := range columns {
			columns[k] = append(columns[k], row[k])
		}
	}
	if shown == 0 {
		return Figure{}, fmt.Errorf("figure of limb darkening: none of %d channels has a coefficient", len(all))
	}
	lo, hi := u[0].with(u[1]).core()
	panel, frame := newPage(singleColumn, 64).single(newSpan(extent(edges)).padded(0.02, 0.02), newSpan(lo, hi).padded(0.06, 0.2), 6, 6)
	panel.draw(u[1], amber, color(0xffffff))
	panel.draw(u[0], indigo, indigo)
	frame.xTitle, frame.yTitle = waveTitle, "Limb-darkening coefficient"
	panel.axes(frame)
	panel.legend(0.72, 0.91, []key{{text: "u₁", dot: 3.6, rim: indigo, fill: indigo}})
	panel.legend(0.85, 0.91, []key{{text: "u₂", dot: 3.6, rim: amber, fill: color(0xffffff)}})
	finding := func(k int) string {
		if len(u[k].y) == 0 {
			return ""
		}
		lo, hi := extent(u[k].y)
		text := fmt.Sprintf("u%d lies between %s and %s, with a median of %s", k+1, plain(lo, 2), plain(hi, 2), plain(median(u[k].y), 2))
		if typical := median(u[k].err); typical > 0 {
			text += fmt.Sprintf(" and a median error of %s", plain(typical, 2))
		}
		return text + "."
	}
	how := ""
	switch {
	case held == shown:
		how = "All coefficients were held."
	case held > 0:
		how = fmt.Sprintf("In %s both were held.", counted(held, "channel"))
	}
	caption := sentences(
		fmt.Sprintf("Limb-darkening coefficients u₁ (filled) and u₂ (hollow) of %s; horizontal bars are the widths of the channels, vertical bars one standard deviation.", counted(shown, "channel")),
		finding(0), finding(1), how)
	return finish(panel.page, Figure{
		Title: "Limb darkening", Caption: caption,
		Alt: sentences("Limb-darkening coefficients against wavelength.", finding(0), finding(1), how),
		Data: table.Table{Title: "Limb-darkening coefficients", Columns: []table.Column{
			table.Number("wave_lo", "um", "lower edge of the channel", 6, columns[0]),
			table.Number("wave_hi", "um", "upper edge of the channel", 6, columns[1]),
			table.Number("u1", "", "first coefficient", 4, columns[2]),
			table.Number("u1_err", "", "one standard deviation, 0 where held", 2, columns[3]),
			table.Number("u2", "", "second coefficient", 4, columns[4]),
			table.Number("u2_err", "", "one standard deviation, 0 where held", 2, columns[5]),
		}},
	})
}
