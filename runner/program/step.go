package program

import (
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
	"regexp"
	"strings"

	"rimlight/runner/diag"
)

// stepRules finds the steps and holds them to their rules: named parameters
// and results, error last and called err, and data in all others.
func (c *checker) stepRules() {
	for _, d := range c.tree.Decls {
		f, ok := d.(*ast.FuncDecl)
		if !ok || f.Recv != nil || !f.Name.IsExported() {
			continue
		}
		c.steps = append(c.steps, f)
		for _, p := range fields(f.Type.Params) {
			c.parameter(f, p)
		}
		c.results(f)
	}
}

// A field is one name of a parameter or result list with its type; name is nil
// when there is none.
type field struct {
	name *ast.Ident
	typ  ast.Expr
}

func fields(list *ast.FieldList) []field {
	var out []field
	if list == nil {
		return nil
	}
	for _, f := range list.List {
		for _, n := range f.Names {
			out = append(out, field{n, f.Type})
		}
		if f.Names == nil {
			out = append(out, field{nil, f.Type})
		}
	}
	return out
}

func (c *checker) parameter(f *ast.FuncDecl, p field) {
	const wired = "a parameter is filled by the input, setting or earlier result of its name"
	switch {
	case p.name == nil:
		c.refuse(p.typ, "name it: "+wired, "a parameter of step %s has no name", f.Name.Name)
		return
	case p.name.Name == "_":
		c.refuse(p.name, "leave it out, or name it: "+wired, "a parameter of step %s is blank", f.Name.Name)
		return
	}
	if e, ok := p.typ.(*ast.Ellipsis); ok {
		c.refuse(p.typ, fmt.Sprintf("write %s []%s", p.name.Name, exprText(e.Elt)), "step %s is variadic", f.Name.Name)
		return
	}
	c.data(p.typ, "parameter "+p.name.Name)
}

func (c *checker) results(f *ast.FuncDecl) {
	list := fields(f.Type.Results)
	if len(list) == 0 {
		c.refuse(f.Name, "write func "+f.Name.Name+"(…) (name T, err error); begin the names of helpers in lower case", "step %s has no result", f.Name.Name)
		return
	}
	unnamed := false
	for i, r := range list {
		if r.name == nil || r.name.Name == "_" {
			unnamed = true
			continue
		}
		last := i == len(list)-1
		isErr := isError(c.info.TypeOf(r.typ))
		switch {
		case isErr && !last:
			c.refuse(r.name, "only the last result may be err error", "result %s of step %s is an error", r.name.Name, f.Name.Name)
		case isErr && r.name.Name != "err":
			c.refuse(r.name, "call it err", "the error of step %s is called %s", f.Name.Name, r.name.Name)
		case !isErr && r.name.Name == "err":
			c.refuse(r.name, "err is the name of the error: call the result otherwise", "result err of step %s is no error", f.Name.Name)
		case !isErr:
			c.data(r.typ, "result "+r.name.Name)
		}
	}
	if unnamed {
		c.refuse(f.Type.Results, "results are known to later steps by name: write "+c.named(list), "results of step %s have no names", f.Name.Name)
	}
}

// named is the rewrite of a result list that lacks names.
func (c *checker) named(list []field) string {
	var parts []string
	for i, r := range list {
		name := "name"
		switch {
		case r.name != nil && r.name.Name != "_":
			name = r.name.Name
		case isError(c.info.TypeOf(r.typ)):
			name = "err"
		case len(list) > 2:
			name = fmt.Sprintf("name%d", i+1)
		}
		parts = append(parts, name+" "+exprText(r.typ))
	}
	return "(" + strings.Join(parts, ", ") + ")"
}

func isError(t types.Type) bool {
	return t != nil && types.Identical(t, types.Universe.Lookup("error").Type())
}

// data refuses a parameter or result whose type is not data.
func (c *checker) data(e ast.Expr, what string) {
	t := c.info.TypeOf(e)
	if t == nil {
		return
	}
	if why := notData(t, map[types.Type]bool{}); why != "" {
		c.refuse(e, "steps hand on numbers, booleans, strings, and slices, arrays, maps and structs of them", "%s of type %s %s", what, c.typeName(t), why)
	}
}

