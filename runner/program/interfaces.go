package program

import (
	"go/ast"
	"go/token"
	"go/types"

	"golang.org/x/tools/go/ast/astutil"
)

// In the interpreter an interface shares the memory of the variable, or of the
// place of the call, that its value came from, and sees later changes of it. So
// each value of a type of the recipe that becomes an interface is moved to memory
// of its own first:
//
//	*func() *T { value_1 := new(T); *value_1 = x; return value_1 }()

// conversions calls visit for each expression below root that is converted to
// another type without saying so, or by a conversion. A tuple is a call with
// several results that are converted.
func (c *checker) conversions(root ast.Node, visit func(e *ast.Expr, to types.Type), tuple func(call ast.Expr, from, to *types.Tuple)) {
	several := func(list []ast.Expr, at func(i int) types.Type, count int) {
		if len(list) == 1 && count != 1 {
			if from, ok := c.info.TypeOf(list[0]).(*types.Tuple); ok {
				var to []*types.Var
				for i := 0; i < from.Len(); i++ {
					to = append(to, types.NewVar(token.NoPos, nil, "", at(i)))
				}
				tuple(list[0], from, types.NewTuple(to...))
			}
			return
		}
		for i := range list {
			visit(&list[i], at(i))
		}
	}
	var functions []*types.Signature
	astutil.Apply(root, func(cur *astutil.Cursor) bool {
		switch n := cur.Node().(type) {
		case *ast.FuncDecl:
			functions = append(functions, c.info.Defs[n.Name].Type().(*types.Signature))
		case *ast.FuncLit:
			functions = append(functions, c.info.TypeOf(n).(*types.Signature))
		}
		return true
	}, func(cur *astutil.Cursor) bool {
		switch n := cur.Node().(type) {
		case *ast.FuncDecl, *ast.FuncLit:
			functions = functions[:len(functions)-1]
		case *ast.ReturnStmt:
			results := functions[len(functions)-1].Results()
			several(n.Results, func(i int) types.Type { return results.At(i).Type() }, results.Len())
		case *ast.AssignStmt:
			if n.Tok == token.ASSIGN || n.Tok == token.DEFINE {
				several(n.Rhs, func(i int) types.Type { return c.info.TypeOf(n.Lhs[i]) }, len(n.Lhs))
			}
		case *ast.ValueSpec:
			if n.Type != nil {
				several(n.Values, func(int) types.Type { return c.info.TypeOf(n.Type) }, len(n.Names))
			}
		case *ast.CallExpr:
			c.arguments(n, visit, several)
		case *ast.CompositeLit:
			c.elements(n, visit)
		}
		return true
	})
}

func (c *checker) arguments(n *ast.CallExpr, visit func(e *ast.Expr, to types.Type), several func([]ast.Expr, func(int) types.Type, int)) {
	if tv := c.info.Types[n.Fun]; tv.IsType() {
		visit(&n.Args[0], tv.Type)
		return
	}
	if name := c.builtin(n); name != "" {
		if s, ok := c.under(n).(*types.Slice); ok && name == "append" && !n.Ellipsis.IsValid() {
			for i := 1; i < len(n.Args); i++ {
				visit(&n.Args[i], s.Elem())
			}
		}
		return
	}
	sig, ok := c.under(n.Fun).(*types.Signature)
	if !ok {
		return
	}
	last := sig.Params().Len() - 1
	several(n.Args, func(i int) types.Type {
		if sig.Variadic() && i >= last && !n.Ellipsis.IsValid() {
			return sig.Params().At(last).Type().(*types.Slice).Elem()
		}
		return sig.Params().At(i).Type()
	}, sig.Params().Len())
}

