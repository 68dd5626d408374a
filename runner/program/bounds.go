package program

import (
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
	"strings"
	"unicode/utf8"

	"rimlight/runner/diag"
)

// Limits of the code of a recipe. A small source can ask much of the type
// checker and the interpreter: constants and types that double from line to
// line, helpers that a thousand steps share. Ordinary recipes stay below them by
// a factor of ten or more; what gets past them meets the limits of the process.
const (
	maxSource       = 1 << 20 // bytes
	maxTokens       = 200_000
	maxNesting      = 100 // brackets of any kind in one another
	maxChain        = 1000
	maxIdentifier   = 200     // bytes
	maxDeclarations = 3000    // at top level
	maxSteps        = 500     // exported functions
	maxCode         = 1 << 24 // bytes of the normal forms of all steps
	maxText         = 1 << 20 // bytes of the values of all string constants, at all places
	maxParts        = 2000    // fields and elements of one type, written out
	maxAllParts     = 50_000  // the same of all types of the recipe
	maxSize         = 1 << 20 // bytes of a value of a type, without what it points to
	maxFaults       = 50      // that are reported
	maxMessage      = 400     // bytes of a complaint
)

// bounds holds the syntax tree against the limits, before the type checker
// looks at it, and refuses type parameters, which can multiply types.
func (c *checker) bounds() {
	steps := 0
	declarations := 0
	for _, d := range c.tree.Decls {
		switch d := d.(type) {
		case *ast.GenDecl:
			declarations += len(d.Specs)
		case *ast.FuncDecl:
			declarations++
			if d.Recv == nil && d.Name.IsExported() {
				steps++
			}
		}
		if declarations > maxDeclarations {
			c.refuse(d, "split the recipe", "the recipe has more than %d declarations", maxDeclarations)
			return
		}
		if steps > maxSteps {
			c.refuse(d, "begin the names of helpers in lower case", "the recipe has more than %d steps", maxSteps)
			return
		}
	}
	ast.Inspect(c.tree, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.FuncType:
			if n.TypeParams != nil {
				c.refuse(n.TypeParams, "write one function per type", "type parameters are not available")
			}
		case *ast.TypeSpec:
			if n.TypeParams != nil {
				c.refuse(n.TypeParams, "write one type per element type", "type parameters are not available")
			}
		}
		return true
	})
	if len(c.diags) == 0 {
		c.boundText()
	}
	if len(c.diags) == 0 {
		c.boundTypes()
	}
}

// boundText bounds the values of string constants: the sum over all places of
// the code at which one is named. Names are taken without their scopes, the
// longest value that any of them could have.
func (c *checker) boundText() {
	values := map[string][]ast.Expr{}
	ast.Inspect(c.tree, func(n ast.Node) bool {
		d, ok := n.(*ast.GenDecl)
		if !ok || d.Tok != token.CONST {
			return true
		}
		var last []ast.Expr // values are repeated where they are left out
		for _, s := range d.Specs {
			v, ok := s.(*ast.ValueSpec)
			if !ok {
				continue
			}
			if len(v.Values) > 0 {
				last = v.Values
			}
			for i, name := range v.Names {
				if i < len(last) {
					values[name.Name] = append(values[name.Name], last[i])
				}
			}
		}
		return true
	})
	var named func(name string) int
	named = longest(values, 0, func(e ast.Expr) int { // a cycle is a type error
		sum := 0
		ast.Inspect(e, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.BasicLit:
				if n.Kind == token.STRING {
					sum += len(n.Value)
				}
			case *ast.Ident:
				sum += named(n.Name)
			}
			sum = min(sum, maxText+1)
			return true
		})
		return sum
	})
	total := 0
	ast.Inspect(c.tree, func(n ast.Node) bool {
		id, ok := n.(*ast.Ident)
		if !ok || total > maxText {
			return total <= maxText
		}
		if total += named(id.Name); total > maxText {
			c.refuse(id, "build long texts in functions", "the string constants of the recipe come to more than %d bytes", maxText)
		}
		return true
	})
}

// longest gives the length of what a name may stand for: the greatest that
// length finds for any expression of that name, at least least. Length may ask
// for names itself; within its own expressions a name counts as least.
func longest(of map[string][]ast.Expr, least int, length func(ast.Expr) int) func(name string) int {
	known := map[string]int{}
	return func(name string) int {
		if n, ok := known[name]; ok {
			return n
		}
		known[name] = least
		most := least
		for _, e := range of[name] {
			most = max(most, length(e))
		}
		known[name] = most
		return most
	}
}

