package program

import (
	"go/ast"
	"go/token"
	"go/types"
)

// A function is what the lowering of a body knows of the function around it.
type function struct {
	literal  bool
	results  []string // names of its named results
	captured bool     // a function literal uses one of them
}

// lower rewrites a function in place.
func (n *normaliser) lower(t *ast.FuncType, body *ast.BlockStmt, literal bool) {
	if body == nil {
		return
	}
	n.fn = function{literal: literal}
	list := fields(t.Results)
	if len(list) == 0 || list[0].name == nil {
		body.List = n.statements(body.List)
		return
	}
	var unnamed []*ast.Field
	var zero []ast.Stmt
	for _, r := range list {
		if n.results[n.info.Defs[r.name]] {
			n.fn.captured = true
		}
		name := r.name.Name
		if name == "_" {
			name = n.temporary("result")
		}
		n.fn.results = append(n.fn.results, name)
		unnamed = append(unnamed, &ast.Field{Type: r.typ})
		pos := body.Lbrace
		zero = append(zero, &ast.DeclStmt{Decl: &ast.GenDecl{TokPos: pos, Tok: token.VAR, Specs: []ast.Spec{
			&ast.ValueSpec{Names: []*ast.Ident{ident(name, pos)}, Type: r.typ},
		}}})
	}
	t.Results = &ast.FieldList{Opening: t.Results.Opening, List: unnamed, Closing: t.Results.Closing}
	body.List = append(zero, n.statements(body.List)...)
}

// statements rewrites a list of statements. One that became several with
// variables of their own stands in a block of its own.
func (n *normaliser) statements(list []ast.Stmt) []ast.Stmt {
	var out []ast.Stmt
	for _, s := range list {
		r, scoped := n.statement(s)
		if scoped {
			out = append(out, &ast.BlockStmt{Lbrace: s.Pos(), List: r, Rbrace: s.End()})
			continue
		}
		out = append(out, r...)
	}
	return out
}

// statement rewrites s. When scoped is true, the variables declared by the
// statements before the last are seen by the last alone.
func (n *normaliser) statement(s ast.Stmt) (out []ast.Stmt, scoped bool) {
	switch s := s.(type) {
	case *ast.BlockStmt:
		s.List = n.statements(s.List)
	case *ast.LabeledStmt:
		out, scoped = n.statement(s.Stmt)
		last := len(out) - 1
		s.Stmt = out[last]
		out[last] = s
		return out, scoped
	case *ast.AssignStmt:
		return n.assignment(s), false
	case *ast.DeclStmt:
		return n.declaration(s), false
	case *ast.ReturnStmt:
		return n.returned(s), false
	case *ast.IfStmt:
		return n.ifStmt(s)
	case *ast.ForStmt:
		s.Body.List = n.statements(s.Body.List)
		n.post(s)
		return n.hoist(s, &s.Init, s.Post == nil)
	case *ast.RangeStmt:
		if n.rewritten[s].text && s.Key != nil && !isBlank(s.Key) {
			return n.textRange(s), true
		}
		n.rangeStmt(s)
	case *ast.SwitchStmt:
		n.clauses(s.Body)
		return n.hoist(s, &s.Init, false)
	case *ast.TypeSwitchStmt:
		n.clauses(s.Body)
		return n.hoist(s, &s.Init, false)
	}
	return []ast.Stmt{s}, false
}

// post rewrites the statement after the condition of a loop. It becomes a call
// of a function literal when it would be several statements.
func (n *normaliser) post(s *ast.ForStmt) {
	if s.Post == nil {
		return
	}
	around := n.fn.literal
	n.fn.literal = true
	list, _ := n.statement(s.Post)
	n.fn.literal = around
	if len(list) == 1 {
		s.Post = list[0]
		return
	}
	pos := s.Post.Pos()
	s.Post = &ast.ExprStmt{X: &ast.CallExpr{Lparen: pos, Rparen: pos, Fun: &ast.FuncLit{
		Type: &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}},
		Body: &ast.BlockStmt{Lbrace: pos, List: list, Rbrace: pos},
	}}}
}

