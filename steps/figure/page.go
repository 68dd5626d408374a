package figure

import (
	"bytes"
	"fmt"
	"html"
	"image"
	imagecolor "image/color"
	"math"
	"strings"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/font/liberation"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/vgsvg"
)

// Widths of a figure in print, in mm, for one and two journal columns.
const (
	singleColumn = 85
	doubleColumn = 174
)

// Sizes of type in points.
const (
	labelSize = 8   // axis titles
	tickSize  = 7   // numbers at ticks, keys
	noteSize  = 6.5 // notes inside panels
)

// fontStack names the font that text is measured with, and fonts of (nearly) the
// same widths for where it is missing.
const fontStack = "'Liberation Sans', Arial, Helvetica, sans-serif"

// A page is a drawing of fixed size. Lengths are in points, from the lower left
// corner.
type page struct {
	canvas *vgsvg.Canvas
	w, h   vg.Length
	face   font.Face
}

func mm(x float64) vg.Length { return vg.Length(x) * vg.Millimeter }

// newPage returns an empty page of a width and height in mm.
func newPage(width, height float64) *page {
	w, h := mm(width), mm(height)
	faces := font.NewCache(liberation.Collection())
	face := faces.Lookup(font.Font{Typeface: "Liberation", Variant: "Sans"}, vg.Points(tickSize))
	return &page{canvas: vgsvg.New(w, h), w: w, h: h, face: face}
}

// Where a text lies along its direction relative to its anchor.
const (
	left   = 0.0
	center = 0.5
	right  = 1.0
)

// capHeight is the height of capital letters and digits in units of the size of
// the type.
const capHeight = 0.72

// A label is a text to be drawn.
type label struct {
	text  string
	size  float64 // points
	along float64 // left, center or right
	up    float64 // 0 sets the baseline at the anchor, 1 the top of capitals
	turn  bool    // reads upwards
	color imagecolor.NRGBA
}

// write draws a label at its anchor.
func (p *page) write(at vg.Point, l label) {
	face := p.face
	face.Font.Size = vg.Points(l.size)
	shift := vg.Point{
		X: -face.Width(l.text) * vg.Length(l.along),
		Y: -vg.Points(l.size*capHeight) * vg.Length(l.up),
	}
	p.canvas.SetColor(l.color)
	if !l.turn {
		p.canvas.FillString(face, at.Add(shift), l.text)
		return
	}
	p.canvas.Push()
	p.canvas.Translate(at)
	p.canvas.Rotate(math.Pi / 2)
	p.canvas.FillString(face, shift, l.text)
	p.canvas.Pop()
}

// width returns the width of a text.
func (p *page) width(text string, size float64) vg.Length {
	face := p.face
	face.Font.Size = vg.Points(size)
	return face.Width(text)
}

// A stroke is how a line is drawn.
type stroke struct {
	color imagecolor.NRGBA
	width float64 // points
	dash  []vg.Length
}

// stroke draws a path.
func (p *page) stroke(path vg.Path, s stroke) {
	if len(path) == 0 {
		return
	}
	p.canvas.SetColor(s.color)
	p.canvas.SetLineWidth(vg.Points(s.width))
	p.canvas.SetLineDash(s.dash, 0)
	p.canvas.Stroke(path)
}

// fill fills a rectangle.
func (p *page) fill(r vg.Rectangle, c imagecolor.NRGBA) {
	p.canvas.SetColor(c)
	p.canvas.Fill(r.Path())
}

// image fills a rectangle with an image, stretched to it.
func (p *page) image(r vg.Rectangle, img image.Image) { p.canvas.DrawImage(r, img) }

// svg returns the drawing as an SVG element that can stand alone or inside an
// HTML page, for which alt is the text alternative.
//
// What the canvas writes is changed in these ways: no XML declaration, which
// cannot stand inside HTML; one list of fonts for the whole drawing; round ends of
// lines, which make a line without length a dot; images stretched to their frame
// without smoothing, under the type that they have.
func (p *page) svg(alt string) (string, error) {
	var out bytes.Buffer
	if _, err := p.canvas.WriteTo(&out); err != nil {
		return "", fmt.Errorf("draw figure: %w", err)
	}
	text := out.String()
	start := strings.Index(text, "<svg ")
	if start < 0 {
		return "", fmt.Errorf("draw figure: the canvas wrote no svg element")
	}
	root := fmt.Sprintf(`<svg role="img" aria-label="%s" font-family="%s" stroke-linecap="round" stroke-linejoin="round" `,
		html.EscapeString(alt), fontStack)
	body := strings.NewReplacer(
		"font-family:Liberation Sans;font-variant:normal;font-weight:normal;font-style:normal;", "",
		"data:image/jpg;", "data:image/png;",
		"<image ", `<image preserveAspectRatio="none" style="image-rendering:pixelated" `,
		"\n\tstyle=", " style=",
		"\n\txmlns", " xmlns",
	).Replace(text[start+len("<svg "):])
	return root + body, nil
}
