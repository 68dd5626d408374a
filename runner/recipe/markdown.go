package recipe

import (
	"strings"

	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	"github.com/yuin/goldmark/parser"
	gtext "github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"
)

// A document is the block structure of a Markdown text. Inline markup is not
// parsed: cells and headings are few and short, and read where they are used.
type document struct {
	root   ast.Node
	tables map[ast.Node][]gtext.Segment // header, delimiter row and rows of each table, line by line
	closed map[ast.Node]bool            // fenced blocks that end in a closing fence
}

// parseBlocks reads the block structure as goldmark with its table extension
// does, keeping what the syntax tree leaves out.
func parseBlocks(source []byte) *document {
	d := &document{tables: map[ast.Node][]gtext.Segment{}, closed: map[ast.Node]bool{}}
	blocks := parser.DefaultBlockParsers()
	for i, b := range blocks {
		if b.Priority == 700 { // fenced code, by the list in goldmark's documentation
			blocks[i] = util.Prioritized(&fenceParser{parser.NewFencedCodeBlockParser(), d}, b.Priority)
		}
	}
	p := parser.NewParser(
		parser.WithBlockParsers(blocks...),
		parser.WithParagraphTransformers(
			util.Prioritized(referenceParser{parser.LinkReferenceParagraphTransformer}, 100),
			util.Prioritized(&tableParser{extension.NewTableParagraphTransformer(), d}, 200),
		),
	)
	d.root = p.Parse(gtext.NewReader(source))
	return d
}

// A fenceParser notes which fenced blocks are closed.
type fenceParser struct {
	parser.BlockParser
	doc *document
}

func (f *fenceParser) Continue(node ast.Node, reader gtext.Reader, pc parser.Context) parser.State {
	state := f.BlockParser.Continue(node, reader, pc)
	if state == parser.Close {
		f.doc.closed[node] = true
	}
	return state
}

// maxReferences is the longest paragraph, in lines, that is searched for link
// references; the search takes the square of their number.
const maxReferences = 1000

// A referenceParser leaves very long paragraphs alone.
type referenceParser struct{ parser.ParagraphTransformer }

func (r referenceParser) Transform(node *ast.Paragraph, reader gtext.Reader, pc parser.Context) {
	if node.Lines().Len() <= maxReferences {
		r.ParagraphTransformer.Transform(node, reader, pc)
	}
}

// A tableParser keeps the lines of tables, since their syntax tree has cells
// cut off or filled up to the number of columns.
type tableParser struct {
	parser.ParagraphTransformer
	doc *document
}

func (t *tableParser) Transform(node *ast.Paragraph, reader gtext.Reader, pc parser.Context) {
	lines := node.Lines()
	before := append([]gtext.Segment(nil), lines.Sliced(0, lines.Len())...)
	parent, previous := node.Parent(), node.PreviousSibling()
	t.ParagraphTransformer.Transform(node, reader, pc)
	switch left := node.Lines().Len(); {
	case left == len(before):
	case node.Parent() != nil:
		t.doc.tables[node.NextSibling()] = before[left:]
	case previous != nil:
		t.doc.tables[previous.NextSibling()] = before
	default:
		t.doc.tables[parent.FirstChild()] = before
	}
}

// maxInline is the longest heading whose markup is taken off; a longer one is
// kept as it is written, because inline parsing is not linear in the worst case.
const maxInline = 4096

// plain gives the text of a heading without its markup.
func plain(s string) string {
	s = strings.Join(strings.Fields(s), " ")
	if len(s) > maxInline {
		return s
	}
	source := []byte(s)
	root := parser.NewParser(
		parser.WithBlockParsers(util.Prioritized(parser.NewParagraphParser(), 1)),
		parser.WithInlineParsers(parser.DefaultInlineParsers()...),
	).Parse(gtext.NewReader(source))
	var b strings.Builder
	ast.Walk(root, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if !entering {
			return ast.WalkContinue, nil
		}
		switch n := n.(type) {
		case *ast.Text:
			v := n.Segment.Value(source)
			if n.Parent().Kind() != ast.KindCodeSpan {
				v = util.ResolveEntityNames(util.ResolveNumericReferences(util.UnescapePunctuations(v)))
			}
			b.Write(v)
		case *ast.AutoLink:
			b.Write(n.Label(source))
		}
		return ast.WalkContinue, nil
	})
	return strings.Join(strings.Fields(b.String()), " ")
}
