package recipe

import (
	"fmt"
	"strings"
	"unicode"
)

func (p *parsing) input(r row) {
	name := r.cell("input")
	good := p.name("input", name)
	file, layout := r.cell("file"), r.cell("layout")
	in := Input{
		Pos:       p.text.pos(name.start),
		Name:      name.text,
		Layout:    layout.text,
		About:     r.cell("about").text,
		FilePos:   p.text.pos(file.start),
		LayoutPos: p.text.pos(layout.start),
	}
	l, known := layoutOf(in.Layout)
	expected := "expected one of " + strings.Join(layoutNames(), ", ")
	switch {
	case !r.has("layout"):
	case in.Layout == "":
		p.add(layout.start, fmt.Sprintf("the input %s has no layout", in.Name), expected, "")
	case !known:
		p.add(layout.start, fmt.Sprintf("there is no layout %s", quote(in.Layout)), expected, p.nearest(in.Layout, layoutNames()))
	}
	in.Files = p.files(file)
	if known && len(in.Files) > l.Files {
		p.add(file.start, fmt.Sprintf("the input %s names %s", in.Name, count(len(in.Files), "file")),
			fmt.Sprintf("expected at most %d for a %s", l.Files, l.Name), "")
	}
	if good {
		p.r.Inputs = append(p.r.Inputs, in)
	}
}

// files splits a cell into file names. An empty cell has none: the input is
// absent.
func (p *parsing) files(c cell) []string {
	if c.text == "" {
		return nil
	}
	var files []string
	at, missing := 0, false
	for part := range strings.SplitSeq(c.text, ";") {
		name := bare(part)
		start := c.offset(at + strings.Index(part, name))
		at += len(part) + 1
		switch {
		case name == "":
			if !missing {
				p.add(start, "a file name is missing beside a semicolon", "expected file names separated by semicolons", "")
			}
			missing = true
			continue
		case strings.Contains(name, "://"):
			p.add(start, fmt.Sprintf("%s is no file", quote(name)), "expected the path of a file relative to the recipe; nothing is fetched from the network", "")
			continue
		case strings.ContainsFunc(name, unicode.IsControl):
			p.add(start, fmt.Sprintf("the file name %s holds a control character", quote(name)), "expected the path of a file relative to the recipe", "")
			continue
		}
		files = append(files, name)
	}
	return files
}
