package program

import (
	"go/ast"
	"go/token"
	"go/types"
)

// sortsKeys reports whether a range over a map does no more than collect the
// keys in a slice that is empty before and sorted right after, so that the order
// of the range leaves no trace:
//
//	var keys []string
//	for k := range m {
//		keys = append(keys, k)
//	}
//	sort.Strings(keys)
//
// The slice may also be the only named result of the function that begins with
// the loop.
func (l *linter) sortsKeys(n *ast.RangeStmt, above []ast.Node) bool {
	m := l.under(n.X).(*types.Map)
	k, ok := n.Key.(*ast.Ident)
	if !ok || n.Tok != token.DEFINE || n.Value != nil && !isBlank(n.Value) || len(n.Body.List) != 1 {
		return false
	}
	// keys = append(keys, k)
	set, ok := n.Body.List[0].(*ast.AssignStmt)
	if !ok || set.Tok != token.ASSIGN || len(set.Lhs) != 1 || len(set.Rhs) != 1 {
		return false
	}
	keys := l.variable(set.Lhs[0])
	add, ok := set.Rhs[0].(*ast.CallExpr)
	if !ok || keys == nil || len(add.Args) != 2 || add.Ellipsis.IsValid() || l.builtin(add) != "append" || l.variable(add.Args[0]) != keys {
		return false
	}
	if v := l.variable(add.Args[1]); v == nil || v != l.info.Defs[k] {
		return false
	}
	list := statementsAround(above)
	for i, s := range list {
		if s != n {
			continue
		}
		if i > 0 && !l.declaresEmpty(list[i-1], keys) || i == 0 && !l.resultOf(keys, above) {
			return false
		}
		return i+1 < len(list) && l.sorts(list[i+1], keys, m.Key())
	}
	return false
}

// variable is the variable that e names, nil when it is no name of a variable.
func (c *checker) variable(e ast.Expr) types.Object {
	id, ok := ast.Unparen(e).(*ast.Ident)
	if !ok {
		return nil
	}
	v, ok := c.info.Uses[id].(*types.Var)
	if !ok {
		return nil
	}
	return v
}

// builtin is the name of the built-in function that is called, "" when it is
// none.
func (c *checker) builtin(call *ast.CallExpr) string {
	id, ok := ast.Unparen(call.Fun).(*ast.Ident)
	if !ok {
		return ""
	}
	if b, ok := c.info.Uses[id].(*types.Builtin); ok {
		return b.Name()
	}
	return ""
}

// statementsAround is the list of statements of the innermost block.
func statementsAround(above []ast.Node) []ast.Stmt {
	if len(above) == 0 {
		return nil
	}
	switch b := above[len(above)-1].(type) {
	case *ast.BlockStmt:
		return b.List
	case *ast.CaseClause:
		return b.Body
	}
	return nil
}

// declaresEmpty reports whether s declares keys as a slice without elements
// that shares its memory with no other.
func (l *linter) declaresEmpty(s ast.Stmt, keys types.Object) bool {
	switch s := s.(type) {
	case *ast.DeclStmt:
		d, ok := s.Decl.(*ast.GenDecl)
		if !ok || d.Tok != token.VAR || len(d.Specs) != 1 {
			return false
		}
		v := d.Specs[0].(*ast.ValueSpec)
		return len(v.Names) == 1 && len(v.Values) == 0 && l.info.Defs[v.Names[0]] == keys
	case *ast.AssignStmt:
		if s.Tok != token.DEFINE || len(s.Lhs) != 1 || len(s.Rhs) != 1 {
			return false
		}
		id, ok := s.Lhs[0].(*ast.Ident)
		if !ok || l.info.Defs[id] != keys {
			return false
		}
		switch e := ast.Unparen(s.Rhs[0]).(type) {
		case *ast.CompositeLit:
			return len(e.Elts) == 0
		case *ast.CallExpr:
			if l.builtin(e) != "make" || len(e.Args) < 2 {
				return false
			}
			v := l.info.Types[e.Args[1]].Value
			return v != nil && v.ExactString() == "0"
		}
	}
	return false
}

// resultOf reports whether the block at the end of above is the body of a
// function of which keys is the only result.
func (l *linter) resultOf(keys types.Object, above []ast.Node) bool {
	if len(above) < 2 {
		return false
	}
	var t *ast.FuncType
	switch f := above[len(above)-2].(type) {
	case *ast.FuncDecl:
		t = f.Type
	case *ast.FuncLit:
		t = f.Type
	default:
		return false
	}
	list := fields(t.Results)
	return len(list) == 1 && list[0].name != nil && l.info.Defs[list[0].name] == keys
}

// sorts reports whether s sorts keys, all different and of type t, into an
// order that does not depend on the one before.
func (l *linter) sorts(s ast.Stmt, keys types.Object, t types.Type) bool {
	x, ok := s.(*ast.ExprStmt)
	if !ok {
		return false
	}
	call, ok := x.X.(*ast.CallExpr)
	if !ok || len(call.Args) == 0 || l.variable(call.Args[0]) != keys {
		return false
	}
	fn := l.callee(call)
	if fn == nil {
		return false
	}
	switch fn.FullName() {
	case "sort.Strings":
		return types.Identical(t, types.Typ[types.String])
	case "sort.Ints":
		return types.Identical(t, types.Typ[types.Int])
	}
	return false
}
