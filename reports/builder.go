package reports

import (
	"cmp"
	"fmt"
	"html/template"
	"regexp"
	"slices"
	"strings"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// A builder turns a document into views, in the order of the document, so that
// figures and tables are numbered as they come.
type builder struct {
	doc       Document
	figures   int
	tables    int
	fileBytes int // of the tables offered as files so far
	settings  map[string]Setting
	priors    fit.Priors        // of the step at hand
	shown     map[place]int     // number of the figure that a result is shown as
	sections  map[string]string // id of a heading by its text
	contents  []entry
	assembled bool // some step gives a whole spectrum
}

// An entry is a line of the table of contents.
type entry struct {
	ID, Text string
	Level    int // of a heading, 0 for a step
	State    State
}

func newBuilder(d Document) *builder {
	d.File = label(d.File)
	d.Outcome = Outcome(label(string(d.Outcome)))
	d.Steps = slices.Clone(d.Steps)
	for i := range d.Steps {
		s := &d.Steps[i]
		s.State = State(label(string(s.State)))
		s.Elements = slices.Clone(s.Elements)
		for k := range s.Elements {
			s.Elements[k].State = State(label(string(s.Elements[k].State)))
		}
	}
	b := &builder{doc: d, settings: map[string]Setting{}, shown: map[place]int{}, sections: map[string]string{}}
	for _, s := range d.Settings {
		b.settings[s.Name] = s
	}
	for _, s := range d.Steps {
		b.assembled = b.assembled || slices.ContainsFunc(s.Results, func(r Result) bool { _, ok := r.Value.(spectrum.Spectrum); return ok })
	}
	return b
}

// A stepView is a step as it is shown.
type stepView struct {
	ID       string
	Number   int
	Name     string
	Level    int // of its heading
	Each     string
	Doc      []string
	Code     []template.HTML // lines
	Lines    string
	Args     []argView
	Results  []resultView
	State    State
	Class    string
	Why      string
	Took     string
	When     string
	Host     string
	Key      string
	Seed     string
	Err      string
	Where    string
	Log      string
	Elements *elementsView
	Checks   []verdictView // the runner's own
}

type argView struct {
	Name, Type, From, Link, Text, Hash string
	Changed                            string // the recipe's own value, when another was used
}

type resultView struct {
	ID, Name, Type, Hash, Size string
	Figure                     bool
	Blocks                     []block
}

// An elementsView sums up a fan-out.
type elementsView struct {
	Summary string
	Failed  []elementView // the first few

	MoreFailed string
	Rows       []elementView
	Note       string
}

type elementView struct {
	Label, Class, Why, Err, Key, Hash, Took string
	State                                   State
}

// Body is the rows of the table of elements, see [gridView.Body].
func (v *elementsView) Body() template.HTML {
	var out strings.Builder
	text := template.HTMLEscapeString
	hash := func(h string) string {
		if h == "" {
			return ""
		}
		return `<code class="hash" title="` + text(h) + `">` + text(h) + "</code>"
	}
	for _, r := range v.Rows {
		why := r.Why
		if r.Err != "" {
			why += " " + r.Err
		}
		fmt.Fprintf(&out, "\n"+`<tr class="%s"><th scope="row">%s</th><td>%s</td><td>%s</td><td class="right">%s</td><td>%s</td><td>%s</td></tr>`,
			text(r.Class), text(r.Label), text(string(r.State)), text(why), text(r.Took), hash(r.Key), hash(r.Hash))
	}
	return template.HTML(out.String())
}

// class is a state as the name of a style class.
func class(s State) string { return slug(string(s)) }

func stepID(name string) string { return "step-" + slug(name) }

// step makes the view of step number i; code are the lines that belong to it.
func (b *builder) step(i, level int, code []template.HTML, lines string) stepView {
	s := b.doc.Steps[i]
	v := stepView{
		ID: stepID(s.Name), Number: i + 1, Name: label(s.Name), Level: min(max(level, 2), 6),
		Each: label(s.Each), Doc: paragraphs(s.Doc), Code: code, Lines: lines,
		Where: where(b.doc, s), State: s.State, Class: class(s.State), Why: sentence(s.Why), Took: duration(s.Took), When: utc(s.When), Host: sentence(s.Host), Key: label(s.Key),
		Err: errText(s), Log: listing(s.Log),
	}
	b.contents = append(b.contents, entry{ID: v.ID, Text: v.Name, State: s.State})
	if s.Seed != 0 {
		v.Seed = fmt.Sprint(s.Seed)
	}
	b.priors = nil
	for k, a := range s.Args {
		if p, ok := a.Value.(fit.Priors); ok {
			b.priors = p
		}
		if k < shownRows {
			v.Args = append(v.Args, b.argument(a))
		}
	}
	for k, r := range s.Results {
		if k == shownRows {
			break
		}
		view := resultView{ID: "result-" + slug(s.Name+"."+r.Name), Name: label(r.Name), Type: shortType(r.Type), Hash: label(r.Hash), Blocks: b.show(label(r.Name), r.Value)}
		if r.Size > 0 {
			view.Size = size(r.Size)
		}
		if len(view.Blocks) == 1 && view.Blocks[0].Figure != nil {
			view.Figure = true
			b.shown[place{i, k}] = view.Blocks[0].Figure.Number
		}
		v.Results = append(v.Results, view)
	}
	v.Elements = b.elements(s)
	for _, c := range s.Checks {
		v.Checks = append(v.Checks, verdictViews([]verdict{{Check: c}})...)
	}
	return v
}

// paragraphs splits a doc comment at its empty lines.
func paragraphs(doc string) []string {
	var out []string
	for p := range strings.SplitSeq(sentence(doc), "\n\n") {
		if p = strings.TrimSpace(p); p != "" {
			out = append(out, p)
		}
	}
	return out
}

func (b *builder) argument(a Argument) argView {
	v := argView{Name: label(a.Name), Type: shortType(a.Type), From: label(a.Source), Text: sentence(a.Text), Hash: label(a.Hash)}
	switch a.Source {
	case "result", "element":
		if a.Source == "element" {
			v.From = "one by one from "
		} else {
			v.From = "step "
		}
		v.From += label(a.From)
		if slices.ContainsFunc(b.doc.Steps, func(s Step) bool { return s.Name == a.From }) {
			v.Link = stepID(a.From)
		}
	case "input":
		v.Link = "input-" + slug(a.Name)
	case "setting":
		v.Link = "setting-" + slug(a.Name)
		if s, ok := b.settings[a.Name]; ok && s.Changed {
			v.Changed = cmp.Or(label(s.Recipe), "nothing")
		}
	case "priors":
		v.From, v.Link = "priors above", b.sections[a.From]
	}
	if p, ok := a.Value.(fit.Priors); ok && v.Text == "" {
		v.Text = priorsText(p)
	}
	return v
}

// elements sums up the elements of a fan-out; nil for another step.
func (b *builder) elements(s Step) *elementsView {
	if len(s.Elements) == 0 {
		return nil
	}
	channels := b.elementChannels(s)
	called := func(i int) string {
		l := label(s.Elements[i].Label)
		if i < len(channels) {
			l += fmt.Sprintf(", %s–%s µm", fixed(channels[i].Lo, 3), fixed(channels[i].Hi, 3))
		}
		return l
	}
	v := &elementsView{}
	counts := map[State]int{}
	slowest := 0
	const shownFailures = 10
	for i, e := range s.Elements {
		counts[e.State]++
		if e.Took > s.Elements[slowest].Took {
			slowest = i
		}
		view := elementView{called(i), class(e.State), sentence(e.Why), clip(e.Err, 500), label(e.Key), label(e.Hash), duration(e.Took), e.State}
		if e.State == Failed && len(v.Failed) < shownFailures {
			v.Failed = append(v.Failed, view)
		}
		if i < 4*shownRows {
			v.Rows = append(v.Rows, view)
		}
	}
	parts := []string{}
	for _, state := range []State{Failed, Computed, Reused, NotReached} {
		if n := counts[state]; n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n, state))
		}
	}
	v.Summary = count(len(s.Elements), "element") + ": " + strings.Join(parts, ", ")
	if e := s.Elements[slowest]; e.Took > 0 {
		v.Summary += fmt.Sprintf("; the slowest (%s) took %s", called(slowest), duration(e.Took))
	}
	if n := counts[Failed] - len(v.Failed); n > 0 {
		v.MoreFailed = count(n, "more element") + " failed, too."
	}
	if n := len(s.Elements); n > len(v.Rows) {
		v.Note = fmt.Sprintf("The first %d of %d elements are listed.", len(v.Rows), n)
	}
	return v
}

