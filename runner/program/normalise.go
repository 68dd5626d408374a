package program

import (
	"go/ast"
	"go/token"
	"go/types"
	"strconv"

	"golang.org/x/tools/go/ast/astutil"

	"rimlight/runner/program/available"
)

// normalise rewrites the checked tree to the part of Go that the interpreter
// runs as compiled Go does. In order:
//
//   - comments and parentheses go; the tree has its structure without them
//     (the interpreter negates the wrong operand of !(v) || w);
//   - names that hide packages, predeclared names or declarations of the
//     recipe are changed;
//   - constant expressions become literals of their final type, as the type
//     checker found it (the interpreter takes var x float64 = 3/2 for 1.5);
//   - functions get floating-point arguments as complex numbers, and structs and
//     arrays of them in slices; declared functions that are kept become function
//     literals (signs.go);
//   - values that become interfaces get memory of their own (interfaces.go);
//   - bodies of loops whose variables are kept become calls (loopbody.go);
//   - method values become function literals (methodvalue.go);
//   - printing into a strings.Builder and shifts by signed numbers become calls of
//     other functions (calls.go);
//   - named results become local variables (in the interpreter they keep the
//     values of the previous call);
//   - multiple assignments that redeclare a variable, contain calls or composite
//     literals, or set map elements, are split by way of temporary variables (in
//     the interpreter x, y = x+1, f() leaves x as it was);
//   - a range over a string with its index becomes a loop that decodes runes;
//   - a statement before the condition of a loop without a post statement, and
//     any that had to be split, moves before the statement it belongs to; one
//     after the condition becomes a call;
//   - variables of a range that are assigned to are copies, as is what a range
//     with = assigns;
//   - function literals that are kept get copies of the loop variables they use.
func normalise(c *checker) *normaliser {
	n := &normaliser{checker: c, taken: map[string]bool{}, rewritten: map[*ast.RangeStmt]*rangeFacts{}, need: map[string]string{}}
	n.stripComments()
	n.stripParens()
	n.names()
	n.signs()
	n.ownMemory()
	n.loopBodies()
	n.methodValues()
	n.replaceCalls()
	n.gather()
	n.rename()
	n.fold()
	n.functions()
	n.copyCaptured()
	n.addImports()
	n.addShift()
	return n
}

type normaliser struct {
	*checker
	taken     map[string]bool // identifiers in use
	fresh     int
	rewritten map[*ast.RangeStmt]*rangeFacts
	results   map[types.Object]bool // named results that a function literal uses
	need      map[string]string     // packages that folded constants name, by path
	shift     string                // name of the function that checks counts of shifts, "" when there is none
	fn        function
}

// rangeFacts is what the lowering of a range needs to know and cannot see once
// constants are folded.
type rangeFacts struct {
	text     bool // ranges over a string
	assigned bool // a variable of it is assigned to
}

// temporary makes an identifier that occurs nowhere.
func (n *normaliser) temporary(base string) string {
	for {
		n.fresh++
		name := base + "_" + strconv.Itoa(n.fresh)
		if !n.taken[name] {
			n.taken[name] = true
			return name
		}
	}
}

func ident(name string, pos token.Pos) *ast.Ident { return &ast.Ident{Name: name, NamePos: pos} }

func (n *normaliser) stripComments() {
	n.tree.Comments, n.tree.Doc = nil, nil
	ast.Inspect(n.tree, func(m ast.Node) bool {
		switch m := m.(type) {
		case *ast.FuncDecl:
			m.Doc = nil
		case *ast.GenDecl:
			m.Doc = nil
		case *ast.TypeSpec:
			m.Doc, m.Comment = nil, nil
		case *ast.ValueSpec:
			m.Doc, m.Comment = nil, nil
		case *ast.ImportSpec:
			m.Doc, m.Comment = nil, nil
		case *ast.Field:
			m.Doc, m.Comment, m.Tag = nil, nil, nil
		}
		return true
	})
}

func (n *normaliser) stripParens() {
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		if p, ok := cur.Node().(*ast.ParenExpr); ok {
			cur.Replace(p.X)
		}
		return true
	})
}

// names collects the identifiers in use.
func (n *normaliser) names() {
	ast.Inspect(n.tree, func(m ast.Node) bool {
		if id, ok := m.(*ast.Ident); ok {
			n.taken[id.Name] = true
		}
		return true
	})
}

// gather collects facts on ranges, and the named results that function literals
// use.
func (n *normaliser) gather() {
	n.results = map[types.Object]bool{}
	owner := map[types.Object]ast.Node{}
	assigned := map[types.Object]bool{}
	changed := func(e ast.Expr) {
		if id := n.storage(e); id != nil {
			assigned[n.info.Uses[id]] = true
		}
	}
	walk(n.tree, func(m ast.Node, above []ast.Node) {
		switch m := m.(type) {
		case *ast.Ident:
			if o := n.info.Uses[m]; owner[o] != nil && innermostFunction(above) != owner[o] {
				n.results[o] = true
			}
		case *ast.FuncDecl:
			n.ownResults(m.Type, m, owner)
		case *ast.FuncLit:
			n.ownResults(m.Type, m, owner)
		case *ast.AssignStmt:
			for _, x := range m.Lhs {
				changed(x)
			}
		case *ast.IncDecStmt:
			changed(m.X)
		case *ast.UnaryExpr:
			if m.Op == token.AND {
				changed(m.X)
			}
		case *ast.RangeStmt:
			b, ok := n.under(m.X).(*types.Basic)
			n.rewritten[m] = &rangeFacts{text: ok && b.Info()&types.IsString != 0}
			if m.Tok == token.ASSIGN {
				changed(m.Key)
				if m.Value != nil {
					changed(m.Value)
				}
			}
		}
	})
	for m, facts := range n.rewritten {
		for _, e := range []ast.Expr{m.Key, m.Value} {
			if id, ok := e.(*ast.Ident); ok && m.Tok == token.DEFINE && assigned[n.info.Defs[id]] {
				facts.assigned = true
			}
		}
	}
}

