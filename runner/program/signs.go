package program

import (
	"go/ast"
	"go/token"
	"go/types"

	"golang.org/x/tools/go/ast/astutil"
)

// The interpreter does not hand on an argument that is zero, but leaves the
// parameter at zero, and takes -0 for zero. So functions of the recipe get their
// floating-point numbers as complex ones, whose imaginary part is 1:
//
//	func f(x_1 complex128) float64 { x := real(x_1); … }
//	f(complex(y, 1.0))
//
// All functions of the recipe do so but its steps, which compiled code calls; a
// compiled function or a step that is used as a value goes into a function
// literal. No compiled function takes or gives functions of floating-point
// numbers, see the test.

// signed reports whether parameters of type t are handed on as complex numbers.
func signed(t types.Type) bool {
	b, ok := t.Underlying().(*types.Basic)
	return ok && b.Info()&types.IsFloat != 0
}

// takesSigned reports whether a parameter of the function is signed. The last
// of a variadic one is a slice.
func takesSigned(sig *types.Signature) bool {
	for i := 0; i < sig.Params().Len(); i++ {
		if signed(sig.Params().At(i).Type()) {
			return true
		}
	}
	return false
}

// direct reports whether the function that an expression names gets its
// arguments as they are: it is compiled, or a step.
func (c *checker) direct(e ast.Expr) bool {
	switch x := ast.Unparen(e).(type) {
	case *ast.SelectorExpr:
		e = x.Sel
	case *ast.Ident:
		e = x
	}
	id, ok := e.(*ast.Ident)
	if !ok {
		return false
	}
	fn, ok := c.info.Uses[id].(*types.Func)
	if !ok {
		return false
	}
	if fn.Pkg() != c.pkg {
		return true
	}
	return fn.Signature().Recv() == nil && fn.Exported()
}

// functionValue reports whether the expression, which is not called, is a
// direct function that takes signed parameters.
func (c *checker) functionValue(e ast.Expr) bool {
	if !c.direct(e) || c.info.Selections[selector(e)] != nil {
		return false
	}
	sig, ok := c.under(e).(*types.Signature)
	return ok && takesSigned(sig)
}

func selector(e ast.Expr) *ast.SelectorExpr {
	s, _ := e.(*ast.SelectorExpr)
	return s
}

// handsOnTuple reports whether a call of a function of the recipe gets all its
// arguments, signed ones among them, from another call.
func (c *checker) handsOnTuple(call *ast.CallExpr) bool {
	sig, ok := c.under(call.Fun).(*types.Signature)
	if !ok || len(call.Args) != 1 || c.direct(call.Fun) || c.builtin(call) != "" || !takesSigned(sig) {
		return false
	}
	_, ok = c.info.TypeOf(call.Args[0]).(*types.Tuple)
	return ok
}

// signs hands signed arguments on as complex numbers.
func (n *normaliser) signs() {
	called := map[ast.Expr]bool{}
	named := map[*ast.Ident]bool{} // parts of selectors
	steps := map[*ast.FuncType]bool{}
	used := map[types.Object]bool{}
	ast.Inspect(n.tree, func(m ast.Node) bool {
		switch m := m.(type) {
		case *ast.CallExpr:
			called[m.Fun] = true
		case *ast.SelectorExpr:
			named[m.Sel] = true
		case *ast.Ident:
			used[n.info.Uses[m]] = true
		}
		return true
	})
	for _, f := range n.steps {
		steps[f.Type] = true
	}
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		switch m := cur.Node().(type) {
		case *ast.CallExpr:
			if n.handsOnTuple(m) {
				cur.Replace(n.spread(m))
			} else {
				n.signArguments(m)
			}
		case *ast.FuncDecl:
			if !steps[m.Type] && m.Body != nil {
				m.Body.List = append(n.signParameters(m.Type, used), m.Body.List...)
			}
		case *ast.FuncLit:
			m.Body.List = append(n.signParameters(m.Type, used), m.Body.List...)
		case *ast.FuncType:
			switch cur.Parent().(type) {
			case *ast.FuncDecl, *ast.FuncLit:
			default:
				n.signParameters(m, nil)
			}
		case *ast.SelectorExpr:
			if !called[m] && n.functionValue(m) {
				cur.Replace(n.adapter(m))
			}
		case *ast.Ident:
			if !called[m] && !named[m] && n.functionValue(m) {
				cur.Replace(n.adapter(m))
			}
		}
		return true
	})
}

// sign makes a complex number of a signed argument.
func (n *normaliser) sign(e ast.Expr, t types.Type) ast.Expr {
	pos := e.Pos()
	if b, ok := types.Unalias(t).(*types.Basic); !ok || b.Kind() != types.Float64 {
		e = call(pos, "float64", e)
	}
	return call(pos, "complex", e, number(pos, token.FLOAT, "1.0"))
}

func call(pos token.Pos, name string, args ...ast.Expr) *ast.CallExpr {
	return &ast.CallExpr{Fun: ident(name, pos), Lparen: pos, Args: args, Rparen: pos}
}

func (n *normaliser) signArguments(m *ast.CallExpr) {
	if n.info.Types[m.Fun].IsType() || n.builtin(m) != "" || n.direct(m.Fun) {
		return
	}
	sig, ok := n.under(m.Fun).(*types.Signature)
	if !ok {
		return
	}
	fixed := sig.Params().Len()
	if sig.Variadic() {
		fixed--
	}
	for i := 0; i < fixed && i < len(m.Args); i++ {
		if t := sig.Params().At(i).Type(); signed(t) {
			m.Args[i] = n.sign(m.Args[i], t)
		}
	}
}

