package recipe

import (
	"bytes"
	"fmt"
	"slices"
	"strings"

	"github.com/yuin/goldmark/ast"
)

// A tableKind is a table that has a meaning in a recipe.
type tableKind struct {
	name     string   // the first header cell
	required []string // further columns, in any order
	optional []string
}

var tableKinds = []tableKind{
	{"input", []string{"file", "layout", "about"}, nil},
	{"setting", []string{"value", "unit", "about"}, []string{"also try"}},
	{"parameter", []string{"prior", "unit", "about"}, nil},
	{"column", []string{"name"}, []string{"input", "hdu", "unit", "offset", "about"}},
}

func kindOf(header string) *tableKind {
	for i := range tableKinds {
		if tableKinds[i].name == header {
			return &tableKinds[i]
		}
	}
	return nil
}

// columns lists all columns that a table of this kind may have.
func (k *tableKind) columns() []string {
	return slices.Concat([]string{k.name}, k.required, k.optional)
}

func (k *tableKind) expected() string {
	s := "expected the columns " + strings.Join(append([]string{k.name}, k.required...), ", ")
	if k.optional != nil {
		s += ", and if need be " + strings.Join(k.optional, ", ")
	}
	return s
}

// A row is a row of a table with a meaning.
type row struct {
	start int
	cells []cell
	index map[string]int // columns by name
}

// cell gives the cell of a column; an empty one when the table lacks it.
func (r row) cell(column string) cell {
	if i, ok := r.index[column]; ok {
		return r.cells[i]
	}
	return cell{start: r.start}
}

func (r row) has(column string) bool {
	_, ok := r.index[column]
	return ok
}

// table takes in a table, if it has a meaning.
func (p *parsing) table(n ast.Node) {
	lines := p.doc.tables[n]
	if len(lines) < 2 {
		return
	}
	start := lines[0].Start
	header := splitRow(p.text.source, start, p.text.end(p.text.line(start)))
	if len(header) == 0 {
		return
	}
	kind := kindOf(header[0].text)
	if kind == nil {
		return
	}
	p.known[n] = kind
	index := p.header(kind, header)
	if kind.name == "parameter" && !p.openPriors(header[0]) {
		return
	}
	for _, seg := range lines[2:] {
		end := p.text.end(p.text.line(seg.Start))
		cells := splitRow(p.text.source, seg.Start, end)
		if len(cells) > len(header) {
			p.add(cells[len(header)].start, fmt.Sprintf("the row has %s, the table %s", count(len(cells), "cell"), count(len(header), "column")),
				`expected a cell for each column; a pipe inside a cell is written \|`, "")
			continue
		}
		if len(cells) < len(header) {
			p.add(seg.Start, fmt.Sprintf("the row has %s, the table %s", count(len(cells), "cell"), count(len(header), "column")),
				"expected a cell for each column, if only an empty one, and an empty line after the table", "")
			continue
		}
		r := row{seg.Start, cells, index}
		switch kind.name {
		case "input":
			p.input(r)
		case "setting":
			p.setting(r)
		case "parameter":
			p.prior(r)
		case "column":
			p.column(r)
		}
	}
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// header reads the names of a table's columns and finds each one's place.
func (p *parsing) header(kind *tableKind, cells []cell) map[string]int {
	index := map[string]int{kind.name: 0}
	faulty := false
	for i, c := range cells[1:] {
		name := strings.Join(strings.Fields(c.text), " ")
		_, seen := index[name]
		switch {
		case name == "":
			p.add(c.start, fmt.Sprintf("a column of the %s table has no name", kind.name), kind.expected(), "")
		case !slices.Contains(kind.columns(), name):
			faulty = true
			p.add(c.start, fmt.Sprintf("the %s table has no column %s", kind.name, quote(name)), kind.expected(), p.nearest(name, kind.columns()))
		case seen:
			p.add(c.start, fmt.Sprintf("the column %s stands twice", name), kind.expected(), "")
		default:
			index[name] = i + 1
		}
	}
	for _, name := range kind.required {
		// An unknown column is most likely the missing one misspelt.
		if _, ok := index[name]; !ok && !faulty {
			p.add(cells[0].start, fmt.Sprintf("the %s table lacks the column %s", kind.name, name), kind.expected(), "")
		}
	}
	return index
}

// lookalike complains about a block that was meant to be a table, or a part of
// one, and is not. It reports whether it did.
func (p *parsing) lookalike(n ast.Node) bool {
	lines := n.Lines()
	for i := range lines.Len() {
		start := lines.At(i).Start
		cells, ok := p.pipes(start)
		if !ok {
			continue
		}
		kind := kindOf(cells[0].text)
		if kind == nil || len(cells) < 2 {
			continue
		}
		if p.text.source[start] != '|' && !slices.Contains(kind.columns(), cells[1].text) {
			continue // prose with a pipe in it
		}
		p.add(start, fmt.Sprintf("the line reads like the header of a table with the first column %s, but is none", kind.name),
			"expected the delimiter row "+delimiter(len(cells))+" right under it", "")
		return true
	}
	if previous := n.PreviousSibling(); previous != nil && lines.Len() > 0 {
		start := lines.At(0).Start
		if kind := p.known[previous]; kind != nil && start < len(p.text.source) && p.text.source[start] == '|' {
			p.add(start, fmt.Sprintf("the row is cut off from the %s table above it", kind.name), "expected no empty line inside a table", "")
			return true
		}
	}
	return false
}

// pipes splits the line at start into cells, if it has a pipe.
func (p *parsing) pipes(start int) ([]cell, bool) {
	if start >= len(p.text.source) {
		return nil, false
	}
	end := p.text.end(p.text.line(start))
	if start >= end || bytes.IndexByte(p.text.source[start:end], '|') < 0 {
		return nil, false
	}
	cells := splitRow(p.text.source, start, end)
	return cells, len(cells) > 0
}

// delimiter is the delimiter row for a number of columns.
func delimiter(columns int) string {
	const most = 12
	if columns > most {
		return fmt.Sprintf("of %d cells", columns)
	}
	return strings.Repeat("|---", columns) + "|"
}
