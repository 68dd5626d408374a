package reports

import (
	"html"
	"regexp"
	"strings"
	"testing"
)

var anyTag = regexp.MustCompile(`<[^>]*>`)

// plain takes the markup off highlighted code.
func plain(code string) string {
	var lines []string
	for _, l := range highlight(code, 1) {
		lines = append(lines, html.UnescapeString(anyTag.ReplaceAllString(string(l), "")))
	}
	return strings.Join(lines, "\n")
}

func TestHighlight(t *testing.T) {
	got := highlight("// Fit fits.\nfunc Fit(x float64) string {\n\treturn `a\n<b>` + \"\\\"\" // 5\n}", 41)
	want := []string{
		`<span class="ln" data-n="41"><span class="c">// Fit fits.</span></span>`,
		`<span class="ln" data-n="42"><span class="k">func</span> <span class="f">Fit</span>(x float64) string {</span>`,
		"<span class=\"ln\" data-n=\"43\">\t<span class=\"k\">return</span> <span class=\"s\">`a</span></span>",
		"<span class=\"ln\" data-n=\"44\"><span class=\"s\">&lt;b&gt;`</span> + <span class=\"s\">&#34;\\&#34;&#34;</span> <span class=\"c\">// 5</span></span>",
		`<span class="ln" data-n="45">}</span>`,
	}
	if len(got) != len(want) {
		t.Fatalf("%d lines: %q", len(got), got)
	}
	for i := range want {
		if string(got[i]) != want[i] {
			t.Errorf("line %d\ngot  %s\nwant %s", i, got[i], want[i])
		}
	}
}

func FuzzHighlight(f *testing.F) {
	for _, s := range []string{sampleRecipe, "", "func F() { /* </pre> */ }", "\ufeffpackage", "`a\r\nb`", "'\\", "/*", "\x00\xff<", "0x1p-2i @ # \"\n\""} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, code string) {
		if got := plain(code); got != code {
			t.Errorf("got %q, want %q", got, code)
		}
	})
}
