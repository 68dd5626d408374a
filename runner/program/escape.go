package program

import (
	"go/ast"
	"go/token"
	"go/types"
)

// An escape analysis finds out which function literals outlive the statement
// that makes them. In the interpreter all iterations of a loop share the
// variables declared in its body, so a function that is kept and uses one of
// them must be given a copy.
type escape struct {
	c      *checker
	decl   map[types.Object]*ast.FuncDecl
	uses   map[types.Object][][]ast.Node // paths to the uses of a variable that holds a function
	known  map[types.Object]bool
	writes map[types.Object][]write // changes of a variable after its declaration
}

// A write is a place where a variable, or a part of it, is or could be
// changed. fn is the function literal it stands in, nil when it is in the body
// of a declared function.
type write struct {
	pos token.Pos
	fn  *ast.FuncLit
}

func newEscape(c *checker) *escape {
	e := &escape{
		c: c, decl: map[types.Object]*ast.FuncDecl{}, uses: map[types.Object][][]ast.Node{},
		known: map[types.Object]bool{}, writes: map[types.Object][]write{},
	}
	walk(c.tree, func(n ast.Node, above []ast.Node) {
		switch n := n.(type) {
		case *ast.FuncDecl:
			e.decl[c.info.Defs[n.Name]] = n
		case *ast.RangeStmt:
			if n.Tok == token.ASSIGN {
				e.written(n.Key, above)
				e.written(n.Value, above)
			}
		case *ast.AssignStmt:
			for _, x := range n.Lhs {
				if id, ok := x.(*ast.Ident); ok && c.info.Defs[id] != nil {
					continue
				}
				e.written(x, above)
			}
		case *ast.IncDecStmt:
			e.written(n.X, above)
		case *ast.UnaryExpr:
			if n.Op == token.AND {
				e.written(n.X, above)
			}
		case *ast.SelectorExpr:
			if s := c.info.Selections[n]; s != nil && s.Kind() == types.MethodVal {
				if recv := s.Obj().Type().(*types.Signature).Recv(); recv != nil {
					if _, ok := recv.Type().Underlying().(*types.Pointer); ok {
						e.written(n.X, above)
					}
				}
			}
		case *ast.SliceExpr:
			if _, ok := c.under(n.X).(*types.Array); ok {
				e.written(n.X, above)
			}
		case *ast.Ident:
			if o, ok := c.info.Uses[n].(*types.Var); ok {
				if _, ok := o.Type().Underlying().(*types.Signature); ok {
					path := append(append([]ast.Node(nil), above...), n)
					e.uses[o] = append(e.uses[o], path)
				}
			}
		}
	})
	return e
}

func (e *escape) written(x ast.Expr, above []ast.Node) {
	if x == nil {
		return
	}
	id := e.c.storage(x)
	if id == nil {
		return
	}
	o := e.c.object(id)
	if o == nil {
		return
	}
	w := write{pos: x.Pos()}
	for i := len(above) - 1; i >= 0 && w.fn == nil; i-- {
		w.fn, _ = above[i].(*ast.FuncLit)
	}
	e.writes[o] = append(e.writes[o], w)
}

// storage is the variable that holds x: itself, or that of which x is a field
// or an array element. It is nil when x lies behind a pointer, slice or map.
func (c *checker) storage(x ast.Expr) *ast.Ident {
	for {
		switch y := ast.Unparen(x).(type) {
		case *ast.Ident:
			return y
		case *ast.SelectorExpr:
			if s := c.info.Selections[y]; s == nil || s.Indirect() {
				return nil
			}
			x = y.X
		case *ast.IndexExpr:
			if _, ok := c.under(y.X).(*types.Array); !ok {
				return nil
			}
			x = y.X
		default:
			return nil
		}
	}
}

