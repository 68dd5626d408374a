package recipe

import (
	"bytes"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"github.com/yuin/goldmark/ast"
	east "github.com/yuin/goldmark/extension/ast"

	"rimlight/runner/diag"
)

// Parse reads a recipe. File is the name under which positions are given. All
// faults are reported at once, in the order of the file; with any, the recipe
// is as complete as they allow, and good for nothing but looking for more.
//
// Sections are made by the headings that stand in no list and no block quote.
// Tables and Go fences count wherever they stand.
func Parse(file string, source []byte) (*Recipe, diag.List) {
	source = bytes.TrimPrefix(source, []byte("\ufeff"))
	source = slices.Clip(bytes.Clone(source)) // no room behind it that an append could reach
	p := &parsing{
		text:   newText(file, source),
		r:      &Recipe{File: file, Source: source, Sections: []Section{{}}},
		names:  map[string]place{},
		roles:  map[[2]string]diag.Pos{},
		priors: map[int]diag.Pos{},
		known:  map[ast.Node]*tableKind{},
	}
	if p.checkText() {
		p.doc = parseBlocks(source)
		p.walk()
		p.checkPriors()
		p.checkColumns()
	}
	p.diags.Sort()
	return p.r, p.diags
}

// parsing is the state of one call of Parse.
type parsing struct {
	text  *text
	doc   *document
	r     *Recipe
	diags diag.List

	titled bool
	fences int

	columnInputs []cell                  // the input cells of r.Columns
	parameters   map[string]diag.Pos     // of the section's parameter table
	names        map[string]place        // inputs and settings
	roles        map[[2]string]diag.Pos  // columns, by input and role
	priors       map[int]diag.Pos        // parameter tables, by section
	guess        int                     // names looked for among the known ones
	known        map[ast.Node]*tableKind // tables that have a meaning
}

// A place is where a name of the recipe is made.
type place struct {
	what string // "an input" or "a setting"
	pos  diag.Pos
}

func (p *parsing) add(offset int, message, expected, nearest string) {
	p.diags.Add(p.text.pos(offset), message, expected, nearest)
}

// nearest looks for a known name. It gives up on a name that is too long to be
// one, and in a file with so many faults that nobody reads them all.
func (p *parsing) nearest(name string, known []string) string {
	const maxName, maxGuesses = 64, 200
	p.guess++
	if len(name) > maxName || p.guess > maxGuesses {
		return ""
	}
	return diag.Nearest(name, known)
}

// walk goes through the blocks in the order of the file.
func (p *parsing) walk() {
	ast.Walk(p.doc.root, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if !entering {
			return ast.WalkContinue, nil
		}
		switch n := n.(type) {
		case *ast.Heading:
			if p.lookalike(n) {
				return ast.WalkSkipChildren, nil
			}
			if n.Parent().Kind() == ast.KindDocument {
				p.heading(n)
			}
		case *ast.FencedCodeBlock:
			p.fence(n)
		case *east.Table:
			p.table(n)
			return ast.WalkSkipChildren, nil
		case *ast.Paragraph, *ast.TextBlock:
			p.lookalike(n)
		}
		return ast.WalkContinue, nil
	})
	if !p.titled {
		p.add(0, "the recipe has no title", "expected a level-1 heading, such as # A warm Saturn's transmission spectrum", "")
	}
}

func (p *parsing) heading(n *ast.Heading) {
	s := Section{Pos: p.text.pos(n.Pos()), Level: n.Level, Heading: plain(string(n.Lines().Value(p.text.source)))}
	if n.Level == 1 && !p.titled {
		p.titled = true
		p.r.Title = s.Heading
		if s.Heading == "" {
			p.add(n.Pos(), "the title is empty", "expected the recipe's title in its first level-1 heading", "")
		}
	}
	p.r.Sections = append(p.r.Sections, s)
}

func (p *parsing) section() *Section { return &p.r.Sections[len(p.r.Sections)-1] }

// fence takes in a fenced block.
func (p *parsing) fence(n *ast.FencedCodeBlock) {
	index := p.fences
	p.fences++
	if !p.doc.closed[n] {
		p.add(n.Pos(), "the fenced block is not closed", "expected a closing fence as long as the opening one, in the same list or block quote", "")
	}
	if n.Info == nil {
		return
	}
	info := strings.Fields(string(n.Info.Segment.Value(p.text.source)))
	if len(info) == 0 || info[0] != "go" {
		return
	}
	b := Block{Fence: index, Section: len(p.r.Sections) - 1, Line: p.text.line(n.Pos()) + 2}
	var code strings.Builder
	for i := range n.Lines().Len() {
		seg := n.Lines().At(i)
		code.Write(bytes.TrimRight(seg.Value(p.text.source), "\r\n"))
		code.WriteByte('\n')
		if seg.Stop <= seg.Start {
			continue
		}
		line := p.text.line(seg.Stop - 1)
		if start, end := max(seg.Start, p.text.starts[line]), p.text.end(line); start < end {
			p.r.code = append(p.r.code, span{line, start, end})
		}
	}
	b.Code = code.String()
	p.r.Blocks = append(p.r.Blocks, b)
}

// name takes in the name of an input or a setting. It reports whether the name
// is good.
func (p *parsing) name(what string, c cell) bool {
	if !p.checkName(what, c) {
		return false
	}
	article := "a "
	if what == "input" {
		article = "an "
	}
	if first, taken := p.names[c.text]; taken {
		p.add(c.start, fmt.Sprintf("the name %s is already taken by %s at line %d", c.text, first.what, first.pos.Line),
			"expected a name of its own for each input and setting: a name has one source", "")
		return false
	}
	p.names[c.text] = place{article + what, p.text.pos(c.start)}
	return true
}

func quote(s string) string {
	const most = 60
	if len(s) > most {
		s = strings.ToValidUTF8(s[:most], "") + "…"
	}
	return strconv.Quote(s)
}
