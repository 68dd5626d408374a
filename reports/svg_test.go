package reports

import (
	"encoding/xml"
	"io"
	"strings"
	"testing"
)

func wrap(inner string) string {
	return `<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" role="img" aria-label="b" width="10pt" height="10pt" viewBox="0 0 10 10">` + inner + `</svg>`
}

func TestSanitizeKeeps(t *testing.T) {
	p, err := sanitize(`<?xml version="1.0"?><!DOCTYPE svg><!-- c -->`+wrap(`<defs><clipPath id="c"><rect x="0" y="0" width="5" height="5"/></clipPath></defs>
<g transform="scale(1, -1) translate(0, -10)" clip-path="url(#c)"><path d="M0,0L1.5e1,-2Z" style="fill:none; stroke:#0000FF;stroke-width:0.5;stroke-dasharray:1,2"/></g>
<text x="1" y="2" style="font-family:Liberation Serif;font-size:9px">λ &lt; 5 µm</text><image x="0" y="0" width="1" height="1" xlink:href="data:image/png;base64,`+onePixel+`"/>`), "f7-", `a "line"`)
	if err != nil || p.Dropped != 0 {
		t.Fatal(p.Dropped, err)
	}
	got := string(p.SVG)
	for _, want := range []string{
		`<svg width="18" viewBox="0 0 10 10" role="img" aria-label="a &#34;line&#34;">`, `<clipPath id="f7-c">`, `clip-path="url(#f7-c)"`, `transform="scale(1, -1) translate(0, -10)"`,
		`<path d="M0,0L1.5e1,-2Z" fill="none" stroke="#0000FF" stroke-width="0.5" stroke-dasharray="1,2"></path>`, `font-family="Liberation Serif"`, `λ &lt; 5 µm</text>`, `href="data:image/png;base64,` + onePixel,
	} {
		if !strings.Contains(got, want) {
			t.Errorf("%s is missing from\n%s", want, got)
		}
	}
}

func TestSanitizeDrops(t *testing.T) {
	for _, inner := range []string{
		`<script>alert(1)</script>`, `<script href="x"/>`, `<foreignObject><body xmlns="http://www.w3.org/1999/xhtml"><img src="x" onerror="y"/></body></foreignObject>`,
		`<rect onclick="alert(1)"/>`, `<g onload="x"/>`, `<a href="javascript:alert(1)"><text>x</text></a>`, `<use href="#x"/>`, `<use xlink:href="http://example.org/x#y"/>`,
		`<image href="http://example.org/x.png"/>`, `<image href="data:image/svg+xml;base64,PHN2Zz4="/>`, `<image href="data:image/png;base64,AAAA"/>`, `<image xlink:href="javascript:x"/>`,
		`<style>@import url(http://example.org)</style>`, `<rect style="fill:url(http://example.org/x#y)"/>`, `<rect fill="url('http://example.org')"/>`, `<rect style="background:url(x)"/>`,
		`<rect fill="expression(alert(1))"/>`, `<rect style="fill:u\72l(x)"/>`, `<rect filter="url(#f)"/>`, `<animate attributeName="href" to="javascript:x"/>`, `<set attributeName="onclick"/>`,
		`<svg><rect/></svg>`, `<rect xml:base="http://example.org"/>`, `<mask/>`, `<pattern/>`, `<feImage href="x"/>`, `<iframe src="x"/>`, `<rect id='"&gt;&lt;script'/>`,
		`<h:script xmlns:h="http://www.w3.org/1999/xhtml">alert(1)</h:script>`, `<h:rect xmlns:h="http://www.w3.org/1999/xhtml"/>`, `<title><h:b xmlns:h="x">y</h:b></title>`, `<path d="M0,0&quot; onload=&quot;x"/>`,
	} {
		p, err := sanitize(wrap(inner), "f-", "x")
		if err != nil {
			t.Errorf("%s: %v", inner, err)
			continue
		}
		if p.Dropped == 0 {
			t.Errorf("%s: nothing was dropped: %s", inner, p.SVG)
		}
		wantDrawing(t, string(p.SVG))
	}
}

func TestSanitizeRefuses(t *testing.T) {
	for _, svg := range []string{
		"", "x", "<svg", "<svg>", "<svg></g>", "<html></html>", "<svg/><svg/>", "<svg/><script/>", `<svg xmlns="http://www.w3.org/1999/xhtml"/>`, "<svg>&undefined;</svg>",
		`<!DOCTYPE svg [<!ENTITY a "b">]><svg>&a;</svg>`, strings.Repeat(" ", largestSVG) + "<svg/>", "<svg>" + strings.Repeat("<g>", 100) + strings.Repeat("</g>", 100) + "</svg>",
		"<svg>" + strings.Repeat("<g/>", svgElements) + "</svg>", `<?xml version="1.0" encoding="utf-7"?><svg/>`, "<svg><foreignObject>" + strings.Repeat("<g/>", svgElements) + "</foreignObject></svg>",
	} {
		if p, err := sanitize(svg, "f-", "x"); err == nil {
			t.Errorf("%.40q is shown as %.40q", svg, p.SVG)
		}
	}
}

// wantDrawing fails when sanitized SVG is not well-formed or holds anything
// outside the lists.
func wantDrawing(t *testing.T, svg string) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(svg))
	for {
		tok, err := d.Token()
		if err == io.EOF {
			return
		}
		if err != nil {
			t.Fatalf("%v in %q", err, svg)
		}
		s, ok := tok.(xml.StartElement)
		if !ok {
			continue
		}
		if !svgNames[s.Name.Local] || s.Name.Space != "" {
			t.Errorf("element %v", s.Name)
		}
		for _, a := range s.Attr {
			n := a.Name.Local
			form := svgForms[n]
			switch {
			case a.Name.Space != "":
				t.Errorf("attribute %v", a.Name)
			case n == "role" || n == "aria-label" || n == "viewBox":
			case n == "id" && strings.HasPrefix(a.Value, "f-") && isName.MatchString(a.Value):
			case n == "href" && s.Name.Local == "image" && isPNG(a.Value):
			case strings.HasPrefix(a.Value, "url(#f-") && isReference.MatchString(a.Value):
			case n == "clip-path" && a.Value == "none":
			case form != nil && form.MatchString(a.Value):
			default:
				t.Errorf("%s=%q", n, a.Value)
			}
		}
	}
}

func FuzzSanitize(f *testing.F) {
	f.Add(wrap(`<g clip-path="url(#a)"><path d="M0,0" style="fill:red;stroke:url(#b)"/></g>`))
	f.Add(wrap(`<script>x</script><text>a</text><a href="javascript:x"/>`))
	f.Add(`<?xml version="1.0"?><svg><title>t</title><image href="data:image/png;base64,` + onePixel + `"/></svg>`)
	f.Fuzz(func(t *testing.T, svg string) {
		if p, err := sanitize(svg, "f-", "x"); err == nil {
			wantDrawing(t, string(visible([]byte(p.SVG))))
			if again, err := sanitize(string(p.SVG), "", "x"); err != nil {
				t.Errorf("sanitized twice: %v %v", again, err)
			}
		}
	})
}
