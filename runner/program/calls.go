package program

import (
	"go/ast"
	"go/token"
	"go/types"

	"golang.org/x/tools/go/ast/astutil"
)

// replaceCalls rewrites fmt.Fprintf(&b, …) with a strings.Builder b to
// b.WriteString(fmt.Sprintf(…)), and the signed count of a shift to a call that
// checks it: the interpreter takes a negative one for a large one.
func (n *normaliser) replaceCalls() {
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		switch m := cur.Node().(type) {
		case *ast.CallExpr:
			if fn := n.callee(m); fn != nil && n.writesTextTo(fn, m) {
				cur.Replace(n.written(m))
			}
		case *ast.BinaryExpr:
			if m.Op == token.SHL || m.Op == token.SHR {
				m.Y = n.count(m.Y)
			}
		case *ast.AssignStmt:
			if m.Tok == token.SHL_ASSIGN || m.Tok == token.SHR_ASSIGN {
				m.Rhs[0] = n.count(m.Rhs[0])
			}
		}
		return true
	})
}

// written is the call of a method of a strings.Builder that a call of fmt.Fprint,
// fmt.Fprintf or fmt.Fprintln stands for.
func (n *normaliser) written(call *ast.CallExpr) ast.Expr {
	pos := call.Pos()
	to := call.Args[0]
	if u, ok := to.(*ast.UnaryExpr); ok && u.Op == token.AND {
		to = u.X
	}
	sel := call.Fun.(*ast.SelectorExpr)
	text := &ast.CallExpr{
		Fun:    &ast.SelectorExpr{X: sel.X, Sel: ident("S"+sel.Sel.Name[1:], sel.Sel.Pos())},
		Lparen: call.Lparen, Args: call.Args[1:], Ellipsis: call.Ellipsis, Rparen: call.Rparen,
	}
	return &ast.CallExpr{Fun: &ast.SelectorExpr{X: to, Sel: ident("WriteString", pos)}, Lparen: pos, Args: []ast.Expr{text}, Rparen: call.Rparen}
}

// count is the count of a shift, checked when it is signed and not constant.
func (n *normaliser) count(e ast.Expr) ast.Expr {
	b, ok := n.under(e).(*types.Basic)
	if !ok || b.Info()&types.IsInteger == 0 || b.Info()&types.IsUnsigned != 0 || n.info.Types[e].Value != nil {
		return e
	}
	if n.shift == "" {
		n.shift = n.temporary("count")
	}
	return call(e.Pos(), n.shift, call(e.Pos(), "int", e))
}

// addShift declares the function that checks counts of shifts.
func (n *normaliser) addShift() {
	if n.shift == "" {
		return
	}
	pos := n.tree.Name.End()
	arg := func() *ast.Ident { return ident("n", pos) }
	block := func(list ...ast.Stmt) *ast.BlockStmt { return &ast.BlockStmt{Lbrace: pos, List: list, Rbrace: pos} }
	n.tree.Decls = append(n.tree.Decls, &ast.FuncDecl{
		Name: ident(n.shift, pos),
		Type: &ast.FuncType{
			Func:    pos,
			Params:  &ast.FieldList{Opening: pos, List: []*ast.Field{{Names: []*ast.Ident{arg()}, Type: ident("int", pos)}}, Closing: pos},
			Results: &ast.FieldList{List: []*ast.Field{{Type: ident("uint", pos)}}},
		},
		Body: block(
			&ast.IfStmt{
				If:   pos,
				Cond: &ast.BinaryExpr{X: arg(), OpPos: pos, Op: token.LSS, Y: number(pos, token.INT, "0")},
				Body: block(&ast.ExprStmt{X: call(pos, "panic", &ast.BasicLit{ValuePos: pos, Kind: token.STRING, Value: `"negative shift amount"`})}),
			},
			&ast.ReturnStmt{Return: pos, Results: []ast.Expr{call(pos, "uint", arg())}},
		),
	})
}
