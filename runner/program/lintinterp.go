package program

import (
	"go/ast"
	"go/constant"
	"go/token"
	"go/types"

	"rimlight/runner/program/available"
)

// statement refuses statements that the interpreter gets wrong.
func (l *linter) statement(n ast.Node, above []ast.Node) {
	switch n := n.(type) {
	case *ast.DeferStmt:
		l.refuse(n, "call the function at the end, before each return", "defer is not available: its arguments would be evaluated late")
	case *ast.RangeStmt:
		l.rangeStmt(n)
	case *ast.AssignStmt:
		if n.Tok == token.QUO_ASSIGN {
			l.divisor(n.Rhs[0])
		}
	case *ast.LabeledStmt:
		for _, a := range above {
			if _, ok := a.(*ast.CaseClause); ok {
				l.refuse(n, "move the loop into a function", "a label inside a case is not available")
				break
			}
		}
	case *ast.BranchStmt:
		if n.Tok == token.GOTO {
			l.refuse(n, "use a loop", "goto is not available")
		}
	case *ast.TypeSwitchStmt:
		for _, clause := range n.Body.List {
			for _, e := range clause.(*ast.CaseClause).List {
				l.typeTest(e, l.info.TypeOf(e))
			}
		}
	}
}

func (l *linter) rangeStmt(n *ast.RangeStmt) {
	switch l.under(n.X).(type) {
	case *types.Pointer:
		l.refuse(n.X, "range over *p", "a range over a pointer to an array is not available")
	case *types.Signature:
		l.refuse(n.X, "write a loop with a condition", "a range over a function is not available")
	}
}

func isBlank(e ast.Expr) bool {
	id, ok := ast.Unparen(e).(*ast.Ident)
	return ok && id.Name == "_"
}

// expression refuses expressions and types that the interpreter gets wrong.
func (l *linter) expression(n ast.Node, above []ast.Node) {
	switch n := n.(type) {
	case *ast.TypeSpec:
		if name := n.Name.Name; types.Universe.Lookup(name) != nil || available.Path(name) != "" {
			l.refuse(n.Name, "choose another name", "type %s would hide what Go or a package calls %s", name, name)
		}
	case *ast.InterfaceType:
		if t, ok := l.info.TypeOf(n).(*types.Interface); ok && !t.IsMethodSet() {
			l.refuse(n, "list the methods", "a constraint is not available")
		}
	case *ast.StructType:
		l.embedding(n)
	case *ast.MapType:
		if isInterface(l.under(n.Key)) {
			l.refuse(n.Key, "use keys of a concrete type", "map keys of interface type are not reliable")
		}
	case *ast.SelectorExpr:
		l.selector(n, above)
	case *ast.SliceExpr:
		switch l.under(n.X).(type) {
		case *types.Pointer:
			l.refuse(n, "write (*p)[i:j]", "slicing a pointer to an array is not available")
		case *types.Array:
			l.shared(n, n.X, above)
		}
	case *ast.TypeAssertExpr:
		if n.Type != nil {
			l.typeTest(n, l.info.TypeOf(n.Type))
		}
	case *ast.BinaryExpr:
		l.binary(n)
	case *ast.UnaryExpr:
		if n.Op == token.AND {
			l.shared(n, n.X, above)
		}
	case *ast.Ident:
		l.name(n)
		if s, ok := above[len(above)-1].(*ast.SelectorExpr); !ok || s.Sel != n {
			l.signable(n, above[len(above)-1])
		} else {
			l.signable(s, above[len(above)-2])
		}
	case *ast.CompositeLit:
		l.interfaceField(n)
	case *ast.CallExpr:
		l.interfaceArgument(n)
		l.verbs(n)
		l.signable(n, nil)
		l.variadic(n)
	case *ast.FuncLit:
		l.closure(n, above)
	}
}

