package reports

import (
	"html"
	"regexp"
	"strings"
	"testing"
)

// A tag is a start tag of a page.
type tag struct {
	name  string
	attrs map[string]string
}

var (
	tagText   = regexp.MustCompile(`<(/?)([a-zA-Z][a-zA-Z0-9]*)((?:\s+[-a-zA-Z:]+(?:="[^"<>]*")?)*)\s*/?>`)
	attribute = regexp.MustCompile(`([-a-zA-Z:]+)(?:="([^"<>]*)")?`)
)

// tags reads the tags of a page. Everything in a page that looks like markup
// has to be a tag that it understands: no stray "<" is let through.
func tags(t testing.TB, page string) []tag {
	t.Helper()
	page = strings.TrimPrefix(page, "<!DOCTYPE html>")
	var out []tag
	for {
		i := strings.IndexByte(page, '<')
		if i < 0 {
			return out
		}
		page = page[i:]
		m := tagText.FindStringSubmatch(page)
		if m == nil || !strings.HasPrefix(page, m[0]) {
			t.Fatalf("markup that is no tag: %.200q", page)
		}
		page = page[len(m[0]):]
		if m[1] != "" {
			continue
		}
		tg := tag{m[2], map[string]string{}}
		for _, a := range attribute.FindAllStringSubmatch(m[3], -1) {
			tg.attrs[a[1]] = html.UnescapeString(a[2])
		}
		out = append(out, tg)
	}
}

// known are the elements that a report is made of.
var known = map[string]bool{}

func init() {
	for _, n := range strings.Fields(`html head meta title style body a header svg circle path p code time span h1 h2 h3 h4 h5 h6 main nav ol ul li
		section div strong pre b del ins figure figcaption dl dt dd article aside details summary table caption thead tbody tr th td script em br hr
		input blockquote math mrow mi mn mo mspace msub msup`) {
		known[n] = true
	}
	for n := range svgNames {
		known[n] = true
	}
}

// wantHarmless fails when a page could do anything but show itself.
func wantHarmless(t testing.TB, page string) {
	t.Helper()
	scripts := 0
	for _, tg := range tags(t, page) {
		if !known[tg.name] {
			t.Errorf("element %s", tg.name)
		}
		if tg.name == "script" {
			scripts++
			if tg.attrs["type"] != "application/json" || tg.attrs["src"] != "" {
				t.Errorf("a script that could run: %v", tg.attrs)
			}
		}
		for name, value := range tg.attrs {
			switch {
			case strings.HasPrefix(name, "on"), name == "src", name == "srcset", name == "style", name == "action", name == "formaction", name == "background":
				t.Errorf("%s has the attribute %s", tg.name, name)
			case name == "href" && !harmlessLink(tg, value):
				t.Errorf("%s links to %.80q", tg.name, value)
			case strings.Contains(name, ":"):
				t.Errorf("%s has the attribute %s", tg.name, name)
			case tg.name != "meta" && name != "href" && name != "title" && name != "aria-label" && strings.Contains(value, "url(") && !isReference.MatchString(value):
				t.Errorf("%s: %s=%q", tg.name, name, value)
			}
		}
	}
	if scripts != 1 {
		t.Errorf("%d script elements, want the one with the record", scripts)
	}
	for _, r := range page {
		if hidden(r) && r != '\n' && r != '\t' {
			t.Errorf("the page holds the invisible character %U", r)
			break
		}
	}
}

func harmlessLink(tg tag, to string) bool {
	switch tg.name {
	case "image":
		return strings.HasPrefix(to, "data:image/png;base64,")
	case "a":
		_, download := tg.attrs["download"]
		return strings.HasPrefix(to, "#") || strings.HasPrefix(strings.ToLower(to), "http://") || strings.HasPrefix(strings.ToLower(to), "https://") ||
			download && (strings.HasPrefix(to, "data:text/csv;base64,") || strings.HasPrefix(to, "data:text/markdown;base64,"))
	}
	return false
}

// render gives the page of a document, without its style sheet.
func render(t testing.TB, d Document) string {
	t.Helper()
	var b strings.Builder
	if err := Render(&b, d); err != nil {
		t.Fatal(err)
	}
	page := b.String()
	if !strings.Contains(page, "<style>"+styles+"</style>") {
		t.Fatal("the style sheet is not in the page as it is, so that its hash does not fit")
	}
	return strings.Replace(page, styles, "", 1)
}
