package program

import (
	"bytes"
	"fmt"
	"go/ast"
	"go/parser"
	"go/scanner"
	"go/token"
	"regexp"
	"sort"
	"strings"

	"rimlight/runner/diag"
	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

const clause = "package main"

// maxSyntax is how many syntax errors of one block are reported: later ones
// mostly follow from the first.
const maxSyntax = 3

// syntax parses every fence on its own, then the whole with its imports.
func (c *checker) syntax(fences []Fence) {
	lines := bytes.SplitAfter(c.src, []byte("\n"))
	for _, f := range fences {
		start, end := max(f.Start, 1), min(f.End, len(lines))
		if start > end {
			continue
		}
		code := append([]byte(clause+"\n"), bytes.Join(lines[start-1:end], nil)...)
		_, err := parser.ParseFile(token.NewFileSet(), "", code, parser.SkipObjectResolution|parser.AllErrors)
		c.syntaxErrors(err, start-2, code)
	}
	if len(c.diags) > 0 {
		return
	}
	c.src = c.withClause(clause)
	f, err := parser.ParseFile(token.NewFileSet(), c.file, c.src, parser.AllErrors)
	if err != nil && fences == nil {
		if guess := declarations(lines); len(guess) > 0 {
			c.syntax(guess)
		}
	}
	if err != nil {
		if len(c.diags) == 0 {
			c.syntaxErrors(err, 0, c.src)
		}
		return
	}
	c.src = c.withClause(clause + implied(f))
	c.tree, err = parser.ParseFile(c.fset, c.file, c.src, parser.ParseComments|parser.SkipObjectResolution)
	c.syntaxErrors(err, 0, c.src)
}

// declarations guesses where top-level declarations begin: after a blank line,
// at a keyword or a comment in the first column.
func declarations(lines [][]byte) []Fence {
	var out []Fence
	blank := true
	for i, line := range lines {
		text := string(line)
		if blank && i > 0 && opening.MatchString(text) {
			if n := len(out); n > 0 {
				out[n-1].End = i
			}
			out = append(out, Fence{Start: i + 1, End: len(lines)})
		}
		blank = strings.TrimSpace(text) == ""
	}
	for i := range out { // the end of the source is where the code ends
		for out[i].End > out[i].Start && strings.TrimSpace(string(lines[out[i].End-1])) == "" {
			out[i].End--
		}
	}
	return out
}

var opening = regexp.MustCompile(`^(func|type|const|var)\b|^//|^/\*`)

// syntaxErrors reports the errors of one parse of code, whose lines are shift
// before those of the recipe.
func (c *checker) syntaxErrors(err error, shift int, code []byte) {
	list, ok := err.(scanner.ErrorList)
	if !ok {
		if err != nil {
			c.diags.Add(diag.Pos{File: c.file}, err.Error(), "", "")
		}
		return
	}
	reported := 0
	for i, e := range list {
		if i > 0 && e.Pos.Line == list[i-1].Pos.Line {
			continue
		}
		if reported++; reported > maxSyntax {
			break
		}
		message, expected := e.Msg, ""
		if strings.HasSuffix(e.Msg, "found 'EOF'") {
			message = "the Go block ends too early"
			if line, bracket := unclosed(code); line > 0 {
				expected = fmt.Sprintf("the %s opened in line %d is not closed", bracket, line+shift)
			}
		}
		pos := diag.Pos{File: c.file, Line: e.Pos.Line + shift, Col: e.Pos.Column}
		c.diags.Add(pos, "syntax error: "+message, expected, "")
	}
}

// unclosed finds the last bracket that code opens and does not close.
func unclosed(code []byte) (line int, bracket string) {
	files := token.NewFileSet()
	f := files.AddFile("", -1, len(code))
	var s scanner.Scanner
	s.Init(f, code, nil, 0)
	var open []token.Pos
	for {
		pos, tok, _ := s.Scan()
		switch tok {
		case token.EOF:
			if len(open) == 0 {
				return 0, ""
			}
			at := f.PositionFor(open[len(open)-1], false)
			return at.Line, string(code[at.Offset])
		case token.LBRACE, token.LPAREN, token.LBRACK:
			open = append(open, pos)
		case token.RBRACE, token.RPAREN, token.RBRACK:
			if len(open) > 0 {
				open = open[:len(open)-1]
			}
		}
	}
}

// withClause is the source with its first line replaced.
func (c *checker) withClause(line string) []byte {
	_, rest, found := bytes.Cut(c.src, []byte("\n"))
	if !found {
		return []byte(line + "\n")
	}
	return append([]byte(line+"\n"), rest...)
}

// implied writes imports for the available packages that the file names
// without declaring them.
func implied(f *ast.File) string {
	free := map[*ast.Ident]bool{}
	for _, id := range f.Unresolved {
		free[id] = true
	}
	need := map[string]bool{}
	ast.Inspect(f, func(n ast.Node) bool {
		if s, ok := n.(*ast.SelectorExpr); ok {
			if id, ok := s.X.(*ast.Ident); ok && free[id] && exportdata.Has(available.Path(id.Name)) {
				need[id.Name] = true
			}
		}
		return true
	})
	var names []string
	for name := range need {
		names = append(names, name)
	}
	sort.Strings(names)
	var b strings.Builder
	for _, name := range names {
		fmt.Fprintf(&b, "; import %s %q", name, available.Path(name))
	}
	return b.String()
}
