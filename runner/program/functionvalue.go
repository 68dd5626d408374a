package program

import (
	"go/ast"
	"go/types"
)

// In the interpreter a declared function is not a value like others: it is lost
// in results beside others, in fields and in elements. So it goes into a function
// literal that calls it:
//
//	func(x_1 complex128) float64 { return f(x_1) }
//
// And variadic functions are known for that by some of the places they are kept
// in, so that several last arguments become a slice: m.f(a, []T{b, c}...).

// functionValue reports whether the expression, which is not called, is a
// declared function that has to go into a function literal: a compiled one that
// takes signed parameters, or one of the recipe that is not an argument, since
// the interpreter cannot keep it in a place of its own.
func (c *checker) functionValue(e ast.Expr, parent ast.Node) bool {
	sig, ok := c.under(e).(*types.Signature)
	if !ok {
		return false
	}
	if s, ok := e.(*ast.SelectorExpr); ok && c.info.Selections[s] != nil {
		return false // a method
	}
	if c.direct(e) {
		return takesSigned(sig)
	}
	id, ok := e.(*ast.Ident)
	if !ok {
		return false
	}
	if _, ok := c.info.Uses[id].(*types.Func); !ok {
		return false
	}
	call, ok := parent.(*ast.CallExpr)
	return !ok || c.info.Types[call.Fun].IsType() || c.builtin(call) != ""
}

// adapter is a function literal that calls a declared function.
func (n *normaliser) adapter(fn ast.Expr) ast.Expr {
	pos := fn.Pos()
	sig := n.under(fn).(*types.Signature)
	typ := n.typeExpr(sig, pos).(*ast.FuncType)
	inner := &ast.CallExpr{Fun: fn, Lparen: pos, Rparen: pos}
	n.forward(typ, sig, inner, n.direct(fn))
	lit := &ast.FuncLit{Type: typ, Body: &ast.BlockStmt{Lbrace: pos, List: []ast.Stmt{returning(sig, inner)}, Rbrace: pos}}
	n.info.Types[lit] = types.TypeAndValue{Type: sig}
	return lit
}

// forward names the parameters of typ, which was made of sig, and gives them to
// the call; as they are, or taken out of what carries them.
func (n *normaliser) forward(typ *ast.FuncType, sig *types.Signature, inner *ast.CallExpr, direct bool) {
	pos := inner.Pos()
	for i, p := range typ.Params.List {
		name := n.temporary("argument")
		p.Names = []*ast.Ident{ident(name, pos)}
		var arg ast.Expr = ident(name, pos)
		if direct && i < fixed(sig) {
			arg = n.unsign(arg, sig.Params().At(i).Type())
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

// unpacked reports whether a call gives a function value several last arguments
// one by one. The interpreter does not know all such functions for variadic.
func (c *checker) unpacked(call *ast.CallExpr) bool {
	sig, ok := c.under(call.Fun).(*types.Signature)
	if !ok || !sig.Variadic() || call.Ellipsis.IsValid() || len(call.Args) <= sig.Params().Len() {
		return false
	}
	_, literal := ast.Unparen(call.Fun).(*ast.FuncLit)
	return !literal && c.builtin(call) == "" && c.callee(call) == nil
}

// pack puts several last arguments of a call into a slice.
func (n *normaliser) pack(call *ast.CallExpr) {
	if !n.unpacked(call) {
		return
	}
	sig := n.under(call.Fun).(*types.Signature)
	list := sig.Params().At(fixed(sig)).Type()
	rest := call.Args[fixed(sig):]
	lit := &ast.CompositeLit{Type: n.typeExpr(list, rest[0].Pos()), Lbrace: rest[0].Pos(), Elts: append([]ast.Expr(nil), rest...), Rbrace: call.Rparen}
	n.info.Types[lit] = types.TypeAndValue{Type: list}
	call.Args = append(call.Args[:fixed(sig):fixed(sig)], lit)
	call.Ellipsis = call.Rparen
}
