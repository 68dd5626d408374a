package figure

import (
	imagecolor "image/color"
	"strings"

	"gonum.org/v1/plot/vg"
)

// finish adds the drawing to a figure.
func finish(p *page, f Figure) (Figure, error) {
	var err error
	f.SVG, err = p.svg(f.Alt)
	if err != nil {
		return Figure{}, err
	}
	return f, nil
}

// color returns the opaque colour 0xRRGGBB.
func color(rgb uint32) imagecolor.NRGBA {
	return imagecolor.NRGBA{uint8(rgb >> 16), uint8(rgb >> 8), uint8(rgb), 0xff}
}

// errorBars draws vertical lines of one standard deviation to either side.
func (p *panel) errorBars(x, y, err []float64, s stroke) {
	lo, hi := make([]float64, len(y)), make([]float64, len(y))
	for i := range y {
		lo[i], hi[i] = y[i]-err[i], y[i]+err[i]
	}
	p.segments(x, lo, x, hi, s)
}

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

// A key is one line of a legend: a mark and what it stands for.
type key struct {
	text string
	line stroke // drawn when its width is above 0
	dot  float64
	rim  imagecolor.NRGBA
	fill imagecolor.NRGBA
}

// legend writes keys below each other, with the first at shares of the width and
// height of the box.
func (p *panel) legend(fx, fy float64, keys []key) {
	at := p.point(fx, fy)
	for _, k := range keys {
		indent := 12.0
		if k.line.width > 0 {
			indent = 17
		}
		middle := at.Add(vg.Point{X: vg.Points(7), Y: vg.Points(tickSize * capHeight / 2)})
		if k.line.width > 0 {
			var path vg.Path
			path.Move(middle.Sub(vg.Point{X: vg.Points(6)}))
			path.Line(middle.Add(vg.Point{X: vg.Points(6)}))
			p.stroke(path, k.line)
		}
		if k.dot > 0 {
			dot := vg.Path{}
			dot.Move(middle)
			dot.Line(middle)
			p.stroke(dot, stroke{color: k.rim, width: k.dot})
			p.stroke(dot, stroke{color: k.fill, width: k.dot - 1.3})
		}
		p.write(at.Add(vg.Point{X: vg.Points(indent)}), label{text: k.text, size: tickSize, color: ink})
		at.Y -= vg.Points(tickSize + 2.5)
	}
}

func scaled(x []float64, factor float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = v * factor
	}
	return out
}

func floats(x []int) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = float64(v)
	}
	return out
}

func lowerFirst(s string) string { return strings.ToLower(s[:1]) + s[1:] }