func (n *normaliser) clauses(body *ast.BlockStmt) {
	for _, s := range body.List {
		if c, ok := s.(*ast.CaseClause); ok {
			c.Body = n.statements(c.Body)
		}
	}
}

// hoist rewrites the init statement of s and moves it before s when it became
// several statements, or always.
func (n *normaliser) hoist(s ast.Stmt, init *ast.Stmt, always bool) (out []ast.Stmt, scoped bool) {
	if *init == nil {
		return []ast.Stmt{s}, false
	}
	pre, _ := n.statement(*init)
	if len(pre) == 1 && !always {
		*init = pre[0]
		return []ast.Stmt{s}, false
	}
	*init = nil
	return append(pre, s), true
}

func (n *normaliser) ifStmt(s *ast.IfStmt) (out []ast.Stmt, scoped bool) {
	s.Body.List = n.statements(s.Body.List)
	if s.Else != nil {
		alt, alone := n.statement(s.Else)
		if alone || len(alt) != 1 {
			s.Else = &ast.BlockStmt{Lbrace: s.Else.Pos(), List: alt, Rbrace: s.Else.End()}
		} else {
			s.Else = alt[0]
		}
	}
	return n.hoist(s, &s.Init, false)
}

// rangeStmt makes the variables of a range that the body changes, or that are
// not the range's own, plain assignments at the start of the body.
func (n *normaliser) rangeStmt(s *ast.RangeStmt) {
	s.Body.List = n.statements(s.Body.List)
	facts := n.rewritten[s]
	pos := s.Body.Lbrace
	if facts.text {
		// Only the value is used, see textRange.
		s.X = &ast.CallExpr{Fun: &ast.ArrayType{Lbrack: s.X.Pos(), Elt: ident("rune", s.X.Pos())}, Lparen: s.X.Pos(), Args: []ast.Expr{s.X}, Rparen: s.X.End()}
	}
	if s.Key == nil || s.Tok == token.DEFINE && !facts.assigned {
		return
	}
	var head []ast.Stmt
	replace := func(e ast.Expr) ast.Expr {
		if e == nil || isBlank(e) {
			return e
		}
		name := n.temporary("each")
		head = append(head, &ast.AssignStmt{Lhs: []ast.Expr{e}, TokPos: pos, Tok: s.Tok, Rhs: []ast.Expr{ident(name, pos)}})
		return ident(name, e.Pos())
	}
	s.Key = replace(s.Key)
	s.Value = replace(s.Value)
	s.Tok = token.DEFINE
	if len(head) == 0 { // for _ = range x
		s.Key, s.Value, s.Tok = nil, nil, token.ILLEGAL
		return
	}
	inner := &ast.BlockStmt{Lbrace: pos, List: s.Body.List, Rbrace: s.Body.Rbrace}
	s.Body = &ast.BlockStmt{Lbrace: pos, List: append(head, inner), Rbrace: s.Body.Rbrace}
}

