package program

import (
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
	"strings"
)

// A writer turns syntax trees into the text of the normal form. It prints
// every kind of node itself, so that the text does not change with the layout
// rules of a Go release.
type writer struct {
	strings.Builder
	info  *types.Info // for the values of constants; nil outside functions
	depth int
}

// exprText is the normal form of an expression or type.
func exprText(e ast.Expr) string {
	var w writer
	w.expr(e)
	return w.String()
}

// signatureText is the head of a function without its body.
func signatureText(f *ast.FuncDecl) string {
	var w writer
	w.head(f)
	return w.String()
}

func (w *writer) put(parts ...string) {
	for _, p := range parts {
		w.WriteString(p)
	}
}

func (w *writer) line() {
	w.put("\n", strings.Repeat("\t", w.depth))
}

func (w *writer) head(f *ast.FuncDecl) {
	w.put("func ")
	if f.Recv != nil {
		w.put("(")
		w.fieldList(f.Recv, ", ")
		w.put(") ")
	}
	w.put(f.Name.Name)
	w.signature(f.Type)
}

func (w *writer) signature(t *ast.FuncType) {
	w.put("(")
	w.fieldList(t.Params, ", ")
	w.put(")")
	if t.Results == nil || len(t.Results.List) == 0 {
		return
	}
	w.put(" ")
	if len(t.Results.List) == 1 && t.Results.List[0].Names == nil {
		w.expr(t.Results.List[0].Type)
		return
	}
	w.put("(")
	w.fieldList(t.Results, ", ")
	w.put(")")
}

// fieldList writes one "name type" per name, so that "a, b T" and "a T, b T"
// are the same.
func (w *writer) fieldList(list *ast.FieldList, separator string) {
	for i, f := range fields(list) {
		if i > 0 {
			w.put(separator)
		}
		if f.name != nil {
			w.put(f.name.Name, " ")
		}
		w.expr(f.typ)
	}
}

// Precedences above those of binary operators.
const (
	unaryLevel   = token.UnaryPrec
	primaryLevel = token.HighestPrec
)

func level(e ast.Expr) int {
	switch e := e.(type) {
	case *ast.ParenExpr:
		return level(e.X)
	case *ast.BinaryExpr:
		return e.Op.Precedence()
	case *ast.UnaryExpr, *ast.StarExpr:
		return unaryLevel
	case *ast.FuncType, *ast.ChanType:
		return unaryLevel
	}
	return primaryLevel
}

// operand writes e, in parentheses when it binds less tightly than min.
func (w *writer) operand(e ast.Expr, min int) {
	if level(e) < min {
		w.put("(")
		w.expr(e)
		w.put(")")
		return
	}
	w.expr(e)
}

func (w *writer) list(list []ast.Expr) {
	for i, e := range list {
		if i > 0 {
			w.put(", ")
		}
		w.expr(e)
	}
}

func (w *writer) expr(e ast.Expr) {
	switch e := e.(type) {
	case nil:
	case *ast.ParenExpr:
		w.expr(e.X)
	case *ast.Ident:
		w.put(e.Name)
	case *ast.BasicLit:
		w.put(literalText(e))
	case *ast.BinaryExpr:
		p := e.Op.Precedence()
		w.operand(e.X, p)
		w.put(" ", e.Op.String(), " ")
		w.operand(e.Y, p+1)
	case *ast.UnaryExpr:
		w.put(e.Op.String())
		min := unaryLevel
		if _, again := ast.Unparen(e.X).(*ast.UnaryExpr); again {
			min = primaryLevel
		}
		w.operand(e.X, min)
	case *ast.StarExpr:
		w.put("*")
		w.operand(e.X, unaryLevel)
	case *ast.SelectorExpr:
		w.operand(e.X, primaryLevel)
		w.put(".", e.Sel.Name)
	case *ast.IndexExpr:
		w.operand(e.X, primaryLevel)
		w.put("[")
		w.expr(e.Index)
		w.put("]")
	case *ast.IndexListExpr:
		w.operand(e.X, primaryLevel)
		w.put("[")
		w.list(e.Indices)
		w.put("]")
	case *ast.SliceExpr:
		w.operand(e.X, primaryLevel)
		w.put("[")
		w.expr(e.Low)
		w.put(":")
		w.expr(e.High)
		if e.Slice3 {
			w.put(":")
			w.expr(e.Max)
		}
		w.put("]")
	case *ast.TypeAssertExpr:
		w.operand(e.X, primaryLevel)
		w.put(".(")
		if e.Type == nil {
			w.put("type")
		}
		w.expr(e.Type)
		w.put(")")
	case *ast.CallExpr:
		w.operand(e.Fun, primaryLevel)
		w.put("(")
		w.list(e.Args)
		if e.Ellipsis.IsValid() {
			w.put("...")
		}
		w.put(")")
	case *ast.CompositeLit:
		w.expr(e.Type)
		w.put("{")
		w.list(e.Elts)
		w.put("}")
	case *ast.KeyValueExpr:
		w.expr(e.Key)
		w.put(": ")
		w.expr(e.Value)
	case *ast.FuncLit:
		w.put("func")
		w.signature(e.Type)
		w.put(" ")
		w.block(e.Body)
	default:
		w.typ(e)
	}
}

// typ writes the expressions that are types only.
func (w *writer) typ(e ast.Expr) {
	switch e := e.(type) {
	case *ast.ArrayType:
		w.put("[")
		w.expr(e.Len)
		w.put("]")
		w.expr(e.Elt)
	case *ast.Ellipsis:
		w.put("...")
		w.expr(e.Elt)
	case *ast.MapType:
		w.put("map[")
		w.expr(e.Key)
		w.put("]")
		w.expr(e.Value)
	case *ast.ChanType:
		w.put("chan ", fmt.Sprint(int(e.Dir)), " ")
		w.expr(e.Value)
	case *ast.FuncType:
		w.put("func")
		w.signature(e)
	case *ast.StructType:
		w.put("struct{")
		w.fieldList(e.Fields, "; ")
		w.put("}")
	case *ast.InterfaceType:
		w.put("interface{")
		for i, m := range fields(e.Methods) {
			if i > 0 {
				w.put("; ")
			}
			if t, ok := m.typ.(*ast.FuncType); ok && m.name != nil {
				w.put(m.name.Name)
				w.signature(t)
				continue
			}
			w.expr(m.typ)
		}
		w.put("}")
	default:
		panic(fmt.Sprintf("program: expression %T has no normal form", e))
	}
}

// literalText is a literal with the freedom of spelling that formatting leaves
// taken out.
func literalText(l *ast.BasicLit) string {
	switch l.Kind {
	case token.INT, token.FLOAT, token.IMAG:
		return strings.ToLower(strings.ReplaceAll(l.Value, "_", ""))
	}
	return l.Value
}
