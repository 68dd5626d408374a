package program

import (
	"fmt"
	"go/scanner"
	"go/token"
	"regexp"
	"strconv"
	"strings"

	"rimlight/runner/diag"
	"rimlight/runner/program/available"
)

// directive matches the comments that tools take for commands: a word, a colon
// and a word, without a space after the slashes.
var directive = regexp.MustCompile(`^//([A-Za-z0-9]+):\S`)

// scan reads the tokens of the source, before any parser sees them. It blanks
// imports of available packages, which are implied, and refuses other imports,
// characters and names that deceive the reader, package clauses, directives to the compiler, and nesting that is too deep.
func (c *checker) scan() {
	c.visible()
	names := newLookout()
	files := token.NewFileSet()
	f := files.AddFile(c.file, -1, len(c.src))
	at := func(pos token.Pos) diag.Pos {
		p := f.PositionFor(pos, false)
		return diag.Pos{File: c.file, Line: p.Line, Col: p.Column}
	}
	var s scanner.Scanner
	s.Init(f, c.src, nil, scanner.ScanComments)
	depth, tokens := 0, 0
	var chain [maxNesting + 1]int // operators since the last separator, by depth
	var imports importScan
	var blank [][2]int
	for {
		pos, tok, lit := s.Scan()
		if tok == token.EOF {
			break
		}
		if tok == token.COMMENT {
			c.comment(at, pos, lit)
			continue
		}
		if tokens++; tokens > maxTokens {
			c.diags.Add(at(pos), fmt.Sprintf("the recipe has more than %d words and signs of code", maxTokens), "read long tables from a file", "")
			return
		}
		if tok == token.IDENT && len(lit) > maxIdentifier {
			c.diags.Add(at(pos), fmt.Sprintf("a name is %d bytes long", len(lit)), fmt.Sprintf("at most %d are read", maxIdentifier), "")
			return
		}
		if tok == token.IDENT {
			if message, expected := names.look(lit, at(pos).Line); message != "" {
				c.diags.Add(at(pos), message, expected, "")
			}
		}
		if imports.active {
			from := f.Offset(pos)
			to := from + len(lit)
			if lit == "" || lit == "\n" {
				to = from + len(tok.String())
			}
			if tok == token.SEMICOLON && lit == "\n" {
				to = from
			}
			message, expected, nearest := imports.next(tok, lit)
			if message != "" {
				c.diags.Add(at(pos), message, expected, nearest)
			}
			blank = append(blank, [2]int{from, to})
			continue
		}
		switch tok {
		case token.LBRACE, token.LPAREN, token.LBRACK:
			chain[depth]++
			depth++
			if depth > maxNesting {
				c.diags.Add(at(pos), fmt.Sprintf("brackets are nested more than %d deep", maxNesting), "split the expression or the function", "")
				return
			}
			chain[depth] = 0
		case token.RBRACE, token.RPAREN, token.RBRACK:
			depth = max(depth-1, 0)
		case token.SEMICOLON, token.COMMA:
			chain[depth] = 0
		case token.PACKAGE:
			c.diags.Add(at(pos), "a recipe has no package clause", "leave it out", "")
		case token.IMPORT:
			if depth == 0 {
				imports = importScan{active: true}
				blank = append(blank, [2]int{f.Offset(pos), f.Offset(pos) + len("import")})
			}
		default:
			if tok.IsOperator() || tok == token.ELSE || tok == token.FUNC || tok == token.MAP || tok == token.CHAN {
				chain[depth]++
			}
		}
		if chain[depth] > maxChain {
			c.diags.Add(at(pos), fmt.Sprintf("a statement has more than %d operators in a row", maxChain), "split it", "")
			return
		}
	}
	for _, b := range blank {
		for i := b[0]; i < b[1]; i++ {
			if c.src[i] != '\n' {
				c.src[i] = ' '
			}
		}
	}
}

// comment refuses comments that are directives, but for //each:, which is
// looked at when the steps are known.
func (c *checker) comment(at func(token.Pos) diag.Pos, pos token.Pos, text string) {
	const only = "the only directive of a recipe is //each:element in collection"
	first, _, _ := strings.Cut(text, "\n")
	switch {
	case strings.HasPrefix(text, "//line "), strings.HasPrefix(text, "/*line "), strings.HasPrefix(text, "//export "), strings.HasPrefix(text, "//extern "):
		c.diags.Add(at(pos), fmt.Sprintf("directive %q is not allowed", first), only, "")
	case directive.MatchString(text):
		if word := directive.FindStringSubmatch(text)[1]; !strings.EqualFold(word, "each") {
			c.diags.Add(at(pos), fmt.Sprintf("directive %q is not allowed", first), only, diag.Nearest(word, []string{"each"}))
		}
	case strings.HasPrefix(strings.ReplaceAll(text, " ", ""), "//+build"):
		c.diags.Add(at(pos), fmt.Sprintf("directive %q is not allowed", first), only, "")
	}
}

// An importScan follows the tokens of one import declaration.
type importScan struct {
	active bool
	paren  bool
}

// next takes a token of the declaration and says what is wrong with it, if
// anything.
func (s *importScan) next(tok token.Token, lit string) (message, expected, nearest string) {
	switch tok {
	case token.LPAREN:
		s.paren = true
	case token.RPAREN:
		s.paren = false
	case token.SEMICOLON:
		s.active = s.paren
	case token.STRING:
		path, err := strconv.Unquote(lit)
		if err != nil {
			return "malformed import path " + lit, "imports are implied: leave it out", ""
		}
		if available.Name(path) == "" && available.Path(path) == "" {
			return unavailable(path)
		}
	default:
		s.active = s.paren
		return "an import cannot rename a package", "imports are implied: use the package under its own name", ""
	}
	return "", "", ""
}

// unavailable says that a package is not for recipes.
func unavailable(path string) (message, expected, nearest string) {
	names := available.Names()
	last := path[strings.LastIndex(path, "/")+1:]
	return fmt.Sprintf("package %s is not available to recipes", path), "packages available: " + strings.Join(names, ", "), diag.Nearest(last, names)
}
