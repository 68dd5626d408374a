package program

import (
	"go/ast"
	"go/token"
	"go/types"
)

// Go does not say whether an operand is read before or after a call that stands
// to the right of it and changes it: x*2 + f(). Compiled programs mostly read it
// after the call, the interpreter mostly before. Such statements are refused.

// order looks at the operands of a statement, in the order of the text.
func (l *linter) order(n ast.Node) {
	var list []ast.Expr
	switch n := n.(type) {
	case *ast.AssignStmt:
		for _, e := range n.Lhs {
			if n.Tok == token.DEFINE {
				continue
			}
			if n.Tok != token.ASSIGN {
				list = append(list, e)
				continue
			}
			list = append(list, l.placeOperands(e)...)
		}
		list = append(list, n.Rhs...)
	case *ast.ReturnStmt:
		list = n.Results
	case *ast.ExprStmt:
		list = []ast.Expr{n.X}
	case *ast.IncDecStmt:
		list = []ast.Expr{n.X}
	case *ast.IfStmt:
		list = []ast.Expr{n.Cond}
	case *ast.ForStmt:
		list = []ast.Expr{n.Cond}
	case *ast.SwitchStmt:
		list = []ast.Expr{n.Tag}
	case *ast.RangeStmt:
		list = []ast.Expr{n.X}
	case *ast.ValueSpec:
		list = n.Values
	case *ast.CaseClause:
		for _, e := range n.List {
			l.operands([]ast.Expr{e})
		}
		return
	default:
		return
	}
	l.operands(list)
}

// placeOperands are the operands that find the place that e stands for.
func (l *linter) placeOperands(e ast.Expr) []ast.Expr {
	switch x := ast.Unparen(e).(type) {
	case *ast.IndexExpr:
		if _, ok := l.under(x.X).(*types.Array); ok {
			return append(l.placeOperands(x.X), x.Index)
		}
		return []ast.Expr{x.X, x.Index}
	case *ast.StarExpr:
		return []ast.Expr{x.X}
	case *ast.SelectorExpr:
		if s := l.info.Selections[x]; s != nil && s.Indirect() {
			return []ast.Expr{x.X}
		}
		return l.placeOperands(x.X)
	case *ast.Ident:
		return nil
	default:
		return []ast.Expr{x}
	}
}

// operands looks at expressions that are evaluated one after the other, and
// gives what is read in them outside of calls.
func (l *linter) operands(list []ast.Expr) []ast.Expr {
	var read []ast.Expr
	for _, e := range list {
		if e != nil {
			read = append(read, l.operand(e, read)...)
		}
	}
	return read
}

// operand looks at an expression after others were read.
func (l *linter) operand(e ast.Expr, before []ast.Expr) []ast.Expr {
	if l.info.Types[e].Value != nil {
		return nil
	}
	several := func(list ...ast.Expr) []ast.Expr {
		var read []ast.Expr
		for _, e := range list {
			if e != nil {
				read = append(read, l.operand(e, append(before[:len(before):len(before)], read...))...)
			}
		}
		return read
	}
	switch x := e.(type) {
	case *ast.ParenExpr:
		return several(x.X)
	case *ast.BinaryExpr:
		if x.Op == token.LAND || x.Op == token.LOR {
			// The left operand is done before the right one begins.
			return append(l.operand(x.X, before), l.operand(x.Y, before)...)
		}
		return several(x.X, x.Y)
	case *ast.CompositeLit:
		var list []ast.Expr
		for _, e := range x.Elts {
			if kv, ok := e.(*ast.KeyValueExpr); ok {
				if _, field := l.under(x).(*types.Struct); !field {
					list = append(list, kv.Key)
				}
				e = kv.Value
			}
			list = append(list, e)
		}
		return several(list...)
	case *ast.TypeAssertExpr:
		return several(x.X)
	case *ast.SliceExpr:
		return several(x.X, x.Low, x.High, x.Max)
	case *ast.UnaryExpr:
		if x.Op == token.AND {
			return several(l.placeOperands(x.X)...)
		}
		return several(x.X)
	case *ast.CallExpr:
		read := several(append([]ast.Expr{l.receiver(x)}, x.Args...)...)
		if l.info.Types[x.Fun].IsType() || l.builtin(x) != "" {
			return read
		}
		l.inOrder(x, before)
		return nil
	case *ast.SelectorExpr:
		if l.info.Selections[x] == nil {
			return nil // of a package
		}
		return append(several(l.placeOperands(x)...), ast.Expr(x))
	case *ast.IndexExpr, *ast.StarExpr:
		return append(several(l.placeOperands(e)...), e)
	case *ast.Ident:
		if _, ok := l.info.Uses[x].(*types.Var); ok {
			return []ast.Expr{x}
		}
	}
	return nil
}

// receiver is the operand that the function of a call is found with, or nil.
func (l *linter) receiver(call *ast.CallExpr) ast.Expr {
	switch f := ast.Unparen(call.Fun).(type) {
	case *ast.SelectorExpr:
		if l.info.Selections[f] != nil {
			return f.X
		}
	case *ast.CallExpr:
		return f
	}
	return nil
}

// places are what the value of an operand depends on, apart from the operands
// that find it.
func (l *linter) places(e ast.Expr) []place {
	var out, typed []place
	for x := e; ; {
		x = ast.Unparen(x)
		typed = append(typed, typeKey(l.info.TypeOf(x)))
		indirect := false
		switch y := x.(type) {
		case *ast.Ident:
			o := l.info.Uses[y]
			if out = append(out, o); !l.changes.shared[o] {
				typed = nil
			}
			return append(append(out, typed...), inside(l.info.TypeOf(e), nil)...)
		case *ast.SelectorExpr:
			out = append(out, l.info.Uses[y.Sel])
			s := l.info.Selections[y]
			indirect = s == nil || s.Indirect()
			x = y.X
		case *ast.IndexExpr:
			out = append(out, typeKey(l.info.TypeOf(y)))
			_, array := l.under(y.X).(*types.Array)
			indirect = !array
			x = y.X
		default:
			indirect = true
		}
		if indirect {
			return append(append(out, typed...), inside(l.info.TypeOf(e), nil)...)
		}
	}
}

// inside are the fields of a struct, and of those in it.
func inside(t types.Type, out []place) []place {
	switch u := t.Underlying().(type) {
	case *types.Struct:
		for i := 0; i < u.NumFields(); i++ {
			out = inside(u.Field(i).Type(), append(out, place(u.Field(i))))
		}
	case *types.Array:
		return inside(u.Elem(), append(out, place(typeKey(u.Elem()))))
	}
	return out
}

// inOrder refuses a call that changes what was read before it.
func (l *linter) inOrder(call *ast.CallExpr, before []ast.Expr) {
	if len(before) == 0 {
		return
	}
	changed := l.changes.call(call)
	if len(changed) == 0 {
		return
	}
	for _, e := range before {
		for _, p := range l.places(e) {
			if changed[p] {
				l.refuse(call, "call "+exprText(call.Fun)+" in a statement of its own", "Go does not say whether %s is read before or after the call of %s, which may change it", exprText(e), exprText(call.Fun))
				return
			}
		}
	}
}