// textRange makes a range over a string that uses the index a loop, since the
// interpreter counts the index wrong:
//
//	text_1, width_1 := string(x), 0
//	for at_1 := 0; at_1 < len(text_1); at_1 += width_1 {
//		rune_1, size_1 := utf8.DecodeRuneInString(text_1[at_1:])
//		width_1 = size_1
//		i, r := at_1, rune_1
//		…
//	}
func (n *normaliser) textRange(s *ast.RangeStmt) []ast.Stmt {
	s.Body.List = n.statements(s.Body.List)
	n.need["unicode/utf8"] = "utf8"
	pos := s.Pos()
	text, width, at, char, size := n.temporary("text"), n.temporary("width"), n.temporary("at"), n.temporary("rune"), n.temporary("size")
	call := func(fun ast.Expr, x ast.Expr) ast.Expr {
		return &ast.CallExpr{Fun: fun, Lparen: pos, Args: []ast.Expr{x}, Rparen: pos}
	}
	decode := call(&ast.SelectorExpr{X: ident("utf8", pos), Sel: ident("DecodeRuneInString", pos)},
		&ast.SliceExpr{X: ident(text, pos), Lbrack: pos, Low: ident(at, pos), Rbrack: pos})
	first := ident(char, pos)
	give := []ast.Stmt{set(pos, s.Key, s.Tok, ident(at, pos))}
	if s.Value == nil || isBlank(s.Value) {
		first = ident("_", pos)
	} else {
		give = append(give, set(pos, s.Value, s.Tok, ident(char, pos)))
	}
	list := []ast.Stmt{
		&ast.AssignStmt{Lhs: []ast.Expr{first, ident(size, pos)}, TokPos: pos, Tok: token.DEFINE, Rhs: []ast.Expr{decode}},
		set(pos, ident(width, pos), token.ASSIGN, ident(size, pos)),
	}
	list = append(append(list, give...), &ast.BlockStmt{Lbrace: s.Body.Lbrace, List: s.Body.List, Rbrace: s.Body.Rbrace})
	return []ast.Stmt{
		define(pos, text, call(ident("string", pos), s.X)),
		define(pos, width, number(pos, token.INT, "0")),
		&ast.ForStmt{
			For:  pos,
			Init: define(pos, at, number(pos, token.INT, "0")),
			Cond: &ast.BinaryExpr{X: ident(at, pos), OpPos: pos, Op: token.LSS, Y: call(ident("len", pos), ident(text, pos))},
			Post: set(pos, ident(at, pos), token.ADD_ASSIGN, ident(width, pos)),
			Body: &ast.BlockStmt{Lbrace: s.Body.Lbrace, List: list, Rbrace: s.Body.Rbrace},
		},
	}
}

func define(pos token.Pos, name string, value ast.Expr) ast.Stmt {
	return &ast.AssignStmt{Lhs: []ast.Expr{ident(name, pos)}, TokPos: pos, Tok: token.DEFINE, Rhs: []ast.Expr{value}}
}

func set(pos token.Pos, to ast.Expr, tok token.Token, value ast.Expr) ast.Stmt {
	return &ast.AssignStmt{Lhs: []ast.Expr{to}, TokPos: pos, Tok: tok, Rhs: []ast.Expr{value}}
}

// assignment splits an assignment that the interpreter gets wrong.
func (n *normaliser) assignment(s *ast.AssignStmt) []ast.Stmt {
	pos := s.TokPos
	switch {
	case len(s.Lhs) == 1:
		// p = T{…} is lost in a function literal when p is a variable outside.
		if lit, ok := s.Rhs[0].(*ast.CompositeLit); ok && s.Tok == token.ASSIGN && n.fn.literal && !isBlank(s.Lhs[0]) {
			name := n.temporary("value")
			return []ast.Stmt{define(pos, name, lit), set(pos, s.Lhs[0], token.ASSIGN, ident(name, pos))}
		}
	case len(s.Rhs) == len(s.Lhs):
		if n.needsSplit(s.Rhs) || n.redeclares(s) {
			return n.oneByOne(s)
		}
	case n.setsMap(s):
		return n.byTemporaries(s)
	}
	return []ast.Stmt{s}
}

// needsSplit reports whether a multiple assignment of these values goes wrong:
// one is nil, or contains a call, a composite literal or a function literal.
func (n *normaliser) needsSplit(list []ast.Expr) bool {
	found := false
	for _, e := range list {
		if n.info.Types[e].IsNil() {
			return true
		}
		ast.Inspect(e, func(m ast.Node) bool {
			switch m.(type) {
			case *ast.CallExpr, *ast.CompositeLit, *ast.FuncLit:
				found = true
			}
			return !found
		})
	}
	return found
}

