package program

import (
	"go/ast"
	"go/token"
	"go/types"

	"rimlight/runner/program/available"
)

// lint refuses what type-checks but is not for recipes. Two things are looked
// for: code whose result could differ between two runs (lintresult.go), and code
// that the interpreter runs otherwise than compiled Go does and that
// normalise.go does not rewrite (lintinterp.go).
func (c *checker) lint() {
	l := &linter{checker: c, escape: newEscape(c), changes: newChanges(c), called: map[ast.Expr]bool{}}
	walk(c.tree, func(n ast.Node, _ []ast.Node) {
		if call, ok := n.(*ast.CallExpr); ok {
			l.called[ast.Unparen(call.Fun)] = true
		}
	})
	l.declarations()
	l.becomesInterface()
	walk(c.tree, func(n ast.Node, above []ast.Node) {
		if len(c.diags) > 10*maxFaults {
			return
		}
		l.result(n, above)
		l.statement(n, above)
		l.expression(n, above)
	})
}

type linter struct {
	*checker
	escape  *escape
	changes *changes
	called  map[ast.Expr]bool // the function operands of calls
}

// walk visits the tree top-down with the nodes above each node, outermost
// first.
func walk(root ast.Node, visit func(n ast.Node, above []ast.Node)) {
	var above []ast.Node
	ast.Inspect(root, func(n ast.Node) bool {
		if n == nil {
			above = above[:len(above)-1]
			return true
		}
		visit(n, above)
		above = append(above, n)
		return true
	})
}

// under is the underlying type of e.
func (c *checker) under(e ast.Expr) types.Type {
	if t := c.info.TypeOf(e); t != nil {
		return t.Underlying()
	}
	return types.Typ[types.Invalid]
}

// object is what an identifier defines or names.
func (c *checker) object(id *ast.Ident) types.Object {
	if o := c.info.Defs[id]; o != nil {
		return o
	}
	return c.info.Uses[id]
}

// local reports whether t, or what it points to, is a named type of the recipe.
func (c *checker) local(t types.Type) bool {
	n := named(t)
	return n != nil && n.Obj().Pkg() == c.pkg
}

func isInterface(t types.Type) bool {
	_, ok := t.Underlying().(*types.Interface)
	return ok
}

func within(pos token.Pos, n ast.Node) bool { return n.Pos() <= pos && pos < n.End() }

// declarations looks at what stands at top level.
func (l *linter) declarations() {
	for _, d := range l.tree.Decls {
		switch d := d.(type) {
		case *ast.GenDecl:
			if d.Tok == token.VAR {
				l.refuse(d, "make it a constant, or pass the value to the functions that need it", "a variable outside functions would carry state from step to step")
			}
		case *ast.FuncDecl:
			name := d.Name.Name
			if d.Recv == nil && (name == "init" || name == "main") {
				l.refuse(d.Name, "only steps are run, and the helpers that they call", "func %s is never called", name)
			}
			if d.Body == nil {
				l.refuse(d.Name, "write its body", "func %s has no body", name)
			}
			if d.Recv != nil && seenOutside[name] {
				l.refuse(d.Name, "choose another name and call it yourself", "method %s would not be found by functions of other packages", name)
			}
		}
	}
}

// seenOutside holds the methods by which compiled packages recognise a type;
// those of interpreted types are hidden from them.
var seenOutside = map[string]bool{
	"Error": true, "String": true, "GoString": true, "Format": true, "Scan": true,
	"Unwrap": true, "Is": true, "As": true,
}

// callee is the function or method that a call names, nil for a conversion, a
// built-in function or a function value.
func (c *checker) callee(call *ast.CallExpr) *types.Func {
	f := ast.Unparen(call.Fun)
	if s, ok := f.(*ast.SelectorExpr); ok {
		f = s.Sel
	}
	id, ok := f.(*ast.Ident)
	if !ok {
		return nil
	}
	fn, _ := c.info.Uses[id].(*types.Func)
	return fn
}

// foreign reports whether o belongs to an available package.
func (c *checker) foreign(o types.Object) bool {
	return o.Pkg() != nil && o.Pkg() != c.pkg && available.Name(o.Pkg().Path()) != ""
}
