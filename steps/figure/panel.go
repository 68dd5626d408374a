package figure

import (
	imagecolor "image/color"
	"math"

	"gonum.org/v1/plot/vg"
)

// Lengths and widths of axes, in points.
const (
	axisWidth  = 0.5
	tickLength = 2.8
	minorShare = 0.6 // length of a mark without label in units of tickLength
	tickGap    = 2.0 // between a mark and its label
)

// A panel is a rectangle of a page with two axes.
type panel struct {
	*page
	box  vg.Rectangle
	x, y span
}

// newPanel returns a panel whose box has its lower left corner at (x, y) mm.
func (p *page) newPanel(x, y, width, height float64, xs, ys span) *panel {
	corner := vg.Point{X: mm(x), Y: mm(y)}
	return &panel{page: p, box: vg.Rectangle{Min: corner, Max: corner.Add(vg.Point{X: mm(width), Y: mm(height)})}, x: xs, y: ys}
}

// single fills the page with one panel, which has about so many numbers along its
// axes, and returns it with the axes to be titled and drawn.
func (p *page) single(xs, ys span, xLabels, yLabels int) (*panel, axes) {
	margin := p.margin(yLabels, ys)
	width, height := (p.w / vg.Millimeter).Points(), (p.h / vg.Millimeter).Points()
	return p.newPanel(margin, bottomMargin, width-margin-1.5, height-bottomMargin-1, xs, ys),
		axes{xLabels: xLabels, yLabels: yLabels, margin: margin}
}

// point returns the place at shares of the panel's width and height.
func (p *panel) point(fx, fy float64) vg.Point {
	size := p.box.Size()
	return vg.Point{X: p.box.Min.X + vg.Length(fx)*size.X, Y: p.box.Min.Y + vg.Length(fy)*size.Y}
}

// An axes says what is written along the axes of a panel.
type axes struct {
	xTitle, yTitle   string
	xLabels, yLabels int     // about how many numbers to write along each axis
	hideX, hideY     bool    // marks without numbers, and no title
	margin           float64 // room to the left of the box, mm; the y title stands at its far side
}

// bottomMargin is the room that numbers and title below a box need, in mm.
const bottomMargin = 8.6

// margin returns the room that numbers and title to the left of a box need, in
// mm, for axes with about so many numbers.
func (p *page) margin(labels int, axes ...span) float64 {
	widest := vg.Length(0)
	for _, s := range axes {
		for _, t := range s.ticks(labels) {
			widest = max(widest, p.width(t.label, tickSize))
		}
	}
	return ((widest + vg.Points(tickLength+tickGap+4+labelSize)) / vg.Millimeter).Points()
}

// axes draws the frame, the marks outside it, their numbers and the titles.
func (p *panel) axes(a axes) {
	p.stroke(p.box.Path(), stroke{color: ink, width: axisWidth})
	var marks vg.Path
	mark := func(at vg.Point, dx, dy float64, labelled bool) {
		length := vg.Points(tickLength)
		if !labelled {
			length *= minorShare
		}
		marks.Move(at)
		marks.Line(at.Add(vg.Point{X: vg.Length(dx) * length, Y: vg.Length(dy) * length}))
	}
	numbers := func(at vg.Point, l label) {
		l.size, l.color = tickSize, ink
		p.write(at, l)
	}
	gap := vg.Points(tickLength + tickGap)
	for _, t := range p.x.ticks(a.xLabels) {
		at := p.point(p.x.at(t.value), 0)
		mark(at, 0, -1, t.label != "")
		if t.label != "" && !a.hideX {
			numbers(at.Sub(vg.Point{Y: gap}), label{text: t.label, along: center, up: 1})
		}
	}
	for _, t := range p.y.ticks(a.yLabels) {
		at := p.point(0, p.y.at(t.value))
		mark(at, -1, 0, t.label != "")
		if t.label != "" && !a.hideY {
			numbers(at.Sub(vg.Point{X: gap}), label{text: t.label, along: right, up: center})
		}
	}
	p.stroke(marks, stroke{color: ink, width: axisWidth})
	if !a.hideX && a.xTitle != "" {
		at := p.point(0.5, 0)
		at.Y -= gap + vg.Points(tickSize*capHeight+4.5)
		p.write(at, label{text: a.xTitle, size: labelSize, along: center, up: 1, color: ink})
	}
	if !a.hideY && a.yTitle != "" {
		at := p.point(0, 0.5)
		at.X -= mm(a.margin) - vg.Points(labelSize-1)
		p.write(at, label{text: a.yTitle, size: labelSize, along: center, turn: true, color: ink})
	}
}

