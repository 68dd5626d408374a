package reports

import (
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"
	"time"

	"rimlight/steps/check"
	"rimlight/steps/diagnose"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// fill sets everything in a value: texts to s, numbers to x, slices to two
// elements.
func fill(v reflect.Value, s string, x float64) {
	switch v.Kind() {
	case reflect.String:
		v.SetString(s)
	case reflect.Float64:
		v.SetFloat(x)
	case reflect.Int, reflect.Int64:
		v.SetInt(3)
	case reflect.Uint64, reflect.Uint8:
		v.SetUint(3)
	case reflect.Bool:
		v.SetBool(true)
	case reflect.Slice:
		v.Set(reflect.MakeSlice(v.Type(), 2, 2))
		for i := range 2 {
			fill(v.Index(i), s, x)
		}
	case reflect.Map:
		v.Set(reflect.MakeMap(v.Type()))
		key, elem := reflect.New(v.Type().Key()).Elem(), reflect.New(v.Type().Elem()).Elem()
		fill(key, s, x)
		fill(elem, s, x)
		v.SetMapIndex(key, elem)
	case reflect.Pointer:
		v.Set(reflect.New(v.Type().Elem()))
		fill(v.Elem(), s, x)
	case reflect.Struct:
		if v.Type() == reflect.TypeFor[time.Time]() {
			v.Set(reflect.ValueOf(time.Unix(1e9, 0)))
			return
		}
		for i := range v.NumField() {
			fill(v.Field(i), s, x)
		}
	}
}

func filled[T any](s string, x float64) T {
	var v T
	fill(reflect.ValueOf(&v).Elem(), s, x)
	return v
}

type unknown struct {
	Text   string
	Nested []unknownPart
	Named  map[string]float64
	Link   *unknownPart
	Any    any
	Func   func()
}

type unknownPart struct {
	Text   string
	Values []float64
	Deep   [][][][][]string
}

// everything has a result of every type, each filled.
func everything(s string, x float64) Document {
	d := filled[Document](s, x)
	d.Source = []byte("# " + clip(s, 2000) + "\n\n" + clip(s, 2000) + "\n")
	d.Record = nil
	for i, v := range []any{
		nil, s, x, 3, true, uint8(7), complex(x, x), float32(2.5), []float64{x, 1, 2}, []string{s, s}, []int{1, 2, 3}, map[string]string{s: s}, time.Second, [2]bool{true, false},
		filled[figure.Figure](s, x), filled[[]figure.Figure](s, x), filled[table.Table](s, x), filled[[]table.Table](s, x),
		filled[check.Check](s, x), filled[[]check.Check](s, x), filled[[][]check.Check](s, x),
		filled[fit.Posterior](s, x), filled[[]fit.Posterior](s, x), filled[fit.CurveFit](s, x), filled[[]fit.CurveFit](s, x), filled[diagnose.Summary](s, x), filled[[]diagnose.Summary](s, x), filled[fit.Priors](s, x), filled[fit.Prior](s, x),
		filled[fit.Quantity](s, x), filled[[]fit.Quantity](s, x), filled[spectrum.Spectrum](s, x), filled[spectrum.Point](s, x), filled[[]spectrum.Point](s, x),
		filled[lightcurve.Cube](s, x), filled[lightcurve.Curve](s, x), filled[[]lightcurve.Curve](s, x), filled[lightcurve.Channel](s, x), filled[[]lightcurve.Channel](s, x),
		filled[unknown](s, x), filled[*unknown](s, x), filled[[]unknown](s, x), (*unknown)(nil), struct{}{}, func() {}, make(chan int), [][]float64{{1}, nil},
		fit.Posterior{Names: []string{s, s}, Value: []float64{x}, Cov: [][]float64{{1}, {2}}}, spectrum.Spectrum{}, lightcurve.Cube{}, []fit.Posterior{{}, {Names: []string{s}}},
		table.Table{Columns: []table.Column{{Name: s, Text: []string{s}}, {Name: s, Number: []float64{x, x, x}}}}, []fit.CurveFit{{}}, []diagnose.Summary{{}}, []lightcurve.Curve{{}},
	} {
		state := []State{Computed, Reused, Failed, NotReached}[i%4]
		d.Steps = append(d.Steps, Step{Name: fmt.Sprintf("Step%d", i), Fence: -1, State: state,
			Results: []Result{{Name: s, Type: s, Value: v}}, Args: []Argument{{Name: s, Type: s, Source: []string{"input", "setting", "result", "priors", "element", "seed"}[i%6], From: s, Text: s, Value: v}}})
	}
	return d
}

const attack = "<script>alert(1)</script>\"'><img src=x onerror=alert(2)>\u202eevil\u202c\x00\x1b[31m\u200b</style></svg></pre>{{.}}javascript:alert(3)\r=cmd"

func TestHostileDocument(t *testing.T) {
	for _, x := range []float64{1.5, 0, -1e300, 5e-324, math.NaN(), math.Inf(1), math.Inf(-1)} {
		wantHarmless(t, render(t, everything(attack, x)))
	}
}

func TestHostileMarkdown(t *testing.T) {
	source := `# Title <script>alert(1)</script>

<script>alert(1)</script>

<div onclick="alert(1)">block <b>html</b></div>

<!-- comment -->

Inline <img src=x onerror=alert(1)> html, <a href="javascript:alert(1)">raw</a>.

[js](javascript:alert(1)) [JS](JaVaScRiPt:alert(1)) [data](data:text/html;base64,PHNjcmlwdD4=) [vb](vbscript:x) [file](file:///etc/passwd)
[rel](other.html) [proto](//example.org/x) [entity](java&#115;cript:alert(1)) [quote](https://example.org/"onmouseover="alert(1)) [up](#x"onclick="y)
![remote](https://example.org/track.png) ![data](data:image/svg+xml;base64,PHN2Zz4=) ![*alt* <b>](x.png "title")
<javascript:alert(1)> <https://example.org/ok> <someone@example.org> www.example.org ftp://example.org

| input | file |
|---|:--|
| <script> | "onclick=alert(1) \| ![x](y) |

| setting | value |
|---|---|
| <img src=x> | **5** [x](javascript:y) |

- [ ] task
- [x] done

~~gone~~ &#x202e;reversed &#0; &lt;script&gt;

` + "```go\nfunc Evil() { // </code></pre><script>alert(1)</script>\n}\n```\n\n```html\n<script>alert(1)</script>\n```\n\n    <script>indented</script>\n"
	d := Document{Title: "<b>", Source: []byte(source), Settings: []Setting{{Name: "<img src=x>", Value: "<script>", Changed: true}},
		Inputs: []Input{{Name: "<script>", Changed: true, Files: []InputFile{{Name: `"><script>`, SHA256: `"><script>`}}}}}
	page := render(t, d)
	wantHarmless(t, page)
	for _, want := range []string{`&lt;script&gt;alert(1)&lt;/script&gt;`, "[image: remote]", `href="https://example.org/ok"`, "[U+202E]reversed", "&lt;!-- comment --&gt;"} {
		if !strings.Contains(page, want) {
			t.Errorf("%q is missing", want)
		}
	}
	for _, tg := range tags(t, page) {
		to := tg.attrs["href"]
		for _, bad := range []string{"javascript", "passwd", "ftp", "mailto", "track.png", "other.html", "//example.org/x"} {
			if strings.Contains(strings.ToLower(to), bad) && !strings.HasPrefix(to, "data:text/markdown") {
				t.Errorf("a link to %s", to)
			}
		}
	}
}

// A page stays small whatever a step puts into its texts.
func TestHugeTexts(t *testing.T) {
	start := time.Now()
	page := render(t, everything(strings.Repeat("𝛼<", 2_000_000), 1))
	if len(page) > 5<<20 {
		t.Errorf("%d bytes", len(page))
	}
	if !strings.Contains(page, "… [cut here, 10 MB in all]") {
		t.Error("the reader is not told that texts were cut")
	}
	if d := time.Since(start); d > 20*time.Second {
		t.Errorf("it took %s", d)
	}
	wantHarmless(t, page)
}

// So it does whatever their number.
func TestManyValues(t *testing.T) {
	numbers := make([]float64, 300_000)
	texts := make([]string, 300_000)
	d := sample(4, 10)
	d.Steps[0].Results = []Result{
		{Name: "a", Value: table.Table{Columns: []table.Column{{Name: "x", Number: numbers}, {Name: "y", Text: texts}}}},
		{Name: "b", Value: make([]check.Check, 100_000)}, {Name: "c", Value: make([]fit.Quantity, 100_000)}, {Name: "d", Value: make([]spectrum.Point, 20_000)},
		{Name: "e", Value: make([]fit.Posterior, 50_000)}, {Name: "f", Value: texts}, {Name: "g", Value: make([]figure.Figure, 1000)}, {Name: "h", Value: make([][]string, 1000)},
		{Name: "i", Value: fit.Posterior{Names: texts[:2000], Warnings: texts}}, {Name: "j", Value: table.Table{Columns: make([]table.Column, 100_000)}},
	}
	d.Steps[3].Elements = make([]Element, 100_000)
	page := render(t, d)
	if len(page) > 5<<20 {
		t.Errorf("%d bytes", len(page))
	}
	wantHarmless(t, page)
}

func FuzzProse(f *testing.F) {
	f.Add(sampleRecipe)
	f.Add("# a\n\n[x](javascript:y) <b onclick=x> ![a](b)\n\n| setting |\n|---|\n| a |\n")
	f.Add("```go\nfunc A() {}\n```\n> ```go\n> func B() {}\n> ```\n")
	f.Fuzz(func(t *testing.T, source string) {
		d := small()
		d.Source = []byte(source)
		page := render(t, d)
		wantHarmless(t, page)
		if a, err := ReadAttachment([]byte(page)); err != nil || string(a.Recipe) != source {
			t.Errorf("the recipe is not in the report as it was: %v", err)
		}
	})
}
