package reports

import (
	"bytes"
	"cmp"
	"crypto/sha256"
	_ "embed"
	"encoding/base64"
	"fmt"
	"html/template"
	"io"
	"slices"
	"strings"
	"time"
)

//go:embed assets/report.css
var styles string

//go:embed assets/report.tmpl
var markup string

var templates = template.Must(template.New("report").Funcs(template.FuncMap{
	"open":  func(level int) template.HTML { return template.HTML(fmt.Sprintf("<h%d>", level)) },
	"close": func(level int) template.HTML { return template.HTML(fmt.Sprintf("</h%d>", level)) },
	"unit":  unitText,
	"headline": func(words string) string {
		return strings.ToUpper(words[:min(1, len(words))]) + words[min(1, len(words)):]
	},
}).Parse(markup))

// unitText is a unit as it is shown beside numbers.
func unitText(unit string) string {
	if unit == "um" {
		return "µm"
	}
	return unit
}

// Render writes the report: one HTML file that needs nothing but itself. It
// runs no scripts and loads nothing; whatever the document says is text to it.
// The only errors are those of writing.
func Render(w io.Writer, d Document) error {
	b := newBuilder(d)
	body, err := b.prose(func(w io.Writer, f fenceView) error { return templates.ExecuteTemplate(w, "fence", f) })
	if err != nil {
		return fmt.Errorf("report: %w", err)
	}
	p := b.page(body)
	var out bytes.Buffer
	if err := templates.ExecuteTemplate(&out, "page", p); err != nil {
		return fmt.Errorf("report: %w", err)
	}
	if _, err := w.Write(visible(out.Bytes())); err != nil {
		return fmt.Errorf("report: %w", err)
	}
	return nil
}

// A page is everything that the template fills in.
type page struct {
	Policy    string // content security policy
	Styles    template.CSS
	Title     string
	File      string
	Date      string
	Time      string
	Outcome   Outcome
	Alert     bool
	Data      []dataView
	Course    string // what was run, in a sentence
	Result    string // how it ended, in a sentence
	Failures  []stepView
	Notes     []string
	Spectrum  *figureView
	Headlines []Headline
	Checks    []verdictView
	Changed   []changeView
	Contents  []entry
	Body      template.HTML
	Loose     []stepView // steps that are in no block of the recipe
	Appendix  appendixView
	Attached  template.JS
}

// A dataView is an input in the summary.
type dataView struct{ Name, Files, Content string }

// A changeView is something that was given on the command line.
type changeView struct{ Name, Recipe, Used, Unit string }

// page puts the report together once the prose, and the steps in it, are done.
func (b *builder) page(body template.HTML) page {
	d := b.doc
	p := page{
		Policy: policy(), Styles: template.CSS(styles),
		Title: cmp.Or(label(d.Title), label(d.File), "Untitled recipe"), File: label(d.File),
		Outcome: d.Outcome, Alert: d.Outcome != Done,
		Body:     body,
		Contents: b.contents,
	}
	if !d.Started.IsZero() {
		p.Date, p.Time = d.Started.UTC().Format("2 January 2006"), utc(d.Started)
	}
	placed := map[string]bool{}
	for _, e := range b.contents {
		placed[e.ID] = placed[e.ID] || e.Level == 0
	}
	for i, s := range d.Steps {
		if !placed[stepID(s.Name)] {
			p.Loose = append(p.Loose, b.step(i, 3, highlight(listing(s.Signature), max(s.Line, 1)), lineRange(s.Line, 1)))
		}
		if s.State == Failed {
			p.Failures = append(p.Failures, stepView{ID: stepID(s.Name), Name: label(s.Name), Err: errText(s), Where: where(d, s)})
		}
	}
	b.summarize(&p)
	p.Appendix = b.appendix()
	p.Attached = attach(d)
	return p
}

// errText says why a step failed.
func errText(s Step) string {
	if s.State == Failed && s.Err == "" {
		return "no reason was recorded"
	}
	return listing(s.Err)
}

// where names the place of a step that failed, unless its error does.
func where(d Document, s Step) string {
	if s.Line <= 0 || strings.Contains(s.Err, d.File+":") {
		return ""
	}
	return fmt.Sprintf("%s:%d", label(d.File), s.Line)
}

