package reports

import (
	"crypto/sha256"
	"encoding/base64"
	"errors"
	"flag"
	"os"
	"regexp"
	"strings"
	"testing"
	"time"

	"rimlight/steps/check"
	"rimlight/steps/figure"
	"rimlight/steps/table"
)

var update = flag.Bool("update", false, "write the golden files anew")

// small is a document of a page, with one step, a figure, a check and a table.
func small() Document {
	start := time.Date(2031, 3, 4, 21, 17, 5, 0, time.FixedZone("", 3600))
	source := "# A small run\n\nProse with `code`.\n\n| setting | value | unit |\n|---|---|---|\n| depthLimit | 2 | |\n\n## Look\n\n" +
		"```go\n// Look looks.\nfunc Look(depthLimit float64) (seen []check.Check) {\n\treturn nil // \"<nothing>\"\n}\n```\n"
	return Document{
		Title: "A small run", Source: []byte(source), File: "small.md", Outcome: Done, Started: start, Ended: start.Add(1500 * time.Millisecond),
		Settings: []Setting{{Name: "depthLimit", Value: "3", Recipe: "2", Changed: true, Line: 7}},
		Host:     Host{OS: "linux", Arch: "amd64", CPUs: 2, GoVersion: "go1.26.0", Version: "v0.0.0"},
		Command:  "rimlight run small.md --set depthLimit=3",
		Steps: []Step{{
			Name: "Look", Fence: 0, Section: "Look", Line: 13, Doc: "Look looks.", State: Computed, Why: "setting depthLimit changed", Key: hash("key"),
			Took: 3 * time.Millisecond, When: start.Add(time.Second),
			Args: []Argument{{Name: "depthLimit", Type: "float64", Source: "setting", Text: "3"}},
			Results: []Result{
				{Name: "seen", Type: "[]rimlight/steps/check.Check", Hash: hash("seen"), Size: 120, Value: []check.Check{{Name: "looks", Value: 1, Limit: "above 0", Passed: true, Why: "It must."}}},
				{Name: "plot", Type: "rimlight/steps/figure.Figure", Hash: hash("plot"), Size: 400, Value: figure.Figure{
					Title: "Spectrum of nothing", Caption: "A line.", Alt: "a line",
					SVG:  `<svg xmlns="http://www.w3.org/2000/svg" width="72pt" height="36pt"><path d="M0,0L72,36" style="stroke:#000000;fill:none"/></svg>`,
					Data: table.Table{Columns: []table.Column{{Name: "x", Unit: "um", Number: []float64{1, 2.5}}}}}},
			},
		}},
	}
}

func TestGolden(t *testing.T) {
	const file = "testdata/small.html"
	got := strings.Replace(render(t, small()), "<style></style>", "<style>assets/report.css</style>", 1)
	got = regexp.MustCompile(`style-src &#39;sha256-.*?&#39;;`).ReplaceAllString(got, "style-src (hash of assets/report.css);")
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if got == string(want) {
		return
	}
	g, w := strings.Split(got, "\n"), strings.Split(string(want), "\n")
	for i := range g {
		if i >= len(w) || g[i] != w[i] {
			t.Fatalf("line %d differs from %s (read it, then -update):\ngot  %s\nwant %s", i+1, file, g[i], w[min(i, len(w)-1)])
		}
	}
	t.Fatalf("%d lines, %s has %d", len(g), file, len(w))
}

func TestSample(t *testing.T) {
	for name, d := range map[string]Document{"small": small(), "sample": sample(80, 300), "failing": failing(), "empty": {}} {
		t.Run(name, func(t *testing.T) {
			page := render(t, d)
			wantHarmless(t, page)
			wantStructure(t, page)
			if len(page) > 5<<20 {
				t.Errorf("%d bytes", len(page))
			}
		})
	}
}