// boundTypes bounds how long the types of the recipe are written out, with the
// types that they name in place of the names: the interpreter does write them
// out, and even the type checker goes through all parts. Names are taken without
// their scopes, as the longest type that any of them could be; a type within
// itself counts once.
func (c *checker) boundTypes() {
	specs := map[string][]ast.Expr{}
	ast.Inspect(c.tree, func(n ast.Node) bool {
		if s, ok := n.(*ast.TypeSpec); ok {
			specs[s.Name.Name] = append(specs[s.Name.Name], s.Type)
		}
		return true
	})
	var parts func(e ast.Expr) int
	named := longest(specs, 1, func(e ast.Expr) int { return parts(e) })
	parts = func(e ast.Expr) int {
		sum := 1
		ast.Inspect(e, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.Field: // as often as it has names
				sum += parts(n.Type) * max(len(n.Names), 1)
				sum = min(sum, maxParts+1)
				return false
			case *ast.SelectorExpr:
				sum++
				return false
			case *ast.Ident:
				sum += named(n.Name)
			}
			sum = min(sum, maxParts+1)
			return true
		})
		return sum
	}
	total := 0
	ast.Inspect(c.tree, func(n ast.Node) bool {
		var typ ast.Expr
		switch n := n.(type) {
		case *ast.TypeSpec:
			typ = n.Type
		case *ast.StructType:
			typ = n
		default:
			return true
		}
		if len(c.diags) > 0 {
			return false
		}
		own := parts(typ)
		if total += own; own > maxParts {
			c.refuse(n, "use fewer types within types", "a type has more than %d parts, with those of the types that it names", maxParts)
		} else if total > maxAllParts {
			c.refuse(n, "use fewer and smaller types", "the types of the recipe come to more than %d parts", maxAllParts)
		}
		return true
	})
}

// boundSizes bounds the values of the types of the recipe, when the type checker
// knows them.
func (c *checker) boundSizes() {
	before := len(c.diags)
	m := measure{}
	ast.Inspect(c.tree, func(n ast.Node) bool {
		e, ok := n.(ast.Expr)
		if !ok || len(c.diags) > before {
			return len(c.diags) == before
		}
		t := c.info.TypeOf(e)
		if t != nil && c.info.Types[e].IsType() {
			if m.size(t) > maxSize {
				c.refuse(e, "use a slice", "a value of type %s takes more than %d bytes", exprText(e), maxSize)
			}
		}
		if lit, ok := e.(*ast.CompositeLit); ok && t != nil && m.size(t) > maxSize {
			c.refuse(lit, "use a slice", "the value takes more than %d bytes", maxSize)
		}
		return true
	})
}

// A measure finds out how large values of types are, once for each type.
type measure map[types.Type]int

// size is at least the number of bytes of a value of t, at most a little more
// than maxSize.
func (m measure) size(t types.Type) int {
	t = types.Unalias(t)
	if n, ok := m[t]; ok {
		return n
	}
	m[t] = 0
	n := 16 // of a string or an interface; the largest of the others has 24
	switch u := t.Underlying().(type) {
	case *types.Array:
		each := m.size(u.Elem())
		switch {
		case each == 0:
			n = 0
		case u.Len() > int64(maxSize/each):
			n = maxSize + 1
		default:
			n = each * int(u.Len())
		}
		if u.Len() > maxSize {
			n = maxSize + 1 // even of elements without size
		}
	case *types.Struct:
		n = 0
		for i := 0; i < u.NumFields(); i++ {
			n = min(n+m.size(u.Field(i).Type()), maxSize+1)
		}
	case *types.Basic:
		if u.Info()&types.IsNumeric != 0 {
			n = 8
		}
	}
	m[t] = n
	return n
}

// shorten cuts the list of faults and their texts, which quote the source.
func shorten(list diag.List) diag.List {
	if more := len(list) - maxFaults; more > 0 {
		list = list[:maxFaults]
		list[maxFaults-1].Message = fmt.Sprintf("there are %d more faults", more+1)
		list[maxFaults-1].Expected, list[maxFaults-1].Nearest = "", ""
	}
	for i := range list {
		list[i].Message, list[i].Expected = cut(list[i].Message), cut(list[i].Expected)
	}
	return list
}

// cut leaves out the middle of a long text.
func cut(s string) string {
	if len(s) <= maxMessage {
		return s
	}
	head, tail := maxMessage*2/3, len(s)-maxMessage/3
	for head > 0 && !utf8.RuneStart(s[head]) {
		head--
	}
	for tail < len(s) && !utf8.RuneStart(s[tail]) {
		tail++
	}
	return strings.TrimSpace(s[:head]) + " … " + strings.TrimSpace(s[tail:])
}