// notData says why a value of type t cannot be kept as data, "" when it can.
// above holds the types that t is part of.
func notData(t types.Type, above map[types.Type]bool) string {
	if above[t] {
		return "contains itself"
	}
	above[t] = true
	defer delete(above, t)
	switch u := t.Underlying().(type) {
	case *types.Basic:
		switch {
		case u.Kind() == types.Invalid:
			return ""
		case u.Kind() == types.UnsafePointer, u.Kind() == types.Uintptr:
			return "holds an address"
		case u.Info()&types.IsComplex != 0:
			return "holds complex numbers; use two float64"
		}
		return ""
	case *types.Slice:
		return notData(u.Elem(), above)
	case *types.Array:
		return notData(u.Elem(), above)
	case *types.Map:
		if b, ok := u.Key().Underlying().(*types.Basic); !ok || b.Info()&(types.IsString|types.IsInteger) == 0 {
			return "has a map whose keys are neither strings nor integers"
		}
		return notData(u.Elem(), above)
	case *types.Struct:
		for i := 0; i < u.NumFields(); i++ {
			f := u.Field(i)
			if !f.Exported() {
				return fmt.Sprintf("has the field %s, which is not exported and would be lost", f.Name())
			}
			if why := notData(f.Type(), above); why != "" {
				return fmt.Sprintf("has the field %s, which %s", f.Name(), why)
			}
		}
		return ""
	case *types.Pointer:
		return "holds a pointer; use the value itself"
	case *types.Signature:
		return "holds a function"
	case *types.Chan:
		return "holds a channel"
	case *types.Interface:
		return "holds an interface, whose content could be of any type"
	}
	return "is not data"
}

// typeName is the type as a recipe writes it.
func (c *checker) typeName(t types.Type) string {
	return types.TypeString(t, func(p *types.Package) string {
		if p == c.pkg {
			return ""
		}
		return p.Name()
	})
}

// typePath is the type with full import paths.
func (c *checker) typePath(t types.Type) string {
	return types.TypeString(t, func(p *types.Package) string {
		if p == c.pkg {
			return ""
		}
		return p.Path()
	})
}

// step describes a step that has passed the rules, all but its code.
func (c *checker) step(f *ast.FuncDecl) Step {
	s := Step{Name: f.Name.Name, Doc: strings.TrimSpace(f.Doc.Text()), Signature: signatureText(f), Pos: c.at(f.Name.Pos())}
	variable := func(list []Var, v field) []Var {
		if v.name == nil { // a fault, already told
			return list
		}
		return append(list, Var{v.name.Name, c.typePath(c.info.TypeOf(v.typ)), c.at(v.name.Pos())})
	}
	for _, p := range fields(f.Type.Params) {
		s.Params = variable(s.Params, p)
	}
	for _, r := range fields(f.Type.Results) {
		if isError(c.info.TypeOf(r.typ)) {
			s.Err = true
			continue
		}
		s.Results = variable(s.Results, r)
	}
	if f.Doc != nil {
		for _, line := range f.Doc.List {
			if e := parseEach(line.Text); e != nil {
				e.Pos = c.at(line.Pos())
				s.Each = e
			}
		}
	}
	return s
}

var eachForm = regexp.MustCompile(`^//each:([\pL_][\pL\pN_]*)\s+in\s+([\pL_][\pL\pN_]*)\s*$`)

func parseEach(text string) *Each {
	m := eachForm.FindStringSubmatch(text)
	if m == nil {
		return nil
	}
	return &Each{Element: m[1], Collection: m[2]}
}

// nearlyEach matches comments that are meant as the directive.
var nearlyEach = regexp.MustCompile(`(?i)^//each\b|^//\s*each\s*:\s*\S+\s+in\s`)

// directives checks every comment that is or looks like //each:.
func (c *checker) directives() {
	owner := map[*ast.Comment]*ast.FuncDecl{}
	for _, f := range c.steps {
		if f.Doc != nil {
			for _, line := range f.Doc.List {
				owner[line] = f
			}
		}
	}
	const form = "write //each:element in collection, where element is a parameter and collection an earlier result"
	first := map[*ast.FuncDecl]bool{}
	for _, g := range c.tree.Comments {
		for _, line := range g.List {
			if !nearlyEach.MatchString(line.Text) {
				continue
			}
			f := owner[line]
			e := parseEach(line.Text)
			switch {
			case e == nil:
				c.refuse(line, form, "malformed directive %q", line.Text)
			case f == nil:
				c.refuse(line, "put it into the comment directly above an exported function", "directive %q belongs to no step", line.Text)
			case first[f]:
				c.refuse(line, "a step runs over one collection", "step %s has a second directive //each:", f.Name.Name)
			default:
				first[f] = true
				c.element(f, e, line)
			}
		}
	}
}

// element checks that the element of a directive is a parameter.
func (c *checker) element(f *ast.FuncDecl, e *Each, at *ast.Comment) {
	var names []string
	for _, p := range fields(f.Type.Params) {
		if p.name == nil {
			continue
		}
		if p.name.Name == e.Element {
			return
		}
		names = append(names, p.name.Name)
	}
	pos := c.at(at.Pos() + token.Pos(len("//each:")))
	expected := "the step has no parameters"
	if len(names) > 0 {
		expected = "the parameters are " + strings.Join(names, ", ")
	}
	c.diags.Add(pos, fmt.Sprintf("%s is no parameter of step %s", e.Element, f.Name.Name), expected, diag.Nearest(e.Element, names))
}