// place returns the point of the page where (x, y) of the axes lies, and whether
// it is within the box.
func (p *panel) place(x, y float64) (vg.Point, bool) {
	fx, fy := p.x.at(x), p.y.at(y)
	if !(fx >= 0 && fx <= 1 && fy >= 0 && fy <= 1) {
		return vg.Point{}, false
	}
	return p.point(fx, fy), true
}

// dots draws a disc of that diameter (points) at every point within the box and
// returns how many there are. All of them are one path.
func (p *panel) dots(xs, ys []float64, diameter float64, c imagecolor.NRGBA) int {
	var path vg.Path
	for i := range xs {
		if at, ok := p.place(xs[i], ys[i]); ok {
			path.Move(at)
			path.Line(at)
		}
	}
	p.stroke(path, stroke{color: c, width: diameter})
	return len(path) / 2
}

// rings draws discs with a rim.
func (p *panel) rings(xs, ys []float64, diameter float64, rim, inner imagecolor.NRGBA) {
	p.dots(xs, ys, diameter, rim)
	if inner != rim {
		p.dots(xs, ys, diameter-1.3, inner)
	}
}

// line connects the points in their order, cut at the box; a point that is not
// finite breaks it.
func (p *panel) line(xs, ys []float64, s stroke) {
	var path vg.Path
	var last vg.Point
	for i := 1; i < len(xs); i++ {
		a, b, ok := clip(p.x.at(xs[i-1]), p.y.at(ys[i-1]), p.x.at(xs[i]), p.y.at(ys[i]))
		if !ok {
			continue
		}
		from, to := p.point(a[0], a[1]), p.point(b[0], b[1])
		if len(path) == 0 || from != last {
			path.Move(from)
		}
		path.Line(to)
		last = to
	}
	p.stroke(path, s)
}

// segments draws a separate line from (x0, y0) to (x1, y1) for each element, cut
// at the box.
func (p *panel) segments(x0, y0, x1, y1 []float64, s stroke) {
	var path vg.Path
	for i := range x0 {
		a, b, ok := clip(p.x.at(x0[i]), p.y.at(y0[i]), p.x.at(x1[i]), p.y.at(y1[i]))
		if ok {
			path.Move(p.point(a[0], a[1]))
			path.Line(p.point(b[0], b[1]))
		}
	}
	p.stroke(path, s)
}

// level draws a horizontal line across the box.
func (p *panel) level(y float64, s stroke) {
	p.segments([]float64{p.x.lo}, []float64{y}, []float64{p.x.hi}, []float64{y}, s)
}

// note writes a short text into the box at shares of its width and height.
func (p *panel) note(fx, fy, along, up float64, text string, c imagecolor.NRGBA) {
	p.write(p.point(fx, fy), label{text: text, size: noteSize, along: along, up: up, color: c})
}

// clip cuts a line between two points to the unit square (Liang & Barsky 1984).
// It is false when nothing is left or a coordinate is not finite.
func clip(x0, y0, x1, y1 float64) (a, b [2]float64, ok bool) {
	if !finite(x0) || !finite(y0) || !finite(x1) || !finite(y1) {
		return a, b, false
	}
	dx, dy := x1-x0, y1-y0
	from, to := 0.0, 1.0
	for _, side := range [4][2]float64{{-dx, x0}, {dx, 1 - x0}, {-dy, y0}, {dy, 1 - y0}} {
		speed, room := side[0], side[1]
		switch {
		case speed == 0 && room < 0:
			return a, b, false
		case speed < 0:
			from = max(from, room/speed)
		case speed > 0:
			to = min(to, room/speed)
		}
	}
	if !(from <= to) {
		return a, b, false
	}
	return [2]float64{x0 + from*dx, y0 + from*dy}, [2]float64{x0 + to*dx, y0 + to*dy}, true
}

// finite reports whether x is neither NaN nor infinite.
func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
