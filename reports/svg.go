package reports

import (
	"encoding/base64"
	"encoding/xml"
	"errors"
	"fmt"
	"html"
	"html/template"
	"io"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// Limits on a figure's SVG. A figure beyond them is not shown.
const (
	largestSVG  = 4 << 20 // bytes
	deepestSVG  = 64      // nested elements
	svgElements = 200_000
)

// A picture is SVG that may stand inside an HTML page.
type picture struct {
	SVG     template.HTML
	Dropped int // elements and attributes that were left out
}

// sanitize rewrites an SVG document so that it can do nothing but draw: of
// elements and attributes, those in the lists below pass, with values of known
// form; everything else is left out and counted. Styles become presentation
// attributes, so that the page's content security policy can forbid inline
// styles. Ids get the prefix, so that figures do not meddle with each other or
// with the page. label names the picture for those who cannot see it.
func sanitize(svg, prefix, label string) (picture, error) {
	if len(svg) > largestSVG {
		return picture{}, fmt.Errorf("the drawing has %s; up to %s are shown", size(int64(len(svg))), size(largestSVG))
	}
	s := &svgWriter{prefix: prefix, label: label}
	s.b.Grow(len(svg))
	d := xml.NewDecoder(strings.NewReader(svg))
	for {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			return picture{}, fmt.Errorf("the drawing is not well-formed: %w", err)
		}
		if err := s.token(d, tok); err != nil {
			return picture{}, err
		}
	}
	if !s.closed {
		return picture{}, errors.New("the drawing has no svg element")
	}
	return picture{template.HTML(s.b.String()), s.dropped}, nil
}

type svgWriter struct {
	b        strings.Builder
	prefix   string
	label    string
	open     []string
	closed   bool // the root element is complete
	elements int
	dropped  int
}

const svgSpace = "http://www.w3.org/2000/svg"

// svgNames are the elements that pass. There is none that links, animates,
// scripts, repeats another element, or contains anything but SVG.
var svgNames = map[string]bool{
	"svg": true, "g": true, "defs": true, "title": true, "desc": true,
	"path": true, "rect": true, "circle": true, "ellipse": true, "line": true, "polyline": true, "polygon": true,
	"text": true, "tspan": true, "image": true,
	"clipPath": true, "linearGradient": true, "radialGradient": true, "stop": true,
}

func (s *svgWriter) token(d *xml.Decoder, tok xml.Token) error {
	switch t := tok.(type) {
	case xml.StartElement:
		if s.elements++; s.elements > svgElements {
			return fmt.Errorf("the drawing has more than %d elements", svgElements)
		}
		root := len(s.open) == 0
		known := svgNames[t.Name.Local] && (t.Name.Space == svgSpace || t.Name.Space == "")
		if root && (!known || t.Name.Local != "svg" || s.closed) {
			return errors.New("the drawing has something else than one svg element")
		}
		if !known || !root && t.Name.Local == "svg" {
			s.dropped++
			return s.skip(d)
		}
		if len(s.open) >= deepestSVG {
			return fmt.Errorf("the drawing has more than %d nested elements", deepestSVG)
		}
		s.start(t)
	case xml.EndElement:
		n := len(s.open) - 1
		s.b.WriteString("</" + s.open[n] + ">")
		s.open = s.open[:n]
		s.closed = n == 0
	case xml.CharData:
		if n := len(s.open); n > 0 && slices.Contains(svgTexts, s.open[n-1]) {
			s.b.WriteString(html.EscapeString(string(t)))
		}
	}
	return nil // comments, processing instructions and document types are left out
}

// svgTexts are the elements in which text is shown.
var svgTexts = []string{"text", "tspan", "title", "desc"}

// skip reads up to the end of the element just begun.
func (s *svgWriter) skip(d *xml.Decoder) error {
	for depth := 1; depth > 0; {
		tok, err := d.Token()
		if err != nil {
			return fmt.Errorf("the drawing is not well-formed: %w", err)
		}
		switch tok.(type) {
		case xml.StartElement:
			if s.elements++; s.elements > svgElements {
				return fmt.Errorf("the drawing has more than %d elements", svgElements)
			}
			depth++
		case xml.EndElement:
			depth--
		}
	}
	return nil
}