func (c *checker) elements(n *ast.CompositeLit, visit func(e *ast.Expr, to types.Type)) {
	var elem, key types.Type
	switch t := c.under(n).(type) {
	case *types.Struct:
		for i, e := range n.Elts {
			kv, ok := e.(*ast.KeyValueExpr)
			if !ok {
				visit(&n.Elts[i], t.Field(i).Type())
			} else if id, ok := kv.Key.(*ast.Ident); ok {
				if f := c.info.Uses[id]; f != nil {
					visit(&kv.Value, f.Type())
				}
			}
		}
		return
	case *types.Slice:
		elem = t.Elem()
	case *types.Array:
		elem = t.Elem()
	case *types.Map:
		key, elem = t.Key(), t.Elem()
	default:
		return
	}
	for i, e := range n.Elts {
		kv, ok := e.(*ast.KeyValueExpr)
		if !ok {
			visit(&n.Elts[i], elem)
			continue
		}
		if key != nil {
			visit(&kv.Key, key)
		}
		visit(&kv.Value, elem)
	}
}

// shares reports whether a value of type from that becomes an interface of type
// to shares its memory.
func (c *checker) shares(from, to types.Type) bool {
	if from == nil || to == nil || isInterface(from) || !isInterface(to) || !c.local(from) {
		return false
	}
	_, pointer := from.Underlying().(*types.Pointer)
	_, pointed := types.Unalias(from).(*types.Pointer)
	return !pointer && !pointed
}

// becomesInterface refuses what ownMemory cannot rewrite.
func (l *linter) becomesInterface() {
	l.conversions(l.tree, func(e *ast.Expr, to types.Type) {
		if from := l.info.TypeOf(*e); l.shares(from, to) && !l.writable(from, (*e).Pos()) {
			l.refuse(*e, "give type "+l.typeName(from)+" a name that nothing hides", "a value of type %s cannot become an interface here", l.typeName(from))
		}
	}, func(call ast.Expr, from, to *types.Tuple) {
		for i := 0; i < from.Len(); i++ {
			if l.shares(from.At(i).Type(), to.At(i).Type()) {
				l.refuse(call, "assign the results to variables of their own types first", "result %d of the call becomes an interface", i+1)
				return
			}
		}
	})
	ast.Inspect(l.tree, func(n ast.Node) bool {
		if s, ok := n.(*ast.RangeStmt); ok && s.Tok == token.ASSIGN && s.Value != nil {
			if e := l.rangeElem(s); l.shares(e, l.info.TypeOf(s.Value)) {
				l.refuse(s.Value, "write for _, x := range …", "an element becomes an interface")
			}
		}
		return true
	})
}

// rangeElem is the type of the elements of a range over a slice, an array or a
// map, nil for others.
func (c *checker) rangeElem(s *ast.RangeStmt) types.Type {
	switch t := c.under(s.X).(type) {
	case *types.Slice:
		return t.Elem()
	case *types.Array:
		return t.Elem()
	case *types.Map:
		return t.Elem()
	}
	return nil
}

// ownMemory moves the values that become interfaces.
func (n *normaliser) ownMemory() {
	n.conversions(n.tree, func(e *ast.Expr, to types.Type) {
		from := n.info.TypeOf(*e)
		if !n.shares(from, to) {
			return
		}
		pos := (*e).Pos()
		name := n.temporary("value")
		typ := func() ast.Expr { return n.typeExpr(from, pos) }
		body := []ast.Stmt{
			define(pos, name, &ast.CallExpr{Fun: ident("new", pos), Lparen: pos, Args: []ast.Expr{typ()}, Rparen: pos}),
			set(pos, &ast.StarExpr{Star: pos, X: ident(name, pos)}, token.ASSIGN, *e),
			&ast.ReturnStmt{Return: pos, Results: []ast.Expr{ident(name, pos)}},
		}
		lit := &ast.FuncLit{
			Type: &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}, Results: &ast.FieldList{List: []*ast.Field{{Type: &ast.StarExpr{Star: pos, X: typ()}}}}},
			Body: &ast.BlockStmt{Lbrace: pos, List: body, Rbrace: pos},
		}
		*e = &ast.StarExpr{Star: pos, X: &ast.CallExpr{Fun: lit, Lparen: pos, Rparen: pos}}
	}, func(ast.Expr, *types.Tuple, *types.Tuple) {})
}