// signParameters makes the signed parameters of a function complex. It gives
// the statements that make them real again, of those that are used.
func (n *normaliser) signParameters(t *ast.FuncType, used map[types.Object]bool) []ast.Stmt {
	var out []ast.Stmt
	for _, f := range t.Params.List {
		if _, variadic := f.Type.(*ast.Ellipsis); variadic || !signed(n.info.TypeOf(f.Type)) {
			continue
		}
		pos := f.Type.Pos()
		typ := f.Type
		f.Type = ident("complex128", pos)
		for i, id := range f.Names {
			if !used[n.info.Defs[id]] {
				f.Names[i] = ident("_", id.Pos())
				continue
			}
			name := n.temporary(id.Name)
			f.Names[i] = ident(name, id.Pos())
			out = append(out, set(pos, id, token.DEFINE, n.unsign(ident(name, pos), typ)))
		}
	}
	return out
}

// unsign makes a number of the type of a complex one.
func (n *normaliser) unsign(e, typ ast.Expr) ast.Expr {
	pos := e.Pos()
	re := call(pos, "real", e)
	if b, ok := types.Unalias(n.info.TypeOf(typ)).(*types.Basic); ok && b.Kind() == types.Float64 {
		return re
	}
	return &ast.CallExpr{Fun: n.typeExpr(n.info.TypeOf(typ), pos), Lparen: pos, Args: []ast.Expr{re}, Rparen: pos}
}

// adapter is a function literal that calls a direct function.
func (n *normaliser) adapter(fn ast.Expr) ast.Expr {
	pos := fn.Pos()
	sig := n.under(fn).(*types.Signature)
	typ := n.typeExpr(sig, pos).(*ast.FuncType)
	inner := &ast.CallExpr{Fun: fn, Lparen: pos, Rparen: pos}
	n.forward(typ, sig, inner, true)
	lit := &ast.FuncLit{Type: typ, Body: &ast.BlockStmt{Lbrace: pos, List: []ast.Stmt{returning(sig, inner)}, Rbrace: pos}}
	n.info.Types[lit] = types.TypeAndValue{Type: sig}
	return lit
}

// forward names the parameters of typ, which was made of sig, and gives them to
// the call; as they are, or with signed ones made real again.
func (n *normaliser) forward(typ *ast.FuncType, sig *types.Signature, inner *ast.CallExpr, direct bool) {
	pos := inner.Pos()
	for i, p := range typ.Params.List {
		name := n.temporary("argument")
		p.Names = []*ast.Ident{ident(name, pos)}
		var arg ast.Expr = ident(name, pos)
		if t := sig.Params().At(i).Type(); direct && signed(t) {
			arg = call(pos, "real", arg)
			if b, ok := types.Unalias(t).(*types.Basic); !ok || b.Kind() != types.Float64 {
				arg = &ast.CallExpr{Fun: n.typeExpr(t, pos), Lparen: pos, Args: []ast.Expr{arg}, Rparen: pos}
			}
		}
		inner.Args = append(inner.Args, arg)
		if _, ok := p.Type.(*ast.Ellipsis); ok {
			inner.Ellipsis = pos
		}
	}
}

// returning is the statement that ends a function with the results of a call.
func returning(sig *types.Signature, inner *ast.CallExpr) ast.Stmt {
	if sig.Results().Len() == 0 {
		return &ast.ExprStmt{X: inner}
	}
	return &ast.ReturnStmt{Return: inner.Pos(), Results: []ast.Expr{inner}}
}

// spread is f(g()), where g has several results, with each in a variable.
func (n *normaliser) spread(m *ast.CallExpr) ast.Expr {
	pos := m.Pos()
	sig := n.under(m.Fun).(*types.Signature)
	tuple := n.info.TypeOf(m.Args[0]).(*types.Tuple)
	get := &ast.AssignStmt{TokPos: pos, Tok: token.DEFINE, Rhs: []ast.Expr{m.Args[0]}}
	inner := &ast.CallExpr{Fun: m.Fun, Lparen: pos, Rparen: pos}
	for i := 0; i < tuple.Len(); i++ {
		name := n.temporary("value")
		get.Lhs = append(get.Lhs, ident(name, pos))
		var arg ast.Expr = ident(name, pos)
		if variadic := sig.Variadic() && i >= sig.Params().Len()-1; !variadic && signed(sig.Params().At(i).Type()) {
			arg = n.sign(arg, tuple.At(i).Type())
		}
		inner.Args = append(inner.Args, arg)
	}
	typ := &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}}
	if sig.Results().Len() > 0 {
		typ.Results = n.resultTypes(sig, pos)
	}
	lit := &ast.FuncLit{Type: typ, Body: &ast.BlockStmt{Lbrace: pos, List: []ast.Stmt{get, returning(sig, inner)}, Rbrace: pos}}
	n.info.Types[lit] = types.TypeAndValue{Type: types.NewSignatureType(nil, nil, nil, nil, sig.Results(), false)}
	out := &ast.CallExpr{Fun: lit, Lparen: pos, Rparen: pos}
	n.info.Types[inner], n.info.Types[out] = n.info.Types[m], n.info.Types[m]
	return out
}

func (n *normaliser) resultTypes(sig *types.Signature, pos token.Pos) *ast.FieldList {
	out := &ast.FieldList{}
	for i := 0; i < sig.Results().Len(); i++ {
		out.List = append(out.List, &ast.Field{Type: n.typeExpr(sig.Results().At(i).Type(), pos)})
	}
	return out
}