func (n *normaliser) redeclares(s *ast.AssignStmt) bool {
	if s.Tok != token.DEFINE {
		return false
	}
	for _, x := range s.Lhs {
		if !isBlank(x) && n.info.Defs[x.(*ast.Ident)] == nil {
			return true
		}
	}
	return false
}

// place evaluates the operands of a place that is assigned to: it gives the
// statements that do so and the place in terms of their variables.
func (n *normaliser) place(x ast.Expr) (take []ast.Stmt, place ast.Expr) {
	pos := x.Pos()
	keep := func(base string, e ast.Expr) ast.Expr {
		name := n.temporary(base)
		take = append(take, define(pos, name, e))
		return ident(name, pos)
	}
	switch x := x.(type) {
	case *ast.IndexExpr:
		var from ast.Expr
		if _, array := n.under(x.X).(*types.Array); array {
			take, from = n.place(x.X)
		} else {
			from = keep("of", x.X)
		}
		place = &ast.IndexExpr{X: from, Lbrack: x.Lbrack, Index: keep("key", x.Index), Rbrack: x.Rbrack}
	case *ast.SelectorExpr:
		s := n.info.Selections[x]
		switch {
		case s == nil:
			place = x
		case s.Indirect():
			place = &ast.SelectorExpr{X: keep("of", x.X), Sel: x.Sel}
		default:
			var of ast.Expr
			take, of = n.place(x.X)
			place = &ast.SelectorExpr{X: of, Sel: x.Sel}
		}
	case *ast.StarExpr:
		place = &ast.StarExpr{Star: x.Star, X: keep("of", x.X)}
	default:
		place = x
	}
	return take, place
}

// oneByOne splits a, b := x, y.
func (n *normaliser) oneByOne(s *ast.AssignStmt) []ast.Stmt {
	pos := s.TokPos
	var take, give []ast.Stmt
	places := make([]ast.Expr, len(s.Lhs))
	for i, x := range s.Lhs {
		var operands []ast.Stmt
		operands, places[i] = n.place(x)
		take = append(take, operands...)
	}
	for i, x := range places {
		tok := token.ASSIGN
		if s.Tok == token.DEFINE && !isBlank(x) && n.info.Defs[x.(*ast.Ident)] != nil {
			tok = token.DEFINE
		}
		if n.info.Types[s.Rhs[i]].IsNil() {
			give = append(give, set(pos, x, tok, s.Rhs[i]))
			continue
		}
		name := n.temporary("value")
		take = append(take, define(pos, name, s.Rhs[i]))
		give = append(give, set(pos, x, tok, ident(name, pos)))
	}
	return append(take, give...)
}

// setsMap reports whether several results are assigned and one to a map element.
func (n *normaliser) setsMap(s *ast.AssignStmt) bool {
	if len(s.Lhs) < 2 || len(s.Rhs) != 1 {
		return false
	}
	for _, x := range s.Lhs {
		if i, ok := ast.Unparen(x).(*ast.IndexExpr); ok {
			if _, ok := n.under(i.X).(*types.Map); ok {
				return true
			}
		}
	}
	return false
}

// byTemporaries splits m[k], x = f() with map elements on the left: the operands
// on the left are evaluated first, then f.
func (n *normaliser) byTemporaries(s *ast.AssignStmt) []ast.Stmt {
	pos := s.TokPos
	var take, give []ast.Stmt
	var names []ast.Expr
	for _, x := range s.Lhs {
		if isBlank(x) {
			names = append(names, x)
			continue
		}
		name := n.temporary("value")
		names = append(names, ident(name, pos))
		operands, x := n.place(x)
		take = append(take, operands...)
		give = append(give, set(pos, x, token.ASSIGN, ident(name, pos)))
	}
	take = append(take, &ast.AssignStmt{Lhs: names, TokPos: pos, Tok: token.DEFINE, Rhs: s.Rhs})
	return append(take, give...)
}