// elementChannels are the wavelength channels that the elements of a fan-out
// stand for, as far as its results, or else the collection it ran over, tell.
func (b *builder) elementChannels(s Step) []lightcurve.Channel {
	values := s.Results
	for _, a := range s.Args {
		if a.Source != "element" {
			continue
		}
		for _, from := range b.doc.Steps {
			if from.Name == a.From {
				values = slices.Concat(values, from.Results)
			}
		}
	}
	for _, r := range values {
		var out []lightcurve.Channel
		if l, ok := LightOf(r.Value); ok && (l.Kind == curvesLight || l.Kind == fitsLight) {
			out = l.Channels
		}
		switch v := r.Value.(type) {
		case []lightcurve.Channel:
			out = v
		case []spectrum.Point:
			for _, p := range v {
				out = append(out, p.Channel)
			}
		}
		if len(out) == len(s.Elements) {
			return out
		}
	}
	return nil
}

// A fenceView is a fenced block of the recipe as it is shown: steps, or code.
type fenceView struct {
	Steps []stepView
	Code  []template.HTML // of a Go block without steps
	Lines string
	Plain string // of a block that is no Go
}

// fence makes the view of a Go block: index is its number among the fenced
// blocks, line its first line of code.
func (b *builder) fence(index, line, level int, code string) fenceView {
	var numbers []int
	for i, s := range b.doc.Steps {
		if s.Fence == index {
			numbers = append(numbers, i)
		}
	}
	source := strings.Split(strings.TrimRight(code, "\n"), "\n")
	lines := highlight(strings.Join(source, "\n"), line)
	if len(numbers) == 0 {
		return fenceView{Code: lines, Lines: lineRange(line, len(lines))}
	}
	slices.SortStableFunc(numbers, func(i, k int) int { return b.doc.Steps[i].Line - b.doc.Steps[k].Line })
	starts := make([]int, len(numbers)+1)
	for k, i := range numbers {
		starts[k] = commentStart(source, b.doc.Steps[i].Line-line)
	}
	starts[0], starts[len(numbers)] = 0, len(lines)
	var v fenceView
	for k, i := range numbers {
		s := b.doc.Steps[i]
		from := min(max(starts[k], 0), len(lines))
		to := min(max(starts[k+1], from), len(lines))
		var part []template.HTML
		for n := from; n < to; n++ {
			if s.Doc == "" || !isDoc(source, n, s.Line-line) {
				part = append(part, lines[n])
			}
		}
		for len(part) > 0 && strings.TrimSpace(source[to-1]) == "" && to > from {
			part, to = part[:len(part)-1], to-1
		}
		v.Steps = append(v.Steps, b.step(i, level, part, lineRange(line+from, to-from)))
	}
	return v
}

func lineRange(from, n int) string {
	if n <= 1 {
		return fmt.Sprintf("line %d", from)
	}
	return fmt.Sprintf("lines %d–%d", from, from+n-1)
}

// commentStart is the first line of the comment above the function at line n.
func commentStart(source []string, n int) int {
	if n < 0 || n >= len(source) {
		return n
	}
	for n > 0 && strings.HasPrefix(source[n-1], "//") {
		n--
	}
	return n
}

var directive = regexp.MustCompile(`^//[a-z]+:`)

// isDoc reports whether line n belongs to the doc comment of the function at
// line f, which is shown as prose.
func isDoc(source []string, n, f int) bool {
	return n < f && n >= commentStart(source, f) && !directive.MatchString(source[n])
}
