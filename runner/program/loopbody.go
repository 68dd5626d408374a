package program

import (
	"go/ast"
	"go/token"
	"go/types"

	"golang.org/x/tools/go/ast/astutil"
)

// In the interpreter all iterations of a loop share the variables that its body
// declares. Where one of them is kept beyond its iteration, by a pointer or by a
// function that changes it, the body becomes a function literal that each
// iteration calls, and whose variables are new every time:
//
//	for i := 0; i < n; i++ {
//		stop_1 := func() bool { …; return false }()
//		if stop_1 { break }
//	}

// fresh arranges that o, a variable declared in a loop above, is another one in
// each iteration. It reports whether that can be done.
func (l *linter) fresh(o types.Object, above []ast.Node) bool {
	loop := loopOf(above, o)
	body, label := loopBody(loop), ""
	if body == nil || !within(o.Pos(), body) {
		return false
	}
	if _, known := l.calls[loop]; known {
		return true
	}
	for i, n := range above {
		if s, ok := n.(*ast.LabeledStmt); ok && i+1 < len(above) && above[i+1] == loop {
			label = s.Label.Name
		}
	}
	if ok, _ := exits(body, label); !ok {
		return false
	}
	if l.calls == nil {
		l.checker.calls = map[ast.Node]string{}
	}
	l.checker.calls[loop] = label
	return true
}

// loopBody is the body of a loop, nil when n is none.
func loopBody(n ast.Node) *ast.BlockStmt {
	switch n := n.(type) {
	case *ast.ForStmt:
		return n.Body
	case *ast.RangeStmt:
		return n.Body
	}
	return nil
}

// A jump is a break or continue that ends an iteration.
type jump struct {
	stmt *ast.BranchStmt
	stop bool // no further iteration
}

// exits lists how an iteration of the loop with this body and label can end
// before its end. It is not ok when the iteration can leave more than the loop.
func exits(body *ast.BlockStmt, label string) (ok bool, jumps []jump) {
	ok = true
	walk(body, func(n ast.Node, above []ast.Node) {
		loops, others := false, false // around n, within the body
		for _, a := range above {
			switch a.(type) {
			case *ast.FuncLit:
				return
			case *ast.ForStmt, *ast.RangeStmt:
				loops = true
			case *ast.SwitchStmt, *ast.TypeSwitchStmt:
				others = true
			}
		}
		switch n := n.(type) {
		case *ast.ReturnStmt:
			ok = false
		case *ast.BranchStmt:
			switch {
			case n.Tok == token.GOTO:
				ok = false
			case n.Tok == token.FALLTHROUGH:
			case n.Label != nil:
				if n.Label.Name == label {
					jumps = append(jumps, jump{n, n.Tok == token.BREAK})
				} else if !labels(body, n.Label.Name) {
					ok = false
				}
			case loops:
			case n.Tok == token.CONTINUE:
				jumps = append(jumps, jump{n, false})
			case !others:
				jumps = append(jumps, jump{n, true})
			}
		}
	})
	return ok, jumps
}

// labels reports whether body has the label.
func labels(body *ast.BlockStmt, label string) bool {
	found := false
	ast.Inspect(body, func(n ast.Node) bool {
		if s, ok := n.(*ast.LabeledStmt); ok && s.Label.Name == label {
			found = true
		}
		return !found
	})
	return found
}

// loopBodies makes calls of the bodies of the loops that need it, inner ones
// first.
func (n *normaliser) loopBodies() {
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		if label, ok := n.calls[cur.Node()]; ok {
			n.callBody(loopBody(cur.Node()), label)
		}
		return true
	})
}

// callBody makes the body of a loop with this label a call.
func (n *normaliser) callBody(body *ast.BlockStmt, label string) {
	pos := body.Lbrace
	_, jumps := exits(body, label)
	stops := false
	for _, j := range jumps {
		stops = stops || j.stop
	}
	result := func(stop bool) *ast.ReturnStmt {
		r := &ast.ReturnStmt{Return: pos}
		if stops {
			name := "false"
			if stop {
				name = "true"
			}
			r.Results = []ast.Expr{ident(name, pos)}
		}
		return r
	}
	ends := map[ast.Node]*ast.ReturnStmt{}
	for _, j := range jumps {
		ends[j.stmt] = result(j.stop)
	}
	astutil.Apply(body, nil, func(cur *astutil.Cursor) bool {
		if r := ends[cur.Node()]; r != nil {
			r.Return = cur.Node().Pos()
			cur.Replace(r)
		}
		return true
	})
	lit := &ast.FuncLit{
		Type: &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}},
		Body: &ast.BlockStmt{Lbrace: pos, List: body.List, Rbrace: body.Rbrace},
	}
	call := &ast.CallExpr{Fun: lit, Lparen: pos, Rparen: pos}
	if !stops {
		body.List = []ast.Stmt{&ast.ExprStmt{X: call}}
		return
	}
	lit.Type.Results = &ast.FieldList{List: []*ast.Field{{Type: ident("bool", pos)}}}
	lit.Body.List = append(lit.Body.List, result(false))
	stop := n.temporary("stop")
	body.List = []ast.Stmt{
		define(pos, stop, call),
		&ast.IfStmt{If: pos, Cond: ident(stop, pos), Body: &ast.BlockStmt{Lbrace: pos, Rbrace: pos, List: []ast.Stmt{
			&ast.BranchStmt{TokPos: pos, Tok: token.BREAK},
		}}},
	}
}
