package program

import (
	"go/ast"
	"go/token"
	"go/types"

	"golang.org/x/tools/go/ast/astutil"
)

// The interpreter does not hand on an argument that is zero, but leaves the
// parameter at zero, and takes -0 for zero. So functions of the recipe get their
// floating-point numbers as complex ones, whose imaginary part is 1; and complex
// numbers, structs and arrays, which may have such numbers in them, as slices of
// one element:
//
//	func f(x_1 complex128, p_2 []P) float64 { x := real(x_1); p := p_2[0]; … }
//	f(complex(y, 1.0), []P{q})
//
// Steps are called by compiled code. One that the recipe calls too becomes a
// function of its own, and a step that calls it. A compiled function that is used
// as a value goes into a function literal; so does a declared function of the
// recipe that is kept, which the interpreter loses in places of some kinds. No
// compiled function takes or gives functions with such parameters, see the test.
// Receivers, results and elements of variadic parameters keep their signs.

// A carrier is how a parameter is handed on.
type carrier int

const (
	asItIs carrier = iota
	asComplex
	inSlice
)

// carried is how parameters of type t are handed on.
func carried(t types.Type) carrier {
	switch u := t.Underlying().(type) {
	case *types.Basic:
		switch {
		case u.Info()&types.IsFloat != 0:
			return asComplex
		case u.Info()&types.IsComplex != 0:
			return inSlice
		}
	case *types.Array:
		if carried(u.Elem()) != asItIs {
			return inSlice
		}
	case *types.Struct:
		for i := 0; i < u.NumFields(); i++ {
			if carried(u.Field(i).Type()) != asItIs {
				return inSlice
			}
		}
	}
	return asItIs
}

// fixed is the number of parameters that take one argument each.
func fixed(sig *types.Signature) int {
	if sig.Variadic() {
		return sig.Params().Len() - 1
	}
	return sig.Params().Len()
}

// takesSigned reports whether a parameter of the function is not handed on as
// it is. The last of a variadic one is a slice.
func takesSigned(sig *types.Signature) bool {
	for i := 0; i < fixed(sig); i++ {
		if carried(sig.Params().At(i).Type()) != asItIs {
			return true
		}
	}
	return false
}

// direct reports whether an expression names a compiled function, which gets its
// arguments as they are.
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
	return ok && fn.Pkg() != c.pkg
}

// isStep reports whether an expression names a step.
func (c *checker) isStep(e ast.Expr) bool {
	id, ok := e.(*ast.Ident)
	if !ok {
		return false
	}
	fn, ok := c.info.Uses[id].(*types.Func)
	return ok && fn.Pkg() == c.pkg && fn.Signature().Recv() == nil && fn.Exported()
}

// signedCall is the type of the function that a call calls, when its arguments
// are not handed on as they are, nil otherwise.
func (c *checker) signedCall(call *ast.CallExpr) *types.Signature {
	if c.info.Types[call.Fun].IsType() || c.builtin(call) != "" || c.direct(call.Fun) {
		return nil
	}
	if sig, ok := c.under(call.Fun).(*types.Signature); ok && takesSigned(sig) {
		return sig
	}
	return nil
}

// handsOn reports whether a call gets all its arguments from another call.
func (c *checker) handsOn(call *ast.CallExpr) bool {
	if len(call.Args) != 1 {
		return false
	}
	_, ok := c.info.TypeOf(call.Args[0]).(*types.Tuple)
	return ok
}

