package reports

import (
	"go/scanner"
	"go/token"
	"html"
	"html/template"
	"strconv"
	"strings"
)

// highlight writes Go code as HTML, line by line, numbered from line. Each line
// is a span, with spans of the classes k (keyword), c (comment), s (text
// literal), n (number literal) and f (a function's name where it is declared)
// in it. The text in them is the code, character by character, whether or not
// it is valid Go.
func highlight(code string, line int) []template.HTML {
	w := &codeWriter{line: line}
	src := []byte(code)
	file := token.NewFileSet().AddFile("", -1, len(src))
	var s scanner.Scanner
	s.Init(file, src, func(token.Position, string) {}, scanner.ScanComments)
	class, at, previous := "", 0, token.ILLEGAL
	w.open()
	for {
		pos, tok, lit := s.Scan()
		start := len(src)
		if tok != token.EOF {
			start = file.Offset(pos)
		}
		if tok == token.SEMICOLON && lit == "\n" {
			continue // put in by the scanner: not in the text
		}
		w.write(class, code[at:start])
		if tok == token.EOF {
			break
		}
		class, at = classOf(tok, previous), start
		previous = tok
	}
	w.close()
	return w.lines
}

func classOf(tok, previous token.Token) string {
	switch {
	case tok.IsKeyword():
		return "k"
	case tok == token.COMMENT:
		return "c"
	case tok == token.STRING, tok == token.CHAR:
		return "s"
	case tok == token.INT, tok == token.FLOAT, tok == token.IMAG:
		return "n"
	case tok == token.IDENT && previous == token.FUNC:
		return "f"
	}
	return ""
}

// codeWriter writes classed text, closing and opening spans at line ends.
type codeWriter struct {
	lines []template.HTML
	b     strings.Builder
	line  int
}

func (w *codeWriter) open() {
	w.b.WriteString(`<span class="ln" data-n="`)
	w.b.WriteString(strconv.Itoa(w.line))
	w.b.WriteString(`">`)
	w.line++
}

func (w *codeWriter) close() {
	w.b.WriteString("</span>")
	w.lines = append(w.lines, template.HTML(w.b.String()))
	w.b.Reset()
}

func (w *codeWriter) write(class, s string) {
	for s != "" {
		piece, rest, more := strings.Cut(s, "\n")
		body := strings.TrimRight(piece, " \t")
		if body != "" && class != "" {
			w.b.WriteString(`<span class="` + class + `">`)
			w.b.WriteString(html.EscapeString(body))
			w.b.WriteString("</span>")
		} else {
			body = ""
		}
		w.b.WriteString(html.EscapeString(piece[len(body):]))
		if more {
			w.close()
			w.open()
		}
		s = rest
	}
}