// wantStructure checks what assistive programs and links rely on.
func wantStructure(t *testing.T, page string) {
	t.Helper()
	ids, level, h1 := map[string]bool{}, 0, 0
	all := tags(t, page)
	for _, tg := range all {
		if id := tg.attrs["id"]; id != "" {
			if ids[id] {
				t.Errorf("two elements have the id %q", id)
			}
			ids[id] = true
		}
		if len(tg.name) == 2 && tg.name[0] == 'h' && tg.name[1] >= '1' && tg.name[1] <= '6' {
			n := int(tg.name[1] - '0')
			if n > level+1 {
				t.Errorf("heading level %d follows level %d", n, level)
			}
			if level = n; n == 1 {
				h1++
			}
		}
		if tg.name == "th" && tg.attrs["scope"] == "" {
			t.Error("a th without a scope")
		}
		if tg.name == "svg" && tg.attrs["aria-hidden"] == "" && tg.attrs["aria-label"] == "" {
			t.Error("a picture without a description")
		}
	}
	for _, tg := range all {
		if to, ok := strings.CutPrefix(tg.attrs["href"], "#"); ok && !ids[to] {
			t.Errorf("a link to #%s, which does not exist", to)
		}
	}
	if h1 != 1 || !ids["text"] || !strings.Contains(page, `<html lang="en">`) {
		t.Errorf("%d main headings, text %v", h1, ids["text"])
	}
}

func TestEveryState(t *testing.T) {
	page := render(t, failing())
	for _, s := range []State{Computed, Failed, NotReached} {
		if !strings.Contains(page, `<p class="state">`+string(s)+`</p>`) {
			t.Errorf("no step is shown as %s", s)
		}
	}
	for _, want := range []string{
		"<strong>Step <a href=\"#step-FitChannel\">FitChannel</a> failed</strong>", "warm-saturn.md:79:9: channel 17", "Element 18 failed",
		"80 elements: 2 failed, 20 computed, 58 reused", `<del class="replaced">visit1.fits</del>`, "object 3f9a1c2b77 was damaged",
	} {
		if !strings.Contains(page, want) {
			t.Errorf("%q is missing", want)
		}
	}
}

func TestSampleSays(t *testing.T) {
	page := render(t, sample(80, 300))
	for _, want := range []string{
		"Every step finished, but 1 of 4 checks failed.", `<code>clipSigma</code> <del>5</del> <ins class="changed">4</ins>`, "78 of 80",
		`<del class="replaced">5</del> <ins class="changed" title="given on the command line">4</ins>`, "2461234.510021 ± 0.000031", "U(0.05, 0.2)",
		"the slowest (", "80, 5.062–5.200 µm", "no depth: dead channel: no usable sample", "converged after 14 iterations", "h1:qk2bN0", "1442695040888963407", hash("visit1"), "rimlight run warm-saturn.md --set clipSigma=4",
		`<a href="#step-Clean">step Clean</a>`, "2031-03-04T21:17:05Z", "GOAMD64=v1", `<a rel="noreferrer" href="#section-channel-fits">`, `<p class="state">reused</p>`,
	} {
		if !strings.Contains(page, want) {
			t.Errorf("%q is missing", want)
		}
	}
	if failed, passed := strings.Index(page, "correlated noise over 20 minutes</a>"), strings.Index(page, "residual scatter against photon noise</a>"); failed < 0 || failed > passed {
		t.Error("the failed check does not come first")
	}
}

// A step whose block is not in the recipe must not disappear.
func TestStepOutsideText(t *testing.T) {
	d := small()
	d.Steps[0].Fence = 7
	page := render(t, d)
	if !strings.Contains(page, "Steps outside the text") || !strings.Contains(page, `id="step-Look"`) {
		t.Error("the step is not shown")
	}
}

func TestPolicy(t *testing.T) {
	sum := sha256.Sum256([]byte(styles))
	if p := policy(); !strings.HasPrefix(p, "default-src 'none'") || !strings.Contains(p, base64.StdEncoding.EncodeToString(sum[:])) || strings.Contains(p, "unsafe") {
		t.Error(p)
	}
	for _, bad := range []string{"url(", "@import", "\r", "</"} {
		if strings.Contains(styles, bad) {
			t.Errorf("the style sheet holds %q", bad)
		}
	}
}

func TestSameBytes(t *testing.T) {
	a, b := render(t, sample(12, 100)), render(t, sample(12, 100))
	if a != b {
		t.Error("the same document gives two pages")
	}
}

type fullDisk struct{}

func (fullDisk) Write([]byte) (int, error) { return 0, errors.New("no space left") }

func TestWriteError(t *testing.T) {
	if err := Render(fullDisk{}, small()); err == nil || err.Error() != "report: no space left" {
		t.Error(err)
	}
}

func BenchmarkRender(b *testing.B) {
	d := sample(80, 3000)
	for b.Loop() {
		var n counter
		if err := Render(&n, d); err != nil {
			b.Fatal(err)
		}
		b.ReportMetric(float64(n), "bytes")
	}
}

type counter int

func (c *counter) Write(p []byte) (int, error) { *c += counter(len(p)); return len(p), nil }