// declaration splits var a, b = x, y when that goes wrong.
func (n *normaliser) declaration(s *ast.DeclStmt) []ast.Stmt {
	d, ok := s.Decl.(*ast.GenDecl)
	if !ok || d.Tok != token.VAR {
		return []ast.Stmt{s}
	}
	var out []ast.Stmt
	for _, spec := range d.Specs {
		v, ok := spec.(*ast.ValueSpec)
		if !ok || len(v.Values) < 2 || !n.needsSplit(v.Values) {
			out = append(out, &ast.DeclStmt{Decl: &ast.GenDecl{TokPos: d.TokPos, Tok: token.VAR, Specs: []ast.Spec{spec}}})
			continue
		}
		var give []ast.Stmt
		for i, name := range v.Names {
			value := v.Values[i]
			if !n.info.Types[value].IsNil() {
				t := n.temporary("value")
				out = append(out, define(v.Pos(), t, value))
				value = ident(t, v.Pos())
			}
			give = append(give, &ast.DeclStmt{Decl: &ast.GenDecl{TokPos: d.TokPos, Tok: token.VAR, Specs: []ast.Spec{
				&ast.ValueSpec{Names: []*ast.Ident{name}, Type: v.Type, Values: []ast.Expr{value}},
			}}})
		}
		out = append(out, give...)
	}
	return out
}

// returnedFields evaluates several results before the return when one is the
// call of a function in a field: the interpreter would return zero for it.
func (n *normaliser) returnedFields(s *ast.ReturnStmt) []ast.Stmt {
	field := false
	for _, e := range s.Results {
		if call, ok := e.(*ast.CallExpr); ok {
			if sel, ok := call.Fun.(*ast.SelectorExpr); ok {
				f := n.info.Selections[sel]
				field = field || f != nil && f.Kind() == types.FieldVal
			}
		}
	}
	if !field || len(s.Results) < 2 {
		return []ast.Stmt{s}
	}
	pos := s.Pos()
	var out []ast.Stmt
	for i, e := range s.Results {
		if n.info.Types[e].IsNil() {
			continue
		}
		name := n.temporary("value")
		out = append(out, define(pos, name, e))
		s.Results[i] = ident(name, pos)
	}
	return append(out, s)
}

// returned gives a bare return the results it stands for. Where a function
// literal can see the results, a return with values sets them first.
func (n *normaliser) returned(s *ast.ReturnStmt) []ast.Stmt {
	if n.fn.results == nil {
		return n.returnedFields(s)
	}
	pos := s.Pos()
	names := func() []ast.Expr {
		var out []ast.Expr
		for _, name := range n.fn.results {
			out = append(out, ident(name, pos))
		}
		return out
	}
	if len(s.Results) == 0 {
		s.Results = names()
		return []ast.Stmt{s}
	}
	if !n.fn.captured {
		return n.returnedFields(s)
	}
	var take, give []ast.Stmt
	var temporaries []ast.Expr
	for i, name := range n.fn.results {
		if len(s.Results) == len(n.fn.results) && n.info.Types[s.Results[i]].IsNil() {
			give = append(give, set(pos, ident(name, pos), token.ASSIGN, s.Results[i]))
			continue
		}
		t := n.temporary("value")
		if len(s.Results) == len(n.fn.results) {
			take = append(take, define(pos, t, s.Results[i]))
		}
		temporaries = append(temporaries, ident(t, pos))
		give = append(give, set(pos, ident(name, pos), token.ASSIGN, ident(t, pos)))
	}
	if len(s.Results) != len(n.fn.results) {
		take = append(take, &ast.AssignStmt{Lhs: temporaries, TokPos: pos, Tok: token.DEFINE, Rhs: s.Results})
	}
	s.Results = names()
	return append(append(take, give...), s)
}