func (l *linter) embedding(n *ast.StructType) {
	for _, f := range n.Fields.List {
		if len(f.Names) > 0 {
			continue
		}
		t := l.info.TypeOf(f.Type)
		switch {
		case isInterface(t):
			l.refuse(f, "give the field a name", "embedding interface %s is not available", l.typeName(t))
		case !l.local(t):
			l.refuse(f, "give the field a name", "embedding type %s is not available", l.typeName(t))
		}
	}
}

func (l *linter) selector(n *ast.SelectorExpr, above []ast.Node) {
	s := l.info.Selections[n]
	switch {
	case s == nil:
	case s.Kind() == types.MethodExpr:
		l.refuse(n, "write func(x T) { x."+n.Sel.Name+"() }", "method expression %s is not available", exprText(n))
	case s.Kind() == types.MethodVal && !l.called[n]:
		if !l.bindable(s, n.Pos()) {
			l.refuse(n, "write func(…) { return x."+n.Sel.Name+"(…) }", "method value %s of an interface or embedded type is not available", exprText(n))
		} else if takesPointer(s.Obj().Type().(*types.Signature)) && !s.Indirect() {
			l.shared(n, n.X, above)
		}
	}
}

func (l *linter) typeTest(at ast.Expr, t types.Type) {
	switch {
	case t == nil || types.Identical(t, types.Typ[types.UntypedNil]):
	case l.local(t):
		l.refuse(at, "tell types apart by a field or a method", "a test for type %s of the recipe is not reliable", l.typeName(t))
	case isInterface(t):
		l.refuse(at, "tell types apart by a field or a method", "a test for interface %s is not reliable", l.typeName(t))
	}
}

func (l *linter) binary(n *ast.BinaryExpr) {
	switch n.Op {
	case token.EQL, token.NEQ:
		x, y := l.info.Types[n.X], l.info.Types[n.Y]
		if x.IsNil() || y.IsNil() || x.Type == nil || y.Type == nil || isError(x.Type) {
			return
		}
		if isInterface(x.Type) || isInterface(y.Type) {
			l.refuse(n, "compare values of a concrete type", "a comparison of interface values is not reliable")
		}
	case token.QUO:
		l.divisor(n.Y)
	case token.LAND, token.LOR:
		for _, x := range []ast.Expr{n.X, n.Y} {
			ast.Inspect(x, func(m ast.Node) bool {
				if lit, ok := m.(*ast.FuncLit); ok && l.called[lit] {
					l.refuse(lit, "call it in a statement before", "a function literal that is called within && or || is not available")
					return false
				}
				return true
			})
		}
	}
}

// divisor refuses a floating-point zero that is constant: Go divides by it, the
// interpreter does not compile.
func (l *linter) divisor(e ast.Expr) {
	if v := l.info.Types[e].Value; v != nil && v.Kind() != constant.Unknown && constant.Sign(v) == 0 {
		l.refuse(e, "write math.Inf(1), math.Inf(-1) or math.NaN()", "a division by the constant zero is not available")
	}
}

// shared looks at n, which makes a pointer to x or a slice of it: the variable
// must not be one that the iterations of a loop share.
func (l *linter) shared(n, x ast.Expr, above []ast.Node) {
	id := l.storage(x)
	if id == nil {
		return
	}
	if o := l.info.Uses[id]; o != nil && loopOf(above, o) != nil && !l.fresh(o, above) {
		l.refuse(n, "use p := &T{…}, or move the body of the loop into a function", "%s would be the same variable in all iterations of the loop", id.Name)
	}
}

func (l *linter) name(id *ast.Ident) {
	switch o := l.info.Uses[id].(type) {
	case *types.Func:
		if o.Signature().TypeParams() != nil {
			l.refuse(id, "write a function for the type at hand", "generic function %s is not available", o.Name())
		}
	case *types.TypeName:
		if n, ok := o.Type().(*types.Named); ok && n.TypeParams() != nil && o.Pkg() != l.pkg {
			l.refuse(id, "write a type for the element type at hand", "generic type %s is not available", o.Name())
		}
	case *types.Builtin:
		if o.Name() == "recover" {
			l.refuse(id, "return an error where it arises", "recover is not available: a panic ends the step and is reported")
		}
	}
}

