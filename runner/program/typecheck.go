package program

import (
	"go/ast"
	"go/token"
	"go/types"
	"regexp"
	"strings"

	"rimlight/runner/diag"
	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

// language is the version of Go that recipes are written in: the interpreter
// knows none later.
const language = "go1.20"

// typeCheck fills c.pkg and c.info and reports every type error.
func (c *checker) typeCheck() {
	c.info = &types.Info{
		Types:      map[ast.Expr]types.TypeAndValue{},
		Defs:       map[*ast.Ident]types.Object{},
		Uses:       map[*ast.Ident]types.Object{},
		Implicits:  map[ast.Node]types.Object{},
		Selections: map[*ast.SelectorExpr]*types.Selection{},
		Instances:  map[*ast.Ident]types.Instance{},
		Scopes:     map[ast.Node]*types.Scope{},
	}
	var errs []types.Error
	config := types.Config{
		GoVersion: language,
		Importer:  exportdata.NewImporter(),
		Sizes:     types.SizesFor("gc", "amd64"),
		Error: func(err error) {
			if e, ok := err.(types.Error); ok && len(errs) <= 2*maxFaults {
				errs = append(errs, e)
			}
		},
	}
	c.pkg, _ = config.Check("main", c.fset, []*ast.File{c.tree}, c.info) // errors went to config.Error
	for _, e := range errs {
		c.typeError(e)
	}
}

var (
	undefined = regexp.MustCompile(`^undefined: ([\pL_][\pL\pN_]*)(?:\.([\pL_][\pL\pN_]*))?`)
	noMember  = regexp.MustCompile(`^[^ ]+\.([\pL_][\pL\pN_]*) undefined \(`)
)

// typeError reports a type error in the compiler's words, with the nearest
// name where a name is not known.
func (c *checker) typeError(e types.Error) {
	if strings.HasPrefix(e.Msg, "\t") {
		return // the continuation of an earlier error
	}
	message, expected, nearest := e.Msg, "", ""
	if m := undefined.FindStringSubmatch(message); m != nil {
		qualifier := m[2] == "" && c.qualifies(e.Pos)
		if m[2] != "" {
			nearest = c.nearestMember(m[1], m[2])
		} else {
			nearest = c.nearestName(e.Pos, m[1], qualifier)
		}
		if qualifier && nearest == "" {
			_, expected, _ = unavailable(m[1])
		}
	} else if m := noMember.FindStringSubmatch(message); m != nil && !strings.Contains(message, "but does have") {
		nearest = c.nearestSelection(e.Pos, m[1])
	}
	for _, h := range hints {
		if expected == "" && nearest == "" && h.message.MatchString(message) {
			expected = h.message.ReplaceAllString(h.message.FindString(message), h.instead)
		}
	}
	c.diags.Add(c.at(e.Pos), message, expected, nearest)
}

// hints say what to write instead where the compiler's words do not.
var hints = []struct {
	message *regexp.Regexp
	instead string
}{
	{regexp.MustCompile(`^declared and not used: (\w+)`), "leave it out, or write _ = $1"},
	{regexp.MustCompile(`^result parameter (\w+) not in scope at return`), "another $1 hides it: write = instead of :=, or return the values"},
	{regexp.MustCompile(`^cannot range over (.*) \(.*requires go1\.22.*`), "write for i := 0; i < $1; i++"},
	{regexp.MustCompile(`^cannot range over .*requires go1\.23.*`), "write a loop with a condition"},
	{regexp.MustCompile(`^(?:built-in )?(min|max) requires go1\.21.*`), "use math.Min or math.Max, or write the function"},
	{regexp.MustCompile(`^(?:built-in )?clear requires go1\.21.*`), "make a new map or slice"},
	{regexp.MustCompile(`\(mismatched types (?:untyped )?(?:int|float64)(?: constant)? and (?:int|float64)\)`), "convert one of them: float64(n)"},
	{regexp.MustCompile(`^missing return`), "end the function with return"},
	{regexp.MustCompile(`^(\w+) redeclared in this block`), "choose another name, or write = instead of :="},
	{regexp.MustCompile(`^no new variables on left side of :=`), "write = instead of :="},
	{regexp.MustCompile(`^cannot use .* \(.* of type (?:int|float64)\) as (int|float64) value`), "convert it: $1(…)"},
}

// qualifies reports whether the identifier at pos stands before a dot, as a
// package does.
func (c *checker) qualifies(pos token.Pos) bool {
	found := false
	ast.Inspect(c.tree, func(n ast.Node) bool {
		if s, ok := n.(*ast.SelectorExpr); ok {
			if id, ok := s.X.(*ast.Ident); ok && id.Pos() == pos {
				found = true
			}
		}
		return !found
	})
	return found
}

// nearestName looks among what is in scope at pos and the packages; for a name
// before a dot, among variables and packages.
func (c *checker) nearestName(pos token.Pos, name string, qualifier bool) string {
	known := map[string]bool{}
	scope := c.pkg.Scope().Innermost(pos)
	if scope == nil {
		scope = c.pkg.Scope()
	}
	for s := scope; s != nil; s = s.Parent() {
		for _, n := range s.Names() {
			o := s.Lookup(n)
			if _, variable := o.(*types.Var); qualifier && !variable {
				continue
			}
			if s == types.Universe || s == c.pkg.Scope() || o.Pos() < pos {
				known[n] = true
			}
		}
	}
	for _, p := range available.Packages {
		if exportdata.Has(p.Path) {
			known[p.Name] = true
		}
	}
	return nearestOf(name, known)
}

// nearestMember looks among the exported names of a package.
func (c *checker) nearestMember(pkg, name string) string {
	for _, imported := range c.pkg.Imports() {
		if imported.Name() != pkg {
			continue
		}
		known := map[string]bool{}
		for _, n := range imported.Scope().Names() {
			if token.IsExported(n) {
				known[n] = true
			}
		}
		return nearestOf(name, known)
	}
	return ""
}

// nearestSelection looks among the fields and methods of the value whose
// selector stands at pos.
func (c *checker) nearestSelection(pos token.Pos, name string) (nearest string) {
	ast.Inspect(c.tree, func(n ast.Node) bool {
		s, ok := n.(*ast.SelectorExpr)
		if !ok || s.Sel.Pos() != pos && s.Pos() != pos || s.Sel.Name != name {
			return true
		}
		t := c.info.TypeOf(s.X)
		if t == nil {
			return true
		}
		known := map[string]bool{}
		base := t
		if p, ok := t.Underlying().(*types.Pointer); ok {
			base = p.Elem()
		}
		if st, ok := base.Underlying().(*types.Struct); ok {
			for i := 0; i < st.NumFields(); i++ {
				known[st.Field(i).Name()] = true
			}
		}
		set := types.NewMethodSet(types.NewPointer(base))
		for i := 0; i < set.Len(); i++ {
			known[set.At(i).Obj().Name()] = true
		}
		nearest = nearestOf(name, known)
		return true
	})
	return nearest
}

func nearestOf(name string, known map[string]bool) string {
	var list []string
	for k := range known {
		if k != "_" && k != name {
			list = append(list, k)
		}
	}
	return diag.Nearest(name, list)
}