func (s *svgWriter) start(t xml.StartElement) {
	root := len(s.open) == 0
	s.open = append(s.open, t.Name.Local)
	s.b.WriteString("<" + t.Name.Local)
	if root {
		s.root(t)
	}
	seen := map[string]bool{}
	for _, a := range t.Attr {
		local := a.Name.Local
		switch {
		case a.Name.Space == "xmlns" || local == "xmlns" || local == "version" || local == "class" || local == "role" || local == "aria-label":
			// HTML needs no name spaces, there are no style sheets to refer to classes, and the root is named by label
		case a.Name.Space != "" && local != "href":
			s.dropped++
		case root && (local == "width" || local == "height" || local == "viewBox"):
			// written by root
		case local == "style":
			for property, value := range properties(a.Value) {
				if !seen[property] {
					seen[property] = true
					s.attribute(t.Name.Local, property, value)
				}
			}
		case local == "href" && t.Name.Local != "image":
			s.dropped++
		case !seen[local]:
			seen[local] = true
			s.attribute(t.Name.Local, local, a.Value)
		}
	}
	s.b.WriteString(">")
}

// root writes the drawing's size. It keeps its proportions and takes the
// width of the column, up to a third larger than it was drawn.
func (s *svgWriter) root(t xml.StartElement) {
	var width, height float64
	box := ""
	for _, a := range t.Attr {
		if a.Name.Space != "" {
			continue
		}
		switch a.Name.Local {
		case "width":
			width = pixels(a.Value)
		case "height":
			height = pixels(a.Value)
		case "viewBox":
			if isNumbers.MatchString(a.Value) {
				box = a.Value
			}
		}
	}
	if f := strings.FieldsFunc(box, func(r rune) bool { return r == ' ' || r == ',' }); len(f) == 4 {
		if width == 0 {
			width = pixels(f[2])
		}
	} else if width > 0 && height > 0 {
		box = fmt.Sprintf("0 0 %g %g", width, height)
	} else {
		box = ""
	}
	if width > 0 {
		fmt.Fprintf(&s.b, ` width="%.0f"`, 4*width/3)
	}
	if box != "" {
		s.b.WriteString(` viewBox="` + html.EscapeString(box) + `"`)
	}
	s.b.WriteString(` role="img" aria-label="` + html.EscapeString(s.label) + `"`)
}

// pixels reads a length in px, pt, in, cm or mm; 0 when it is no such thing or
// no sensible size of a figure.
func pixels(s string) float64 {
	scale := 1.0
	for unit, f := range map[string]float64{"px": 1, "pt": 4.0 / 3, "in": 96, "cm": 96 / 2.54, "mm": 96 / 25.4} {
		if rest, ok := strings.CutSuffix(s, unit); ok {
			s, scale = rest, f
			break
		}
	}
	v, err := strconv.ParseFloat(strings.TrimSpace(s), 64)
	if err != nil || !(v*scale >= 1 && v*scale <= 10_000) {
		return 0
	}
	return v * scale
}

// properties are the declarations of a style attribute, in their order.
func properties(style string) func(yield func(property, value string) bool) {
	return func(yield func(property, value string) bool) {
		for part := range strings.SplitSeq(style, ";") {
			property, value, ok := strings.Cut(part, ":")
			if ok && !yield(strings.TrimSpace(property), strings.TrimSpace(value)) {
				return
			}
		}
	}
}

