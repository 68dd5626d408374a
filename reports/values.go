package reports

import (
	"cmp"
	"fmt"
	"math"
	"reflect"
	"slices"
	"strings"

	"rimlight/steps/check"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// A block is one way of showing a value, or a part of one: exactly one of its
// fields is set.
type block struct {
	Text      string // short, in the line
	Listing   string // long, as it stands
	Figure    *figureView
	Grid      *gridView
	Verdicts  []verdictView
	Facts     []fact
	Posterior *posteriorView
	Equation  *equationView
	Tree      *node
}

// A fact is a named property of a value.
type fact struct{ Name, Text string }

type figureView struct {
	ID      string
	Number  int
	Title   string
	Caption string
	Alt     string
	Picture picture
	Problem string // why there is no picture
	Data    *gridView
}

type verdictView struct {
	Name, Value, Limit, Why, Step string
	Passed                        bool
}

// show gives the blocks that show a value; title names it.
func (b *builder) show(title string, value any) []block {
	switch v := value.(type) {
	case nil:
		return nil
	case figure.Figure:
		return []block{{Figure: b.figure(v)}}
	case []figure.Figure:
		return each(v, func(f figure.Figure) block { return block{Figure: b.figure(f)} })
	case table.Table:
		return []block{{Grid: b.numbered(b.grid(v, title))}}
	case []table.Table:
		return each(v, func(t table.Table) block { return block{Grid: b.numbered(b.grid(t, title))} })
	case check.Check:
		return []block{{Verdicts: verdictViews([]verdict{{v, ""}})}}
	case []check.Check:
		verdicts := make([]verdict, len(v))
		for i, c := range v {
			verdicts[i].Check = c
		}
		return []block{{Verdicts: verdictViews(verdicts)}}
	case spectrum.Spectrum:
		return b.spectrum(title, v)
	case []spectrum.Point:
		return b.points(title, v)
	case spectrum.Point:
		return b.points(title, []spectrum.Point{v})
	case fit.Posterior:
		return []block{{Posterior: b.posterior(v)}}
	case []fit.Posterior:
		return b.posteriors(title, v)
	case fit.Sampled:
		return b.sampled(title, v)
	case fit.Model:
		return b.model(v)
	case fit.Priors:
		return []block{{Grid: b.numbered(priorsGrid(v))}}
	case fit.Quantity:
		return []block{{Text: quantityText(v)}}
	case []fit.Quantity:
		return []block{{Facts: eachFact(v, func(q fit.Quantity) fact { return fact{label(q.Name), quantityText(q)} })}}
	case []lightcurve.Channel:
		return []block{{Text: channelsText(v)}}
	case lightcurve.Channel:
		return []block{{Text: channelText(v)}}
	case string:
		if len(v) > 120 || strings.Contains(v, "\n") {
			return []block{{Listing: listing(v)}}
		}
		return []block{{Text: v}}
	}
	if l, ok := LightOf(value); ok {
		return []block{{Facts: l.facts()}}
	}
	return generic(value)
}

// shownItems is how many figures, tables and named numbers of one result are
// shown.
const shownItems = 60

func each[T any](items []T, f func(T) block) []block {
	var out []block
	for i, item := range items {
		if i == shownItems {
			return append(out, block{Text: fmt.Sprintf("… and %d more, which are not shown", len(items)-i)})
		}
		out = append(out, f(item))
	}
	return out
}

func eachFact[T any](items []T, f func(T) fact) []fact {
	var out []fact
	for i, item := range items {
		if i == shownItems {
			return append(out, fact{"…", fmt.Sprintf("and %d more, which are not shown", len(items)-i)})
		}
		out = append(out, f(item))
	}
	return out
}

// numbered gives a table the next number.
func (b *builder) numbered(g *gridView) *gridView {
	b.tables++
	g.Number = b.tables
	return g
}

func (b *builder) figure(f figure.Figure) *figureView {
	b.figures++
	v := &figureView{
		ID: fmt.Sprintf("figure-%d", b.figures), Number: b.figures,
		Title: sentence(f.Title), Caption: sentence(f.Caption), Alt: sentence(cmp.Or(f.Alt, f.Title, "a figure without a description")),
	}
	v.draw(f.SVG, fmt.Sprintf("f%d-", b.figures))
	if rows(f.Data) > 0 {
		v.Data = b.grid(f.Data, "figure-"+fmt.Sprint(b.figures)+"-"+f.Title)
	}
	return v
}

// draw fills in the picture.
func (v *figureView) draw(svg, prefix string) {
	var err error
	if v.Picture, err = sanitize(svg, prefix, v.Alt); err != nil {
		v.Problem = sentence(err.Error())
	}
}

func verdictViews(verdicts []verdict) []verdictView {
	var out []verdictView
	for i, c := range verdicts {
		if i == shownRows {
			break
		}
		value := number(c.Value, 4)
		if math.IsNaN(c.Value) {
			value = "could not be computed"
		} else if c.Unit != "" {
			value += " " + label(c.Unit)
		}
		step := ""
		if c.Step != "" {
			step = stepID(c.Step)
		}
		out = append(out, verdictView{label(c.Name), value, sentence(c.Limit), sentence(c.Why), step, c.Passed})
	}
	return out
}

// generic shows a value of a type that is not known here.
func generic(value any) []block {
	v := reflect.ValueOf(value)
	for v.Kind() == reflect.Pointer && !v.IsNil() {
		v = v.Elem()
	}
	switch v.Kind() {
	case reflect.Slice, reflect.Array, reflect.Map, reflect.Struct:
		if s, ok := numbersText(v); ok {
			return []block{{Text: s}}
		}
		w := treeWriter{left: treeNodes}
		n := w.node("", v, 0)
		return []block{{Tree: &n}}
	}
	return []block{{Text: scalar(v)}}
}

// scalar shows a number, text or truth value.
func scalar(v reflect.Value) string {
	switch v.Kind() {
	case reflect.Float32, reflect.Float64:
		return precise(v.Float())
	case reflect.String:
		return sentence(v.String())
	case reflect.Bool:
		return fmt.Sprint(v.Bool())
	case reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64:
		return fmt.Sprint(v.Int())
	case reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64:
		return fmt.Sprint(v.Uint())
	case reflect.Complex64, reflect.Complex128:
		c := v.Complex()
		return precise(real(c)) + " + " + precise(imag(c)) + " i"
	case reflect.Invalid:
		return "nothing"
	}
	return "a " + label(v.Type().String())
}

// numbersText shows a slice of numbers by its length, range and beginning.
func numbersText(v reflect.Value) (string, bool) {
	if v.Kind() != reflect.Slice && v.Kind() != reflect.Array {
		return "", false
	}
	kind := v.Type().Elem().Kind()
	if kind < reflect.Int || kind > reflect.Float64 || kind == reflect.Uintptr {
		return "", false
	}
	n := v.Len()
	const preview = 8
	items := make([]string, 0, preview+1)
	values := make([]float64, n)
	for i := range n {
		x := v.Index(i)
		switch {
		case x.CanFloat():
			values[i] = x.Float()
		case x.CanInt():
			values[i] = float64(x.Int())
		default:
			values[i] = float64(x.Uint())
		}
		if i < preview {
			items = append(items, number(values[i], 6))
		}
	}
	if n > preview {
		items = append(items, "…")
	}
	s := count(n, "number")
	if lo, hi, ok := extent(values); ok && n > 1 {
		s += fmt.Sprintf(" from %s to %s", number(lo, 6), number(hi, 6))
	}
	if n > 0 {
		s += ": " + strings.Join(items, ", ")
	}
	return s, true
}

// A node is a part of a value of unknown type.
type node struct {
	Name string
	Text string
	Kids []node
}

// Limits on what is shown of a value of unknown type.
const (
	treeNodes = 400
	treeDepth = 5
	treeItems = 12 // of a slice or map
)

type treeWriter struct{ left int }

func (w *treeWriter) node(called string, v reflect.Value, depth int) node {
	w.left--
	n := node{Name: label(called)}
	for (v.Kind() == reflect.Pointer || v.Kind() == reflect.Interface) && !v.IsNil() && depth < treeDepth {
		v = v.Elem()
		depth++
	}
	if s, ok := numbersText(v); ok {
		n.Text = s
		return n
	}
	switch v.Kind() {
	case reflect.Struct, reflect.Slice, reflect.Array, reflect.Map:
		n.Text = w.head(v)
		if depth < treeDepth {
			n.Kids = w.kids(v, depth+1)
		}
	case reflect.Pointer, reflect.Interface:
		n.Text = "nothing"
	default:
		n.Text = scalar(v)
	}
	return n
}

func (w *treeWriter) head(v reflect.Value) string {
	switch {
	case v.Kind() == reflect.Struct:
		return shortType(v.Type().String())
	case v.Kind() == reflect.Map:
		return counted(v.Len(), "entry", "entries")
	}
	return counted(v.Len(), "element", "elements")
}

func (w *treeWriter) kids(v reflect.Value, depth int) []node {
	var out []node
	add := func(called string, v reflect.Value) bool {
		if w.left <= 0 {
			return false
		}
		out = append(out, w.node(called, v, depth))
		return true
	}
	total, items := 0, 0
	switch v.Kind() {
	case reflect.Struct:
		t := v.Type()
		for i := range v.NumField() {
			if t.Field(i).IsExported() {
				total++
				if add(t.Field(i).Name, v.Field(i)) {
					items++
				}
			}
		}
	case reflect.Slice, reflect.Array:
		total = v.Len()
		for items < min(total, treeItems) && add(fmt.Sprint(items), v.Index(items)) {
			items++
		}
	case reflect.Map:
		total = v.Len()
		keys := v.MapKeys()
		slices.SortFunc(keys, func(a, b reflect.Value) int { return strings.Compare(keyText(a), keyText(b)) })
		for items < min(total, treeItems) && add(keyText(keys[items]), v.MapIndex(keys[items])) {
			items++
		}
	}
	if items < total {
		out = append(out, node{Name: "…", Text: fmt.Sprintf("%d more", total-items)})
	}
	return out
}

func keyText(v reflect.Value) string {
	if v.Kind() == reflect.Interface {
		v = v.Elem()
	}
	return scalar(v)
}
