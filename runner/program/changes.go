package program

import (
	"go/ast"
	"go/token"
	"go/types"
)

// A place is what an expression reads or an assignment changes, as far as two of
// them can be told apart: a variable, a field (of any struct), or what pointers,
// slices and maps of a type lead to.
type place any // a *types.Var, or the text of a type

// changes finds out which places a call may change that its surroundings can
// see. It errs on the side of more.
type changes struct {
	c      *checker
	bodies map[*types.Func]*ast.FuncDecl
	values []ast.Expr            // literals and declared functions that are used as values
	known  map[ast.Node]*effect  // by function
	shared map[types.Object]bool // variables that a pointer or slice leads to
}

func newChanges(c *checker) *changes {
	s := &changes{c: c, bodies: map[*types.Func]*ast.FuncDecl{}, known: map[ast.Node]*effect{}, shared: map[types.Object]bool{}}
	share := func(e ast.Expr) {
		if id := c.storage(e); id != nil {
			s.shared[c.object(id)] = true
		}
	}
	walk(c.tree, func(n ast.Node, above []ast.Node) {
		switch n := n.(type) {
		case *ast.FuncDecl:
			if fn, ok := c.info.Defs[n.Name].(*types.Func); ok && n.Body != nil {
				s.bodies[fn] = n
			}
		case *ast.FuncLit:
			s.values = append(s.values, n)
		case *ast.Ident:
			if _, ok := c.info.Uses[n].(*types.Func); ok && !calledIn(n, above) {
				s.values = append(s.values, n)
			}
		case *ast.UnaryExpr:
			if n.Op == token.AND {
				share(n.X)
			}
		case *ast.SliceExpr:
			if _, ok := c.under(n.X).(*types.Array); ok {
				share(n.X)
			}
		case *ast.SelectorExpr:
			if x := c.info.Selections[n]; x != nil && x.Kind() == types.MethodVal && !isInterface(x.Recv()) && takesPointer(x.Obj().Type().(*types.Signature)) {
				share(n.X)
			}
		}
	})
	return s
}

// calledIn reports whether an identifier is, or ends, the function of the call
// right above it.
func calledIn(id *ast.Ident, above []ast.Node) bool {
	e := ast.Expr(id)
	for i := len(above) - 1; i >= 0; i-- {
		switch n := above[i].(type) {
		case *ast.SelectorExpr:
			if n.Sel != e {
				return false
			}
			e = n
		case *ast.ParenExpr:
			e = n
		case *ast.CallExpr:
			return n.Fun == e
		default:
			return false
		}
	}
	return false
}

// An effect is what a function does by itself, and the functions that it may
// call, each a *ast.FuncDecl or a *ast.FuncLit.
type effect struct {
	places []place
	calls  []ast.Node
}

// call gives the places that a call may change, apart from what its arguments
// do.
func (s *changes) call(call *ast.CallExpr) map[place]bool {
	var first effect
	s.addCall(call, &first)
	out := map[place]bool{}
	seen := map[ast.Node]bool{}
	var follow func(e *effect)
	follow = func(e *effect) {
		for _, p := range e.places {
			out[p] = true
		}
		for _, fn := range e.calls {
			if !seen[fn] {
				seen[fn] = true
				follow(s.function(fn))
			}
		}
	}
	follow(&first)
	return out
}

func (s *changes) addCall(call *ast.CallExpr, to *effect) {
	if s.c.info.Types[call.Fun].IsType() {
		return
	}
	element := func() { // of the first argument
		switch t := s.c.under(call.Args[0]).(type) {
		case *types.Slice:
			to.places = append(to.places, typeKey(t.Elem()))
		case *types.Map:
			to.places = append(to.places, typeKey(t.Elem()))
		}
	}
	if name := s.c.builtin(call); name != "" {
		if name == "copy" || name == "delete" {
			element()
		}
		return
	}
	fn := s.c.callee(call)
	switch {
	case fn == nil:
		if lit, ok := ast.Unparen(call.Fun).(*ast.FuncLit); ok {
			to.calls = append(to.calls, lit)
			return
		}
		s.addValues(s.c.under(call.Fun), to)
	case fn.Pkg() != s.c.pkg:
		if fn.Pkg() != nil && fn.Pkg().Path() == "sort" && len(call.Args) > 0 {
			element()
		}
		for _, a := range call.Args { // that it may call
			s.addValues(s.c.under(a), to)
		}
	case s.bodies[fn] != nil:
		to.calls = append(to.calls, s.bodies[fn])
	default: // of an interface
		for m, body := range s.bodies {
			if m.Name() == fn.Name() && m.Signature().Recv() != nil {
				to.calls = append(to.calls, body)
			}
		}
	}
}