func (n *normaliser) ownResults(t *ast.FuncType, fn ast.Node, owner map[types.Object]ast.Node) {
	for _, r := range fields(t.Results) {
		if r.name != nil && r.name.Name != "_" {
			owner[n.info.Defs[r.name]] = fn
		}
	}
}

func innermostFunction(above []ast.Node) ast.Node {
	for i := len(above) - 1; i >= 0; i-- {
		switch above[i].(type) {
		case *ast.FuncDecl, *ast.FuncLit:
			return above[i]
		}
	}
	return nil
}

// rename gives new names to variables, constants and functions that hide a
// package, a predeclared name or, from within a function, a declaration at top
// level; and to the named results that function literals use.
func (n *normaliser) rename() {
	names := map[types.Object]string{}
	top := n.pkg.Scope()
	hides := func(o types.Object) bool {
		if o.Name() == "_" {
			return false
		}
		if types.Universe.Lookup(o.Name()) != nil || available.Path(o.Name()) != "" {
			return true
		}
		return o.Parent() != top && top.Lookup(o.Name()) != nil
	}
	consider := func(o types.Object) {
		switch v := o.(type) {
		case *types.Var:
			if v.IsField() {
				return
			}
		case *types.Const:
		case *types.Func:
			if v.Signature().Recv() != nil {
				return
			}
		default:
			return
		}
		if names[o] == "" && (hides(o) || n.results[o]) {
			names[o] = o.Name()
		}
	}
	// In order of the text, so that new names are always the same.
	ast.Inspect(n.tree, func(m ast.Node) bool {
		if id, ok := m.(*ast.Ident); ok {
			if o := n.info.Defs[id]; o != nil {
				consider(o)
				if names[o] == o.Name() {
					names[o] = n.temporary(o.Name())
				}
			}
		}
		if o := n.info.Implicits[m]; o != nil {
			if _, clause := m.(*ast.CaseClause); clause {
				n.taken[o.Name()] = true
			}
		}
		return true
	})
	ast.Inspect(n.tree, func(m ast.Node) bool {
		if id, ok := m.(*ast.Ident); ok {
			if name := names[n.object(id)]; name != "" {
				id.Name = name
			}
		}
		return true
	})
}

// addImports imports the packages of types that only folded constants name.
func (n *normaliser) addImports() {
	for _, s := range n.tree.Imports {
		if path, err := strconv.Unquote(s.Path.Value); err == nil {
			delete(n.need, path)
		}
	}
	for _, p := range available.Packages {
		name, ok := n.need[p.Path]
		if !ok {
			continue
		}
		spec := &ast.ImportSpec{Name: ident(name, n.tree.Name.End()), Path: &ast.BasicLit{ValuePos: n.tree.Name.End(), Kind: token.STRING, Value: strconv.Quote(p.Path)}}
		d := &ast.GenDecl{TokPos: n.tree.Name.End(), Tok: token.IMPORT, Specs: []ast.Spec{spec}}
		n.tree.Imports = append(n.tree.Imports, spec)
		n.tree.Decls = append([]ast.Decl{d}, n.tree.Decls...)
	}
}

// functions lowers the bodies of all functions, inner ones first.
func (n *normaliser) functions() {
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		switch f := cur.Node().(type) {
		case *ast.FuncDecl:
			n.lower(f.Type, f.Body, false)
		case *ast.FuncLit:
			n.lower(f.Type, f.Body, true)
		}
		return true
	})
}

// copyCaptured wraps each function literal that needs it into a call that
// makes the copies:
//
//	func() T { k_1 := k; return func… k_1 … }()
func (n *normaliser) copyCaptured() {
	astutil.Apply(n.tree, nil, func(cur *astutil.Cursor) bool {
		lit, ok := cur.Node().(*ast.FuncLit)
		if !ok || n.copies[lit] == nil {
			return true
		}
		pos := lit.Pos()
		var body []ast.Stmt
		for _, v := range n.copies[lit] {
			name := n.temporary(v.Name())
			original := v.Name()
			ast.Inspect(lit.Body, func(m ast.Node) bool {
				if id, ok := m.(*ast.Ident); ok && n.info.Uses[id] == v {
					original = id.Name // v may have been renamed
					id.Name = name
					delete(n.info.Uses, id)
				}
				return true
			})
			from := ident(original, pos)
			n.info.Uses[from] = v
			body = append(body, define(pos, name, from))
		}
		body = append(body, &ast.ReturnStmt{Return: pos, Results: []ast.Expr{lit}})
		wrapper := &ast.FuncLit{
			Type: &ast.FuncType{Func: pos, Params: &ast.FieldList{Opening: pos, Closing: pos}, Results: &ast.FieldList{List: []*ast.Field{{Type: lit.Type}}}},
			Body: &ast.BlockStmt{Lbrace: pos, List: body, Rbrace: pos},
		}
		cur.Replace(&ast.CallExpr{Fun: wrapper, Lparen: pos, Rparen: pos})
		return true
	})
}
