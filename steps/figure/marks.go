package figure

import imagecolor "image/color"

// draw draws measurements of channels: bars of their widths, of one standard
// deviation, and a disc.
func (p *panel) draw(m points, rim, fill imagecolor.NRGBA) {
	s := stroke{color: rim, width: 0.7}
	p.segments(m.lo, m.y, m.hi, m.y, s)
	p.errorBars(m.x, m.y, m.err, s)
	p.rings(m.x, m.y, 3.2, rim, fill)
}

// edgeMarks draws short vertical lines at the positions x, from one share of the
// height to another.
func (p *panel) edgeMarks(x []float64, from, to float64, s stroke) {
	height := func(share float64) float64 { return p.y.lo + share*(p.y.hi-p.y.lo) }
	y0, y1 := make([]float64, len(x)), make([]float64, len(x))
	for i := range x {
		y0[i], y1[i] = height(from), height(to)
	}
	p.segments(x, y0, x, y1, s)
}