// addValues adds the functions of type t that are used as values.
func (s *changes) addValues(t types.Type, to *effect) {
	if _, ok := t.(*types.Signature); !ok {
		return
	}
	for _, v := range s.values {
		if !types.Identical(s.c.under(v), t) {
			continue
		}
		switch v := v.(type) {
		case *ast.FuncLit:
			to.calls = append(to.calls, v)
		case *ast.Ident:
			if body := s.bodies[s.c.info.Uses[v].(*types.Func)]; body != nil {
				to.calls = append(to.calls, body)
			}
		}
	}
}

// function is the effect of a function outside itself.
func (s *changes) function(fn ast.Node) *effect {
	if known := s.known[fn]; known != nil {
		return known
	}
	out := &effect{}
	s.known[fn] = out
	changed := func(e ast.Expr) {
		p, root := s.changed(e)
		own := root != nil && within(root.Pos(), fn)
		if p != nil && !(own && (s.c.storage(e) != nil || s.ownMemory(fn, root))) {
			out.places = append(out.places, p)
		}
	}
	ast.Inspect(fn, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.FuncLit:
			return n == fn // it counts where it is called
		case *ast.AssignStmt:
			if n.Tok != token.DEFINE {
				for _, e := range n.Lhs {
					changed(e)
				}
			}
		case *ast.IncDecStmt:
			changed(n.X)
		case *ast.RangeStmt:
			if n.Tok == token.ASSIGN {
				changed(n.Key)
				if n.Value != nil {
					changed(n.Value)
				}
			}
		case *ast.CallExpr:
			s.addCall(n, out)
		}
		return true
	})
	return out
}

// changed is the place that an assignment to e changes, and the variable that e
// begins with.
func (s *changes) changed(e ast.Expr) (p place, root types.Object) {
	for {
		switch x := ast.Unparen(e).(type) {
		case *ast.Ident:
			o := s.c.object(x)
			if p == nil && o != nil && x.Name != "_" {
				p = o
			}
			return p, o
		case *ast.SelectorExpr:
			if f, ok := s.c.info.Uses[x.Sel].(*types.Var); ok && p == nil {
				p = f
			}
			e = x.X
		case *ast.IndexExpr:
			if p == nil {
				p = typeKey(s.c.info.TypeOf(x))
			}
			e = x.X
		case *ast.StarExpr:
			if p == nil {
				p = typeKey(s.c.info.TypeOf(x))
			}
			e = x.X
		default:
			return p, nil
		}
	}
}

func typeKey(t types.Type) string { return types.TypeString(t, nil) }

// ownMemory reports whether all that a variable of function fn leads to was made
// there: it gets nothing but new slices, maps and structs.
func (s *changes) ownMemory(fn ast.Node, v types.Object) bool {
	own := true
	defined := false
	value := func(e ast.Expr) {
		defined = true
		switch x := ast.Unparen(e).(type) {
		case *ast.CompositeLit:
			return
		case *ast.UnaryExpr:
			if _, ok := x.X.(*ast.CompositeLit); ok && x.Op == token.AND {
				return
			}
		case *ast.CallExpr:
			switch s.c.builtin(x) {
			case "make", "new":
				return
			case "append":
				to := ast.Unparen(x.Args[0])
				if id, ok := to.(*ast.Ident); ok && s.c.object(id) == v {
					return
				}
				if conv, ok := to.(*ast.CallExpr); ok && len(conv.Args) == 1 && s.c.info.Types[conv.Args[0]].IsNil() {
					return
				}
				if _, ok := to.(*ast.CompositeLit); ok {
					return
				}
			}
		}
		own = false
	}
	ast.Inspect(fn, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.AssignStmt:
			for i, e := range n.Lhs {
				if id, ok := e.(*ast.Ident); ok && s.c.object(id) == v {
					if len(n.Lhs) != len(n.Rhs) {
						own = false
					} else {
						value(n.Rhs[i])
					}
				}
			}
		case *ast.ValueSpec:
			for i, id := range n.Names {
				if s.c.object(id) == v {
					if defined = true; n.Values != nil && len(n.Values) == len(n.Names) {
						value(n.Values[i])
					} else if n.Values != nil {
						own = false
					}
				}
			}
		}
		return own
	})
	return own && defined
}