// Forms of attribute values. None of them has room for an address, an escape
// or a function other than the ones named.
var (
	isNumbers   = regexp.MustCompile(`^[-+0-9.eE%, \n\t]*(px|pt|em|in|cm|mm)?$`)
	isPath      = regexp.MustCompile(`^[-+0-9.eEMmLlHhVvCcSsQqTtAaZz, \n\r\t]*$`)
	isTransform = regexp.MustCompile(`^((matrix|translate|scale|rotate|skewX|skewY)\([-+0-9.eE, ]*\)[, ]*)*$`)
	isPaint     = regexp.MustCompile(`^(#[0-9a-fA-F]{3,8}|[a-zA-Z]{1,30}|rgba?\([0-9.%, ]*\))$`)
	isWord      = regexp.MustCompile(`^[-a-zA-Z0-9. ]{0,60}$`)
	isFamily    = regexp.MustCompile(`^[-a-zA-Z0-9, '"]{0,200}$`)
	isReference = regexp.MustCompile(`^url\(#([-a-zA-Z0-9_.]{1,80})\)$`)
	isName      = regexp.MustCompile(`^[-a-zA-Z0-9_.]{1,80}$`)
)

// svgForms are the attributes that pass, each with the form of its value.
var svgForms = map[string]*regexp.Regexp{
	"d": isPath, "points": isNumbers, "transform": isTransform, "gradientTransform": isTransform,
	"x": isNumbers, "y": isNumbers, "x1": isNumbers, "y1": isNumbers, "x2": isNumbers, "y2": isNumbers,
	"dx": isNumbers, "dy": isNumbers, "cx": isNumbers, "cy": isNumbers, "r": isNumbers, "rx": isNumbers, "ry": isNumbers,
	"fx": isNumbers, "fy": isNumbers, "width": isNumbers, "height": isNumbers, "offset": isNumbers, "textLength": isNumbers,
	"fill": isPaint, "stroke": isPaint, "stop-color": isPaint, "color": isPaint,
	"opacity": isNumbers, "fill-opacity": isNumbers, "stroke-opacity": isNumbers, "stop-opacity": isNumbers,
	"stroke-width": isNumbers, "stroke-dasharray": isNumbers, "stroke-dashoffset": isNumbers, "stroke-miterlimit": isNumbers,
	"stroke-linecap": isWord, "stroke-linejoin": isWord, "fill-rule": isWord, "clip-rule": isWord, "vector-effect": isWord,
	"font-family": isFamily, "font-size": isNumbers, "font-style": isWord, "font-weight": isWord, "font-variant": isWord,
	"font-stretch": isWord, "text-anchor": isWord, "dominant-baseline": isWord, "baseline-shift": isWord,
	"letter-spacing": isWord, "word-spacing": isWord, "shape-rendering": isWord, "text-rendering": isWord,
	"image-rendering": isWord, "preserveAspectRatio": isWord, "clipPathUnits": isWord, "gradientUnits": isWord,
	"spreadMethod": isWord, "lengthAdjust": isWord, "visibility": isWord, "display": isWord,
}

// attribute writes an attribute whose value has the form that it must have.
func (s *svgWriter) attribute(element, name, value string) {
	value = strings.TrimSpace(value)
	switch form := svgForms[name]; {
	case name == "id" && isName.MatchString(value):
		value = s.prefix + value
	case name == "href" && isPNG(value):
	case (name == "fill" || name == "stroke" || name == "clip-path") && isReference.MatchString(value):
		value = "url(#" + s.prefix + isReference.FindStringSubmatch(value)[1] + ")"
	case name == "clip-path" && value == "none":
	case form != nil && form.MatchString(value):
	case name == "font" || name == "alignment-baseline" || name == "space":
		return // of no consequence
	default:
		s.dropped++
		return
	}
	s.b.WriteString(" " + name + `="` + html.EscapeString(value) + `"`)
}

// isPNG reports whether an address is a PNG image, here and now.
func isPNG(address string) bool {
	body, ok := strings.CutPrefix(address, "data:image/png;base64,")
	if !ok {
		return false
	}
	b, err := base64.StdEncoding.DecodeString(body)
	return err == nil && strings.HasPrefix(string(b), "\x89PNG\r\n\x1a\n")
}
