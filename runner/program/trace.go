package program

import (
	"go/ast"
	"go/token"
	"reflect"
	"strconv"

	"rimlight/runner/diag"
)

// The interpreter says in which function a panic arose, but not where in it.
// So a step that has panicked is run once more, with a call before each
// statement that notes the statement's position. That is slow, but happens once
// and only then.

// maxTraced bounds the statements of such a run; it takes a few seconds.
const maxTraced = 5_000_000

// tracePath is the import path under which traced programs find the tracer.
const tracePath = "trace"

// A tracer notes the position of the last statement begun in each function.
type tracer struct {
	functions []ast.Node // by number, inner ones after those around them
	last      []token.Pos
	count     int
}

// at is called before each statement.
func (t *tracer) at(function, pos int) {
	t.last[function] = token.Pos(pos)
	if t.count++; t.count > maxTraced {
		panic("program: traced run is too long")
	}
}

// locate runs the step again to find the statement that panicked with the
// given text. It returns fallback when that fails.
func (m *Machine) locate(step string, args []reflect.Value, text string, fallback diag.Pos) diag.Pos {
	c := check(m.program.file, m.program.given, nil)
	if len(c.diags) > 0 {
		return fallback
	}
	t := &tracer{}
	n := normalise(c)
	t.instrument(n)
	traced := &Program{Steps: m.program.Steps, file: m.program.file, src: c.src, tree: c.tree}
	again, err := traced.compile(map[string]map[string]reflect.Value{
		tracePath + "/" + tracePath: {"At": reflect.ValueOf(t.at)},
	})
	if err != nil {
		return fallback
	}
	_, err = again.call(step, args)
	p, ok := err.(*PanicError)
	if !ok || p.Text != text {
		return fallback
	}
	// The innermost function that contains the place which the interpreter
	// gives is the one that panicked.
	for i := len(t.functions) - 1; i >= 0; i-- {
		from, to := c.at(t.functions[i].Pos()), c.at(t.functions[i].End())
		if before(from, p.Pos) && before(p.Pos, to) && t.last[i].IsValid() {
			return c.at(t.last[i])
		}
	}
	return fallback
}

// before reports whether a is not after b.
func before(a, b diag.Pos) bool {
	return a.Line < b.Line || a.Line == b.Line && a.Col <= b.Col
}

// instrument puts a call of the tracer before every statement of the tree.
func (t *tracer) instrument(n *normaliser) {
	name := n.temporary(tracePath)
	walk(n.tree, func(m ast.Node, _ []ast.Node) {
		switch m.(type) {
		case *ast.FuncDecl, *ast.FuncLit:
			t.functions = append(t.functions, m)
			t.last = append(t.last, token.NoPos)
		}
	})
	for i, f := range t.functions {
		var body *ast.BlockStmt
		switch f := f.(type) {
		case *ast.FuncDecl:
			body = f.Body
		case *ast.FuncLit:
			body = f.Body
		}
		ast.Inspect(body, func(m ast.Node) bool {
			switch m := m.(type) {
			case *ast.FuncLit:
				return false
			case *ast.BlockStmt:
				if !hasClauses(m) {
					m.List = traced(m.List, name, i)
				}
			case *ast.CaseClause:
				m.Body = traced(m.Body, name, i)
			}
			return true
		})
	}
	pos := n.tree.Name.End()
	spec := &ast.ImportSpec{Name: ident(name, pos), Path: &ast.BasicLit{ValuePos: pos, Kind: token.STRING, Value: strconv.Quote(tracePath)}}
	n.tree.Imports = append(n.tree.Imports, spec)
	n.tree.Decls = append([]ast.Decl{&ast.GenDecl{TokPos: pos, Tok: token.IMPORT, Specs: []ast.Spec{spec}}}, n.tree.Decls...)
}

// hasClauses reports whether a block is the body of a switch.
func hasClauses(b *ast.BlockStmt) bool {
	if len(b.List) == 0 {
		return false
	}
	_, ok := b.List[0].(*ast.CaseClause)
	return ok
}

func traced(list []ast.Stmt, name string, function int) []ast.Stmt {
	var out []ast.Stmt
	for _, s := range list {
		pos := s.Pos()
		call := &ast.CallExpr{
			Fun:    &ast.SelectorExpr{X: ident(name, pos), Sel: ident("At", pos)},
			Lparen: pos, Rparen: pos,
			Args: []ast.Expr{number(pos, token.INT, strconv.Itoa(function)), number(pos, token.INT, strconv.Itoa(int(pos)))},
		}
		out = append(out, &ast.ExprStmt{X: call}, s)
	}
	return out
}