// variadic refuses calls of variadic functions that pack cannot rewrite.
func (l *linter) variadic(call *ast.CallExpr) {
	if call.Ellipsis.IsValid() {
		if last := call.Args[len(call.Args)-1]; l.info.Types[last].IsNil() {
			l.refuse(last, "leave it out", "nil... is not available")
		}
		return
	}
	if l.unpacked(call) {
		sig := l.under(call.Fun).(*types.Signature)
		if t := sig.Params().At(fixed(sig)).Type(); !l.writable(t, call.Args[fixed(sig)].Pos()) {
			l.refuse(call, "give the elements a type with a name that nothing hides", "a function value cannot take several last arguments of this type")
		}
	}
}

// interfaceField refuses values of the recipe's types put directly into an
// interface field of a compiled struct.
func (l *linter) interfaceField(n *ast.CompositeLit) {
	st, ok := l.under(n).(*types.Struct)
	if !ok || l.local(l.info.TypeOf(n)) {
		return
	}
	for i, e := range n.Elts {
		var f *types.Var
		if kv, ok := e.(*ast.KeyValueExpr); ok {
			e = kv.Value
			if id, ok := kv.Key.(*ast.Ident); ok {
				f, _ = l.info.Uses[id].(*types.Var)
			}
		} else if i < st.NumFields() {
			f = st.Field(i)
		}
		if f == nil || !isInterface(f.Type()) {
			continue
		}
		if t := l.info.TypeOf(e); t != nil && (l.local(t) || l.isConversion(e)) {
			name := l.typeName(f.Type())
			l.refuse(e, "declare a variable before: var v "+name+" = …", "a value of type %s cannot be put into field %s directly", l.typeName(t), f.Name())
		}
	}
}

func (l *linter) isConversion(e ast.Expr) bool {
	call, ok := ast.Unparen(e).(*ast.CallExpr)
	return ok && l.info.Types[call.Fun].IsType()
}

// interfaceArgument refuses values of the recipe's types where a compiled
// function wants an interface of a package that recipes do not know.
func (l *linter) interfaceArgument(call *ast.CallExpr) {
	sig, ok := l.under(call.Fun).(*types.Signature)
	if !ok {
		return
	}
	for i, a := range call.Args {
		if i >= sig.Params().Len() {
			break
		}
		p := sig.Params().At(i).Type()
		n, ok := types.Unalias(p).(*types.Named)
		if !ok || !isInterface(p) || n.Obj().Pkg() == nil || n.Obj().Pkg() == l.pkg || l.foreign(n.Obj()) {
			continue
		}
		if t := l.info.TypeOf(a); t != nil && l.local(t) {
			l.refuse(a, "use a type of the package that declares the function", "type %s cannot be used as %s", l.typeName(t), l.typeName(p))
		}
	}
}

// closure refuses function literals that are kept and use a variable of a loop
// which a copy cannot stand for.
func (l *linter) closure(lit *ast.FuncLit, above []ast.Node) {
	vars := l.escape.captured(lit, above)
	if len(vars) == 0 || !l.escape.kept(append(above[:len(above):len(above)], lit)) {
		return
	}
	var copies []*types.Var
	for _, v := range vars {
		switch {
		case l.escape.copyable(v, lit, above):
			copies = append(copies, v)
		case !l.fresh(v, above):
			l.refuse(lit, "write "+v.Name()+" := "+v.Name()+" just before it, and change neither after", "a function that is kept uses %s, a variable of the loop that all iterations share", v.Name())
			return
		}
	}
	if l.copies == nil {
		l.checker.copies = map[*ast.FuncLit][]*types.Var{}
	}
	l.checker.copies[lit] = copies
}
