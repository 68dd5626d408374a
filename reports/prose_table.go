package reports

import (
	"html"
	"html/template"
	"strings"

	"github.com/yuin/goldmark/ast"
	extast "github.com/yuin/goldmark/extension/ast"
	"github.com/yuin/goldmark/util"
)

// A cellNote is what is put into a cell of the recipe's tables beside what is
// written there.
type cellNote struct {
	id    string        // anchor of the cell
	class string        // style class of what is written
	after template.HTML // what follows it
}

// captions of the tables that mean something, by their first header cell.
var captions = map[string]string{
	"input": "Inputs", "setting": "Settings", "parameter": "Priors", "column": "Columns of the input files",
}

// tableKind is the text of the table's first header cell.
func (p *proseRenderer) tableKind(t ast.Node) string {
	if head := t.FirstChild(); head != nil && head.FirstChild() != nil {
		return strings.ToLower(plainText(head.FirstChild(), p.source))
	}
	return ""
}

// annotate notes beside inputs and settings what was used.
func (p *proseRenderer) annotate(t ast.Node) {
	kind := p.tableKind(t)
	if kind != "input" && kind != "setting" {
		return
	}
	var columns []string
	for c := t.FirstChild().FirstChild(); c != nil; c = c.NextSibling() {
		columns = append(columns, strings.ToLower(plainText(c, p.source)))
	}
	for row := t.FirstChild().NextSibling(); row != nil; row = row.NextSibling() {
		cells := map[string]ast.Node{}
		i := 0
		for c := row.FirstChild(); c != nil && i < len(columns); c = c.NextSibling() {
			cells[columns[i]] = c
			i++
		}
		first := cells[kind]
		if first == nil {
			continue
		}
		id := plainText(first, p.source)
		p.notes[first] = cellNote{id: kind + "-" + slug(id)}
		if kind == "setting" {
			p.annotateSetting(id, cells["value"])
		} else {
			p.annotateInput(id, cells["file"])
		}
	}
}

func (p *proseRenderer) annotateSetting(id string, value ast.Node) {
	s, ok := p.b.settings[id]
	if ok && s.Changed && value != nil {
		p.notes[value] = cellNote{class: "replaced", after: template.HTML(` <ins class="changed" title="given on the command line">` + html.EscapeString(sentence(s.Value)) + "</ins>")}
	}
}

func (p *proseRenderer) annotateInput(id string, file ast.Node) {
	if file == nil {
		return
	}
	for _, in := range p.b.doc.Inputs {
		if in.Name != id {
			continue
		}
		var note cellNote
		var b strings.Builder
		if in.Changed {
			note.class = "replaced"
		}
		for i, f := range in.Files {
			if i == shownItems {
				break
			}
			b.WriteString(`<span class="used">`)
			if in.Changed {
				b.WriteString(`<ins class="changed" title="given on the command line">` + html.EscapeString(label(f.Name)) + "</ins> ")
			}
			b.WriteString(html.EscapeString(size(f.Size)) + `, SHA-256 <code class="hash" title="` + html.EscapeString(label(f.SHA256)) + `">` + html.EscapeString(label(f.SHA256)) + "</code></span>")
		}
		if len(in.Files) == 0 {
			b.WriteString(`<span class="used">not given</span>`)
		}
		note.after = template.HTML(b.String())
		p.notes[file] = note
		return
	}
}

func (p *proseRenderer) table(w util.BufWriter, _ []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		w.WriteString("</table></div>\n")
		return ast.WalkContinue, nil
	}
	caption := captions[p.tableKind(node)]
	label := caption
	if label == "" {
		label = "Table"
	}
	w.WriteString(`<div class="scroll" tabindex="0" role="region" aria-label="` + label + `"><table class="written">`)
	if caption != "" {
		w.WriteString("<caption>" + caption + "</caption>")
	}
	w.WriteString("\n")
	return ast.WalkContinue, nil
}

func (p *proseRenderer) cell(w util.BufWriter, _ []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	n := node.(*extast.TableCell)
	note := p.notes[n]
	tag, scope := "td", ""
	switch {
	case n.Parent().Kind() == extast.KindTableHeader:
		tag, scope = "th", ` scope="col"`
	case note.id != "":
		tag, scope = "th", ` scope="row"`
	}
	if !entering {
		if note.class != "" {
			w.WriteString("</del>")
		}
		w.WriteString(string(note.after) + "</" + tag + ">\n")
		return ast.WalkContinue, nil
	}
	w.WriteString("<" + tag + scope)
	if note.id != "" {
		w.WriteString(` id="` + html.EscapeString(note.id) + `"`)
	}
	if n.Alignment != extast.AlignNone {
		w.WriteString(` class="` + n.Alignment.String() + `"`)
	}
	w.WriteString(">")
	if note.class != "" {
		w.WriteString(`<del class="` + note.class + `">`)
	}
	return ast.WalkContinue, nil
}
