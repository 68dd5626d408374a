package reports

import (
	"bytes"
	"html"
	"html/template"
	"io"
	"strings"

	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	extast "github.com/yuin/goldmark/extension/ast"
	"github.com/yuin/goldmark/renderer"
	"github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"
)

// prose renders the recipe's Markdown, with each Go block replaced by the
// steps in it. HTML in the Markdown is shown as text; links go to http, https
// and this document; of images, the description is shown.
func (b *builder) prose(fences func(io.Writer, fenceView) error) (template.HTML, error) {
	p := &proseRenderer{b: b, source: b.doc.Source, fences: fences, notes: map[ast.Node]cellNote{}}
	md := goldmark.New(
		goldmark.WithExtensions(
			extension.NewTable(extension.WithTableCellAlignMethod(extension.TableCellAlignAttribute)),
			extension.Strikethrough, extension.Linkify, extension.TaskList),
		goldmark.WithRendererOptions(renderer.WithNodeRenderers(util.Prioritized(p, 1))),
	)
	root := md.Parser().Parse(text.NewReader(p.source))
	p.prepare(root)
	var out bytes.Buffer
	if err := md.Renderer().Render(&out, p.source, root); err != nil {
		return "", err
	}
	return template.HTML(out.String()), nil
}

// proseRenderer renders the nodes that a report shows in its own way.
type proseRenderer struct {
	b      *builder
	source []byte
	fences func(io.Writer, fenceView) error
	fence  int // number of fenced blocks so far
	level  int // of the heading that the text stands under
	notes  map[ast.Node]cellNote
}

// prepare names the headings, takes out the title, and annotates the tables
// of inputs and settings.
func (p *proseRenderer) prepare(root ast.Node) {
	p.level = 1
	used := map[string]bool{}
	var title ast.Node
	ast.Walk(root, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if !entering {
			return ast.WalkContinue, nil
		}
		switch n := n.(type) {
		case *ast.Heading:
			if n.Level == 1 && title == nil {
				title = n
				break
			}
			n.Level = max(n.Level, 2)
			heading := plainText(n, p.source)
			id := unique("section-"+strings.ToLower(slug(heading)), used)
			n.SetAttributeString("id", []byte(id))
			if _, ok := p.b.sections[heading]; !ok {
				p.b.sections[heading] = id
			}
		case *extast.Table:
			p.annotate(n)
		}
		return ast.WalkContinue, nil
	})
	if title != nil {
		title.Parent().RemoveChild(title.Parent(), title)
	}
}

func unique(id string, used map[string]bool) string {
	for used[id] {
		id += "."
	}
	used[id] = true
	return id
}

// plainText is the text in a node, without markup.
func plainText(n ast.Node, source []byte) string {
	var b strings.Builder
	ast.Walk(n, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if !entering {
			return ast.WalkContinue, nil
		}
		switch n := n.(type) {
		case *ast.Text:
			b.Write(n.Value(source))
			if n.SoftLineBreak() || n.HardLineBreak() {
				b.WriteByte(' ')
			}
		case *ast.String:
			b.Write(n.Value)
		case *ast.AutoLink:
			b.Write(n.Label(source))
		}
		return ast.WalkContinue, nil
	})
	return strings.TrimSpace(html.UnescapeString(b.String()))
}

// RegisterFuncs registers the nodes that are rendered here.
func (p *proseRenderer) RegisterFuncs(r renderer.NodeRendererFuncRegisterer) {
	r.Register(ast.KindHeading, p.heading)
	r.Register(ast.KindFencedCodeBlock, p.fenced)
	r.Register(ast.KindHTMLBlock, p.htmlBlock)
	r.Register(ast.KindRawHTML, p.rawHTML)
	r.Register(ast.KindLink, p.link)
	r.Register(ast.KindAutoLink, p.autoLink)
	r.Register(ast.KindImage, p.image)
	r.Register(extast.KindTable, p.table)
	r.Register(extast.KindTableCell, p.cell)
}

func (p *proseRenderer) heading(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	n := node.(*ast.Heading)
	tag := "h" + string(rune('0'+n.Level))
	if !entering {
		w.WriteString("</" + tag + ">\n")
		return ast.WalkContinue, nil
	}
	id, _ := n.AttributeString("id")
	anchor, _ := id.([]byte)
	p.level = n.Level
	p.b.contents = append(p.b.contents, entry{ID: string(anchor), Text: label(plainText(n, source)), Level: n.Level})
	w.WriteString("<" + tag + ` id="` + html.EscapeString(string(anchor)) + `">`)
	return ast.WalkContinue, nil
}

func (p *proseRenderer) fenced(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	n := node.(*ast.FencedCodeBlock)
	index := p.fence
	p.fence++
	code := string(n.Lines().Value(source))
	if string(n.Language(source)) != "go" {
		return ast.WalkSkipChildren, p.fences(w, fenceView{Plain: listing(code)})
	}
	line := 1
	if n.Lines().Len() > 0 {
		line += bytes.Count(source[:n.Lines().At(0).Start], []byte("\n"))
	}
	return ast.WalkSkipChildren, p.fences(w, p.b.fence(index, line, p.level+1, code))
}

func (p *proseRenderer) htmlBlock(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	n := node.(*ast.HTMLBlock)
	raw := string(n.Lines().Value(source))
	if n.HasClosure() {
		raw += string(n.ClosureLine.Value(source))
	}
	w.WriteString(`<pre class="plain"><code>` + html.EscapeString(raw) + "</code></pre>\n")
	return ast.WalkSkipChildren, nil
}

func (p *proseRenderer) rawHTML(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if entering {
		w.WriteString("<code>" + html.EscapeString(string(node.(*ast.RawHTML).Segments.Value(source))) + "</code>")
	}
	return ast.WalkSkipChildren, nil
}

// address checks where a link goes; ok is false when it is not to be followed.
func (p *proseRenderer) address(to string) (href string, ok bool) {
	lower := strings.ToLower(to)
	switch {
	case strings.HasPrefix(lower, "http://"), strings.HasPrefix(lower, "https://"):
		return to, true
	case strings.HasPrefix(to, "#"):
		return "#section-" + strings.ToLower(slug(to[1:])), true
	}
	return "", false
}

func (p *proseRenderer) link(w util.BufWriter, _ []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	href, ok := p.address(string(node.(*ast.Link).Destination))
	switch {
	case !ok:
	case entering:
		w.WriteString(`<a rel="noreferrer" href="` + html.EscapeString(string(util.URLEscape([]byte(href), true))) + `">`)
	default:
		w.WriteString("</a>")
	}
	return ast.WalkContinue, nil
}

func (p *proseRenderer) autoLink(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	n := node.(*ast.AutoLink)
	label := html.EscapeString(string(n.Label(source)))
	if href, ok := p.address(string(n.URL(source))); ok && n.AutoLinkType == ast.AutoLinkURL {
		label = `<a rel="noreferrer" href="` + html.EscapeString(string(util.URLEscape([]byte(href), false))) + `">` + label + "</a>"
	}
	w.WriteString(label)
	return ast.WalkContinue, nil
}

func (p *proseRenderer) image(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if entering {
		w.WriteString(`<span class="noimage">[image: ` + html.EscapeString(plainText(node, source)) + "]</span>")
	}
	return ast.WalkSkipChildren, nil
}
