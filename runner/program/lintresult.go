package program

import (
	"fmt"
	"go/ast"
	"go/types"
	"regexp"

	"rimlight/runner/program/available"
)

// result refuses code whose outcome is not a function of the step's arguments,
// or that acts otherwise than by its results.
func (l *linter) result(n ast.Node, above []ast.Node) {
	l.order(n)
	switch n := n.(type) {
	case *ast.RangeStmt:
		switch l.under(n.X).(type) {
		case *types.Map:
			if !l.sortsKeys(n, above) {
				l.refuse(n, "collect the keys alone: var keys []string; for k := range m { keys = append(keys, k) }; sort.Strings(keys); and range over them", "the order of a range over a map differs from run to run")
			}
		case *types.Chan:
			l.refuse(n, "use a slice", "channels are not available to recipes")
		}
	case *ast.GoStmt:
		l.refuse(n, "call the function directly; fan a step out with //each:", "go statements are not available: their order differs from run to run")
	case *ast.SelectStmt:
		l.refuse(n, "call functions directly", "select is not available: it takes a ready case at random")
	case *ast.SendStmt:
		l.refuse(n, "use a slice", "channels are not available to recipes")
	case *ast.ChanType:
		l.refuse(n, "use a slice", "channels are not available to recipes")
	case *ast.Ident:
		l.use(n, above)
	case *ast.CallExpr:
		l.format(n)
	}
}

// use looks at what an identifier names.
func (l *linter) use(id *ast.Ident, above []ast.Node) {
	switch o := l.info.Uses[id].(type) {
	case *types.Func:
		if why := available.Withheld(o.FullName()); why != "" && !l.writesText(o, above) {
			l.refuse(id, why, "%s is not available to recipes", o.FullName())
		}
	case *types.Var:
		if l.foreign(o) && !o.IsField() && o.Parent() == o.Pkg().Scope() && !isError(o.Type()) {
			l.refuse(id, "set the value in the recipe", "%s.%s is a variable shared by all steps", o.Pkg().Name(), o.Name())
		}
	case *types.Builtin:
		switch o.Name() {
		case "print", "println":
			l.refuse(id, "return the text as a result", "%s is not available: a step has no output but its results", o.Name())
		case "cap":
			l.refuse(id, "keep the count yourself, or use len", "cap is not available: it depends on the allocator")
		}
	}
}

// addressVerb matches the verbs that print addresses or the names of types,
// which differ between the interpreter and compiled Go.
var addressVerb = regexp.MustCompile(`%[-+# 0-9.\[\]*]*[Tp]|%[-0-9.\[\]]*[+#][-+# 0-9.\[\]]*v`)

// format looks at calls of the printing functions of package fmt.
func (l *linter) format(call *ast.CallExpr) {
	fn := l.callee(call)
	if fn == nil || fn.Pkg() == nil || fn.Pkg().Path() != "fmt" || available.Withheld(fn.FullName()) != "" && !l.writesTextTo(fn, call) {
		return
	}
	sig := fn.Signature()
	if !sig.Variadic() {
		return
	}
	fixed := sig.Params().Len() - 1
	if len(call.Args) < fixed {
		return // the arguments are the results of another call
	}
	if name := fn.Name(); name == "Sprintf" || name == "Errorf" || name == "Appendf" || name == "Fprintf" {
		f := call.Args[fixed-1]
		text, ok := l.formatText(f)
		if verb := addressVerb.FindString(text); !ok {
			l.refuse(f, "write the format as a literal or constant", "the format of %s is not a constant", name)
		} else if verb != "" {
			l.refuse(f, "print the fields, or use %v", "format %s prints addresses or names of types", verb)
		}
	}
	if call.Ellipsis.IsValid() {
		l.refuse(call.Args[len(call.Args)-1], "list the values", "what %s prints is hidden in a slice", fn.Name())
		return
	}
	for _, a := range call.Args[fixed:] {
		t := l.info.TypeOf(a)
		if tuple, ok := t.(*types.Tuple); ok {
			for i := 0; i < tuple.Len(); i++ {
				l.printable(a, tuple.At(i).Type())
			}
			continue
		}
		l.printable(a, t)
	}
}

func (l *linter) printable(at ast.Expr, t types.Type) {
	if why := notPrintable(t, true, map[types.Type]bool{}); why != "" {
		l.refuse(at, "print its parts", "a value of type %s has no printed form that is the same in every run: %s", l.typeName(t), why)
	}
}

// notPrintable says why the printed form of a t is not determined by its
// value. A pointer to a struct prints as the struct at the top, as an address
// below.
func notPrintable(t types.Type, top bool, seen map[types.Type]bool) string {
	if t == nil || seen[t] {
		return ""
	}
	seen[t] = true
	switch u := t.Underlying().(type) {
	case *types.Pointer:
		if _, ok := u.Elem().Underlying().(*types.Struct); ok && top {
			return notPrintable(u.Elem(), false, seen)
		}
		return "it holds a pointer"
	case *types.Signature:
		return "it holds a function"
	case *types.Chan:
		return "it holds a channel"
	case *types.Interface:
		if isError(t) {
			return ""
		}
		return "it holds an interface"
	case *types.Slice:
		return notPrintable(u.Elem(), false, seen)
	case *types.Array:
		return notPrintable(u.Elem(), false, seen)
	case *types.Map:
		if b, ok := u.Key().Underlying().(*types.Basic); ok && b.Info()&(types.IsFloat|types.IsComplex) != 0 {
			return "its keys could be NaN, in any order"
		}
		if why := notPrintable(u.Key(), false, seen); why != "" {
			return why
		}
		return notPrintable(u.Elem(), false, seen)
	case *types.Struct:
		for i := 0; i < u.NumFields(); i++ {
			if why := notPrintable(u.Field(i).Type(), false, seen); why != "" {
				return fmt.Sprintf("field %s: %s", u.Field(i).Name(), why)
			}
		}
	case *types.Basic:
		if u.Kind() == types.UnsafePointer || u.Kind() == types.Uintptr {
			return "it is an address"
		}
	}
	return ""
}

// writesText reports whether fn, named at the end of above, is called to print
// into a strings.Builder, which normalise.go rewrites.
func (l *linter) writesText(fn *types.Func, above []ast.Node) bool {
	for i := len(above) - 1; i >= max(len(above)-2, 0); i-- {
		if call, ok := above[i].(*ast.CallExpr); ok && l.callee(call) == fn {
			return l.writesTextTo(fn, call)
		}
	}
	return false
}

func (c *checker) writesTextTo(fn *types.Func, call *ast.CallExpr) bool {
	switch fn.FullName() {
	case "fmt.Fprint", "fmt.Fprintf", "fmt.Fprintln":
		if len(call.Args) > 0 {
			t := c.info.TypeOf(call.Args[0])
			return t != nil && types.TypeString(t, nil) == "*strings.Builder"
		}
	}
	return false
}