// summarize fills in what stands above the recipe's own text.
func (b *builder) summarize(p *page) {
	d := b.doc
	for _, in := range d.Inputs {
		p.Data = append(p.Data, inputSummary(in))
		if in.Changed {
			p.Changed = append(p.Changed, changeView{Name: label(in.Name), Recipe: label(in.Recipe), Used: fileNames(in)})
		}
	}
	for _, s := range d.Settings {
		if s.Changed {
			p.Changed = append(p.Changed, changeView{label(s.Name), cmp.Or(label(s.Recipe), "–"), label(s.Value), label(s.Unit)})
		}
	}
	v := verdicts(d)
	if len(v) > 0 {
		p.Headlines = append(p.Headlines, checksHeadline(v))
	}
	p.Headlines = append(p.Headlines, Headlines(d)...)
	p.Checks = verdictViews(v)
	p.Course = course(d)
	p.Result = result(d, v)
	for _, n := range d.Notes {
		p.Notes = append(p.Notes, sentence(n))
	}
	if f, at, ok := spectrumFigure(d); ok {
		if number := b.shown[at]; number > 0 {
			p.Spectrum = &figureView{ID: fmt.Sprintf("figure-%d", number), Number: number, Title: sentence(f.Title), Caption: sentence(f.Caption), Alt: sentence(cmp.Or(f.Alt, f.Title))}
			p.Spectrum.draw(f.SVG, "summary-")
		}
	}
}

func fileNames(in Input) string {
	var names []string
	for i, f := range in.Files {
		if i == shownItems {
			names = append(names, fmt.Sprintf("… and %d more", len(in.Files)-i))
			break
		}
		names = append(names, label(f.Name))
	}
	return cmp.Or(strings.Join(names, ", "), "not given")
}

func inputSummary(in Input) dataView {
	v := dataView{Name: label(in.Name), Files: fileNames(in)}
	total := int64(0)
	for _, f := range in.Files {
		total += f.Size
	}
	if total > 0 {
		v.Content = size(total)
	}
	if l, ok := LightOf(in.Value); ok && l.Kind == cubeLight {
		v.Content += fmt.Sprintf("; %s × %s", count(l.Integrations, "integration"), channelsText(l.Channels))
		if t := l.time(); t != "" {
			v.Content += "; " + t
		}
	}
	return v
}

// course says what was run, when, and how much of it was computed.
func course(d Document) string {
	s := stepCounts(d)
	elements := 0
	var computing time.Duration
	for _, st := range d.Steps {
		elements += len(st.Elements)
		if st.State == Computed {
			computing += st.Took
		}
	}
	if elements > 0 {
		s += fmt.Sprintf("; %s of fan-outs", count(elements, "element"))
	}
	s += "."
	if !d.Started.IsZero() && d.Ended.After(d.Started) {
		s += fmt.Sprintf(" The run took %s", duration(d.Ended.Sub(d.Started)))
		if computing > 0 {
			s += fmt.Sprintf(", its steps together %s", duration(computing))
		}
		s += "."
	}
	return s
}

// result says how the run ended.
func result(d Document, v []verdict) string {
	failed := 0
	for _, c := range v {
		if !c.Passed {
			failed++
		}
	}
	stepFailed := slices.ContainsFunc(d.Steps, func(s Step) bool { return s.State == Failed })
	unfinished := slices.ContainsFunc(d.Steps, func(s Step) bool { return s.State == NotReached })
	switch {
	case d.Outcome == StepFailed || stepFailed:
		return "A step failed; what depends on it was not reached."
	case d.Outcome == Interrupted || unfinished:
		return "The run was interrupted; what was finished by then is shown."
	case failed == 1:
		return fmt.Sprintf("Every step finished, but 1 of %s failed.", count(len(v), "check"))
	case failed > 1:
		return fmt.Sprintf("Every step finished, but %d of %s failed.", failed, count(len(v), "check"))
	case len(v) == 1:
		return "Every step finished and the one check passed."
	case len(v) > 1:
		return fmt.Sprintf("Every step finished and all %d checks passed.", len(v))
	}
	return "Every step finished. The recipe holds no checks."
}

// policy is the content security policy: nothing is loaded, nothing is run,
// and of styles only the report's own sheet applies.
func policy() string {
	sum := sha256.Sum256([]byte(styles))
	return "default-src 'none'; img-src data:; style-src 'sha256-" + base64.StdEncoding.EncodeToString(sum[:]) + "'; base-uri 'none'; form-action 'none'"
}
