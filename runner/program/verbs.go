package program

import (
	"go/ast"
	"go/constant"
	"go/types"
	"strings"
	"unicode/utf8"
)

// verbs holds the constant format of a call of package fmt against the values
// printed with it. fmt writes the names of types where a verb does not suit its
// value or a value has no verb, and those are not the same in the interpreter.
func (l *linter) verbs(call *ast.CallExpr) {
	fn := l.callee(call)
	if fn == nil || fn.Pkg() == nil || fn.Pkg().Path() != "fmt" || !strings.HasSuffix(fn.Name(), "f") || call.Ellipsis.IsValid() {
		return
	}
	fixed := fn.Signature().Params().Len() - 1
	if fixed < 1 || len(call.Args) < fixed {
		return
	}
	at, args := call.Args[fixed-1], call.Args[fixed:]
	format, ok := l.formatText(at)
	if !ok {
		return
	}
	next, most := 0, 0
	take := func() ast.Expr {
		if next++; next > len(args) {
			return nil
		}
		most = max(most, next)
		return args[next-1]
	}
	for i := 0; i < len(format); i++ {
		if format[i] != '%' {
			continue
		}
		start := i
		for i++; i < len(format) && strings.IndexByte("+-# 0123456789.*[]", format[i]) >= 0; i++ {
			switch format[i] {
			case '[':
				l.refuse(at, "give the values in the order of the verbs", "argument numbers in a format are not available")
				return
			case '*':
				if e := take(); e != nil && !types.Identical(l.info.TypeOf(e).Underlying(), types.Typ[types.Int]) && l.info.Types[e].Value == nil {
					l.refuse(e, "write int(…)", "a width or precision is of type %s", l.typeName(l.info.TypeOf(e)))
				}
			}
		}
		if i >= len(format) {
			l.refuse(at, "write %% for a percent sign", "the format ends within a verb")
			return
		}
		verb, size := utf8.DecodeRuneInString(format[i:])
		i += size - 1
		if verb == '%' {
			continue
		}
		e := take()
		if e == nil {
			l.refuse(at, "give a value for each verb", "there is no value for %s", format[start:i+1])
			return
		}
		if t := l.info.TypeOf(e); !suits(verb, t, map[types.Type]bool{}) {
			l.refuse(e, "use %v, or a verb for values of this type", "%s does not print values of type %s", format[start:i+1], l.typeName(t))
		}
	}
	if most < len(args) {
		l.refuse(args[most], "write a verb for each value", "the format has no verb for this value")
	}
}

// suits reports whether fmt prints a t with the verb.
func suits(verb rune, t types.Type, seen map[types.Type]bool) bool {
	if strings.ContainsRune("vpT", verb) || t == nil || seen[t] { // %p and %T are refused anyway
		return true
	}
	seen[t] = true
	in := func(list string) bool { return strings.ContainsRune(list, verb) }
	switch u := t.Underlying().(type) {
	case *types.Basic:
		switch {
		case u.Info()&types.IsBoolean != 0:
			return verb == 't'
		case u.Info()&types.IsInteger != 0:
			return in("bcdoOqxXU")
		case u.Info()&types.IsNumeric != 0:
			return in("beEfFgGxX")
		case u.Info()&types.IsString != 0:
			return in("sqxX")
		}
		return u.Kind() == types.UntypedNil
	case *types.Pointer:
		return suits(verb, u.Elem(), seen)
	case *types.Slice:
		return isBytes(u.Elem()) && in("sqxX") || suits(verb, u.Elem(), seen)
	case *types.Array:
		return isBytes(u.Elem()) && in("sqxX") || suits(verb, u.Elem(), seen)
	case *types.Map:
		return suits(verb, u.Key(), seen) && suits(verb, u.Elem(), seen)
	case *types.Struct:
		for i := 0; i < u.NumFields(); i++ {
			if !suits(verb, u.Field(i).Type(), seen) {
				return false
			}
		}
		return true
	case *types.Interface:
		return isError(t) && in("swqxX")
	}
	return false
}

func isBytes(t types.Type) bool {
	b, ok := t.Underlying().(*types.Basic)
	return ok && b.Kind() == types.Uint8
}

// formatText is the value of a constant format.
func (c *checker) formatText(e ast.Expr) (text string, ok bool) {
	v := c.info.Types[e].Value
	if v == nil || v.Kind() != constant.String {
		return "", false
	}
	return constant.StringVal(v), true
}