// loopOf is the innermost loop around the end of path that o is declared in,
// nil when o is declared outside loops.
func loopOf(path []ast.Node, o types.Object) ast.Node {
	for i := len(path) - 1; i >= 0; i-- {
		switch n := path[i].(type) {
		case *ast.ForStmt, *ast.RangeStmt:
			if within(o.Pos(), n) {
				return n
			}
		case *ast.FuncLit, *ast.FuncDecl:
			if within(o.Pos(), n) {
				return nil
			}
		}
	}
	return nil
}

// captured lists the variables that lit uses and that a loop around it
// declares, in order of first use.
func (e *escape) captured(lit *ast.FuncLit, above []ast.Node) []*types.Var {
	var out []*types.Var
	seen := map[types.Object]bool{}
	ast.Inspect(lit.Body, func(n ast.Node) bool {
		id, ok := n.(*ast.Ident)
		if !ok {
			return true
		}
		o, ok := e.c.info.Uses[id].(*types.Var)
		if !ok || o.IsField() || seen[o] || within(o.Pos(), lit) || loopOf(above, o) == nil {
			return true
		}
		seen[o] = true
		out = append(out, o)
		return true
	})
	return out
}

// copyable reports whether a copy of o made where lit stands is as good as o
// itself: o is a variable of the loop's body, and nothing changes it once lit
// exists.
func (e *escape) copyable(o *types.Var, lit *ast.FuncLit, above []ast.Node) bool {
	switch loop := loopOf(above, o).(type) {
	case *ast.ForStmt:
		if !within(o.Pos(), loop.Body) {
			return false
		}
	case *ast.RangeStmt:
		if !within(o.Pos(), loop.Body) {
			return false
		}
	}
	for _, w := range e.writes[o] {
		if w.pos >= lit.Pos() || w.fn != nil && !within(o.Pos(), w.fn) {
			return false
		}
		for _, loop := range above {
			if loopBody(loop) != nil && loop.Pos() > o.Pos() && within(w.pos, loop) {
				return false
			}
		}
	}
	return true
}

// kept reports whether the function value at the end of path may be used after
// its statement: it is stored, returned, or passed to a function that may do so.
func (e *escape) kept(path []ast.Node) bool {
	n := path[len(path)-1]
	for i := len(path) - 2; i >= 0; i-- {
		switch p := path[i].(type) {
		case *ast.ParenExpr:
			n = p
			continue
		case *ast.CallExpr:
			return e.keptByCall(p, n)
		case *ast.AssignStmt:
			if p.Tok != token.DEFINE || len(p.Lhs) != len(p.Rhs) {
				return true
			}
			for k, r := range p.Rhs {
				if r == n {
					if o := e.c.info.Defs[p.Lhs[k].(*ast.Ident)]; o != nil {
						return e.keptVariable(o)
					}
				}
			}
			return true
		default:
			return true
		}
	}
	return true
}

func (e *escape) keptByCall(call *ast.CallExpr, n ast.Node) bool {
	if call.Fun == n {
		return false
	}
	fn := e.c.callee(call)
	if fn == nil {
		return true
	}
	sig := fn.Signature()
	if fn.Pkg() != e.c.pkg {
		// A compiled function does not keep its arguments, unless it returns
		// a function.
		for i := 0; i < sig.Results().Len(); i++ {
			if _, ok := sig.Results().At(i).Type().Underlying().(*types.Signature); ok {
				return true
			}
		}
		return false
	}
	for k, a := range call.Args {
		if a != n {
			continue
		}
		if e.decl[fn] == nil || sig.Variadic() && k >= sig.Params().Len()-1 {
			return true
		}
		return e.keptVariable(sig.Params().At(k))
	}
	return true
}

// keptVariable reports whether some use of the variable keeps its function.
func (e *escape) keptVariable(o types.Object) bool {
	if kept, ok := e.known[o]; ok {
		return kept
	}
	e.known[o] = false
	for _, path := range e.uses[o] {
		if e.kept(path) {
			e.known[o] = true
		}
	}
	return e.known[o]
}