// signable refuses calls and functions as values that signs cannot rewrite.
func (l *linter) signable(e ast.Expr, parent ast.Node) {
	if call, ok := e.(*ast.CallExpr); ok {
		sig := l.signedCall(call)
		switch {
		case sig == nil:
		case l.handsOn(call):
			if !l.writable(sig, call.Pos()) {
				l.refuse(call, "assign the results to variables first", "a call of this type cannot hand on the results of another")
			}
		default:
			for i := 0; i < fixed(sig) && i < len(call.Args); i++ {
				if t := sig.Params().At(i).Type(); carried(t) == inSlice && !l.writable(t, call.Pos()) {
					l.refuse(call.Args[i], "give type "+l.typeName(t)+" a name that nothing hides", "a value of type %s cannot be handed on here", l.typeName(t))
				}
			}
		}
		return
	}
	switch sig, ok := l.under(e).(*types.Signature); {
	case !ok:
	case l.isStep(e) && takesSigned(sig) && !l.writable(sig, l.tree.Name.End()):
		l.refuse(e, "put what both need into a function of its own", "step %s has a parameter or a result of a type without a name, and is used by the recipe itself", exprText(e))
	case l.called[e]:
	case l.functionValue(e, parent) && !l.writable(sig, e.Pos()):
		l.refuse(e, "write func(…) { return "+exprText(e)+"(…) }", "function %s is not available as a value", exprText(e))
	}
}

// signs hands signed arguments on with their signs.
func (n *normaliser) signs() {
	called := map[ast.Expr]bool{}
	named := map[*ast.Ident]bool{} // parts of selectors
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
	steps := map[*ast.FuncType]bool{} // that only compiled code calls
	var outer []ast.Decl
	for _, f := range n.steps {
		if o := n.info.Defs[f.Name]; used[o] && takesSigned(o.Type().(*types.Signature)) {
			outer = append(outer, n.outerStep(f, o))
		} else {
			steps[f.Type] = true
		}
	}
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		switch m := cur.Node().(type) {
		case *ast.CallExpr:
			n.pack(m)
			switch sig := n.signedCall(m); {
			case sig == nil:
			case n.handsOn(m):
				cur.Replace(n.spread(m, sig))
			default:
				for i := 0; i < fixed(sig); i++ {
					m.Args[i] = n.sign(m.Args[i], sig.Params().At(i).Type())
				}
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
			if !called[m] && n.functionValue(m, cur.Parent()) {
				cur.Replace(n.adapter(m))
			}
		case *ast.Ident:
			if !called[m] && !named[m] && n.functionValue(m, cur.Parent()) {
				cur.Replace(n.adapter(m))
			}
		}
		return true
	})
	n.tree.Decls = append(n.tree.Decls, outer...)
}

// outerStep gives step f another name, and makes a step of its name that calls
// it.
func (n *normaliser) outerStep(f *ast.FuncDecl, o types.Object) ast.Decl {
	name := n.temporary(f.Name.Name)
	pos := n.tree.Name.End()
	sig := o.Type().(*types.Signature)
	typ := &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}, Results: n.resultTypes(sig, pos)}
	inner := &ast.CallExpr{Fun: ident(name, pos), Lparen: pos, Rparen: pos}
	for i := 0; i < sig.Params().Len(); i++ {
		t := sig.Params().At(i).Type()
		arg := n.temporary("argument")
		typ.Params.List = append(typ.Params.List, &ast.Field{Names: []*ast.Ident{ident(arg, pos)}, Type: n.typeExpr(t, pos)})
		inner.Args = append(inner.Args, n.sign(ident(arg, pos), t))
	}
	out := &ast.FuncDecl{Name: ident(f.Name.Name, pos), Type: typ, Body: &ast.BlockStmt{Lbrace: pos, List: []ast.Stmt{returning(sig, inner)}, Rbrace: pos}}
	n.info.Defs[out.Name] = o
	f.Name.Name = name
	ast.Inspect(n.tree, func(m ast.Node) bool {
		if id, ok := m.(*ast.Ident); ok && n.info.Uses[id] == o {
			id.Name = name
		}
		return true
	})
	return out
}

// sign makes of an argument what carries it to a parameter of type t.
func (n *normaliser) sign(e ast.Expr, t types.Type) ast.Expr {
	pos := e.Pos()
	switch carried(t) {
	case asComplex:
		if !isFloat64(t) {
			e = call(pos, "float64", e)
		}
		return call(pos, "complex", e, number(pos, token.FLOAT, "1.0"))
	case inSlice:
		lit := &ast.CompositeLit{Type: n.carrierType(t, pos), Lbrace: pos, Elts: []ast.Expr{e}, Rbrace: pos}
		n.info.Types[lit] = types.TypeAndValue{Type: types.NewSlice(t)}
		return lit
	}
	return e
}

