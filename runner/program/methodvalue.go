package program

import (
	"go/ast"
	"go/token"
	"go/types"
	"strconv"

	"golang.org/x/tools/go/ast/astutil"

	"rimlight/runner/program/available"
)

// methodValues makes function literals of method values, which in the
// interpreter see later changes of their receiver:
//
//	func() func(T) R { receiver_1 := x; return func(a_1 T) R { return receiver_1.M(a_1) } }()
func (n *normaliser) methodValues() {
	called := map[ast.Expr]bool{}
	ast.Inspect(n.tree, func(m ast.Node) bool {
		if call, ok := m.(*ast.CallExpr); ok {
			called[call.Fun] = true
		}
		return true
	})
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		sel, ok := cur.Node().(*ast.SelectorExpr)
		if !ok || called[sel] {
			return true
		}
		s := n.info.Selections[sel]
		if s == nil || s.Kind() != types.MethodVal {
			return true
		}
		pos := sel.Pos()
		sig := s.Obj().Type().(*types.Signature)
		var receiver ast.Expr = sel.X
		_, pointed := s.Recv().Underlying().(*types.Pointer)
		switch wants := takesPointer(sig); {
		case wants && !pointed:
			receiver = &ast.UnaryExpr{OpPos: pos, Op: token.AND, X: sel.X}
		case !wants && pointed:
			receiver = &ast.StarExpr{Star: pos, X: sel.X}
		}
		name := n.temporary("receiver")
		inner := &ast.CallExpr{Fun: &ast.SelectorExpr{X: ident(name, pos), Sel: ident(sel.Sel.Name, pos)}, Lparen: pos, Rparen: pos}
		typ := n.typeExpr(sig, pos).(*ast.FuncType)
		own := n.typeExpr(sig, pos).(*ast.FuncType)
		n.forward(own, sig, inner, n.direct(sel))
		block := func(list ...ast.Stmt) *ast.BlockStmt { return &ast.BlockStmt{Lbrace: pos, List: list, Rbrace: pos} }
		outer := &ast.FuncLit{
			Type: &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}, Results: &ast.FieldList{List: []*ast.Field{{Type: typ}}}},
			Body: block(define(pos, name, receiver), &ast.ReturnStmt{Return: pos, Results: []ast.Expr{&ast.FuncLit{Type: own, Body: block(returning(sig, inner))}}}),
		}
		cur.Replace(&ast.CallExpr{Fun: outer, Lparen: pos, Rparen: pos})
		return true
	})
}

func takesPointer(sig *types.Signature) bool {
	_, ok := sig.Recv().Type().Underlying().(*types.Pointer)
	return ok
}

// bindable reports whether methodValues can rewrite the method value: its
// receiver is not an interface, the method is the receiver's own, and its types
// can be written down at pos.
func (c *checker) bindable(s *types.Selection, pos token.Pos) bool {
	sig := s.Obj().Type().(*types.Signature)
	return len(s.Index()) == 1 && !isInterface(s.Recv()) && c.writable(sig, pos)
}

// writable reports whether t can be written where pos is.
func (c *checker) writable(t types.Type, pos token.Pos) bool {
	switch t := types.Unalias(t).(type) {
	case *types.Basic:
		return true
	case *types.Named:
		o := t.Obj()
		if t.TypeArgs().Len() > 0 {
			return false
		}
		if o.Pkg() == nil || o.Pkg() != c.pkg {
			return o.Pkg() == nil || available.Name(o.Pkg().Path()) != ""
		}
		for scope := c.pkg.Scope().Innermost(pos); scope != nil; {
			at, found := scope.LookupParent(o.Name(), pos)
			if _, isType := found.(*types.TypeName); found == o || isType || o.Parent() != c.pkg.Scope() {
				return found == o
			}
			scope = at.Parent() // rename gives what hides o another name
		}
		return false
	case *types.Pointer:
		return c.writable(t.Elem(), pos)
	case *types.Slice:
		return c.writable(t.Elem(), pos)
	case *types.Array:
		return c.writable(t.Elem(), pos)
	case *types.Map:
		return c.writable(t.Key(), pos) && c.writable(t.Elem(), pos)
	case *types.Struct:
		for i := 0; i < t.NumFields(); i++ {
			if f := t.Field(i); f.Embedded() || f.Name() == "_" || t.Tag(i) != "" || !c.writable(f.Type(), pos) {
				return false
			}
		}
		return true
	case *types.Signature:
		for _, list := range []*types.Tuple{t.Params(), t.Results()} {
			for i := 0; i < list.Len(); i++ {
				if !c.writable(list.At(i).Type(), pos) {
					return false
				}
			}
		}
		return true
	}
	return false
}

// typeExpr writes a writable type; functions take what carries their arguments.
func (n *normaliser) typeExpr(t types.Type, pos token.Pos) ast.Expr {
	switch t := types.Unalias(t).(type) {
	case *types.Basic:
		return ident(t.Name(), pos)
	case *types.Named:
		if p := t.Obj().Pkg(); p != nil && p != n.pkg {
			n.need[p.Path()] = p.Name()
			return &ast.SelectorExpr{X: ident(p.Name(), pos), Sel: ident(t.Obj().Name(), pos)}
		}
		return ident(t.Obj().Name(), pos)
	case *types.Pointer:
		return &ast.StarExpr{Star: pos, X: n.typeExpr(t.Elem(), pos)}
	case *types.Slice:
		return &ast.ArrayType{Lbrack: pos, Elt: n.typeExpr(t.Elem(), pos)}
	case *types.Array:
		return &ast.ArrayType{Lbrack: pos, Len: number(pos, token.INT, strconv.FormatInt(t.Len(), 10)), Elt: n.typeExpr(t.Elem(), pos)}
	case *types.Map:
		return &ast.MapType{Map: pos, Key: n.typeExpr(t.Key(), pos), Value: n.typeExpr(t.Elem(), pos)}
	case *types.Struct:
		s := &ast.StructType{Struct: pos, Fields: &ast.FieldList{Opening: pos, Closing: pos}}
		for i := 0; i < t.NumFields(); i++ {
			f := t.Field(i)
			s.Fields.List = append(s.Fields.List, &ast.Field{Names: []*ast.Ident{ident(f.Name(), pos)}, Type: n.typeExpr(f.Type(), pos)})
		}
		return s
	case *types.Signature:
		f := &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}, Results: n.resultTypes(t, pos)}
		for i := 0; i < t.Params().Len(); i++ {
			var e ast.Expr
			if p := t.Params().At(i).Type(); i < fixed(t) {
				e = n.carrierType(p, pos)
			} else {
				e = &ast.Ellipsis{Ellipsis: pos, Elt: n.typeExpr(p.(*types.Slice).Elem(), pos)}
			}
			f.Params.List = append(f.Params.List, &ast.Field{Type: e})
		}
		return f
	}
	panic("program: a type that cannot be written")
}