// unsign makes a value of type t of what carries it.
func (n *normaliser) unsign(e ast.Expr, t types.Type) ast.Expr {
	pos := e.Pos()
	switch carried(t) {
	case asComplex:
		e = call(pos, "real", e)
		if !isFloat64(t) {
			e = &ast.CallExpr{Fun: n.typeExpr(t, pos), Lparen: pos, Args: []ast.Expr{e}, Rparen: pos}
		}
	case inSlice:
		e = &ast.IndexExpr{X: e, Lbrack: pos, Index: number(pos, token.INT, "0"), Rbrack: pos}
		n.info.Types[e] = types.TypeAndValue{Type: t}
	}
	return e
}

// carrierType is the type of what carries a parameter of type t.
func (n *normaliser) carrierType(t types.Type, pos token.Pos) ast.Expr {
	switch carried(t) {
	case asComplex:
		return ident("complex128", pos)
	case inSlice:
		return &ast.ArrayType{Lbrack: pos, Elt: n.typeExpr(t, pos)}
	}
	return n.typeExpr(t, pos)
}

func isFloat64(t types.Type) bool {
	b, ok := types.Unalias(t).(*types.Basic)
	return ok && b.Kind() == types.Float64
}

func call(pos token.Pos, name string, args ...ast.Expr) *ast.CallExpr {
	return &ast.CallExpr{Fun: ident(name, pos), Lparen: pos, Args: args, Rparen: pos}
}

// signParameters makes the signed parameters of a function what carries them. It
// gives the statements that take them out again, of those that are used.
func (n *normaliser) signParameters(t *ast.FuncType, used map[types.Object]bool) []ast.Stmt {
	var out []ast.Stmt
	for _, f := range t.Params.List {
		if _, variadic := f.Type.(*ast.Ellipsis); variadic {
			continue
		}
		pos := f.Type.Pos()
		typ := n.info.TypeOf(f.Type)
		switch carried(typ) {
		case asItIs:
			continue
		case asComplex:
			f.Type = ident("complex128", pos)
		case inSlice:
			f.Type = &ast.ArrayType{Lbrack: pos, Elt: f.Type}
		}
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

// spread is f(g()), where g has several results, with each in a variable.
func (n *normaliser) spread(m *ast.CallExpr, sig *types.Signature) ast.Expr {
	pos := m.Pos()
	tuple := n.info.TypeOf(m.Args[0]).(*types.Tuple)
	get := &ast.AssignStmt{TokPos: pos, Tok: token.DEFINE, Rhs: []ast.Expr{m.Args[0]}}
	inner := &ast.CallExpr{Fun: m.Fun, Lparen: pos, Rparen: pos}
	for i := 0; i < tuple.Len(); i++ {
		name := n.temporary("value")
		get.Lhs = append(get.Lhs, ident(name, pos))
		var arg ast.Expr = ident(name, pos)
		if i < fixed(sig) {
			arg = n.sign(arg, sig.Params().At(i).Type())
		}
		inner.Args = append(inner.Args, arg)
	}
	typ := &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}, Results: n.resultTypes(sig, pos)}
	lit := &ast.FuncLit{Type: typ, Body: &ast.BlockStmt{Lbrace: pos, List: []ast.Stmt{get, returning(sig, inner)}, Rbrace: pos}}
	n.info.Types[lit] = types.TypeAndValue{Type: types.NewSignatureType(nil, nil, nil, nil, sig.Results(), false)}
	out := &ast.CallExpr{Fun: lit, Lparen: pos, Rparen: pos}
	n.info.Types[inner], n.info.Types[out] = n.info.Types[m], n.info.Types[m]
	return out
}

// resultTypes are the results of a function, nil when there are none.
func (n *normaliser) resultTypes(sig *types.Signature, pos token.Pos) *ast.FieldList {
	if sig.Results().Len() == 0 {
		return nil
	}
	out := &ast.FieldList{Opening: pos, Closing: pos}
	for i := 0; i < sig.Results().Len(); i++ {
		out.List = append(out.List, &ast.Field{Type: n.typeExpr(sig.Results().At(i).Type(), pos)})
	}
	return out
}
