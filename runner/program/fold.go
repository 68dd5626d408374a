package program

import (
	"go/ast"
	"go/constant"
	"go/token"
	"go/types"
	"strconv"
	"strings"

	"golang.org/x/tools/go/ast/astutil"
)

// fold replaces every constant expression by a literal of its final type and
// drops the declarations of constants.
func (n *normaliser) fold() {
	astutil.Apply(n.tree, func(cur *astutil.Cursor) bool {
		switch m := cur.Node().(type) {
		case *ast.GenDecl:
			if m.Tok == token.CONST {
				cur.Delete() // at top level; others are below a DeclStmt
				return false
			}
		case *ast.DeclStmt:
			if d, ok := m.Decl.(*ast.GenDecl); ok && d.Tok == token.CONST {
				cur.Replace(&ast.EmptyStmt{Semicolon: m.Pos()})
				return false
			}
		case ast.Expr:
			tv, ok := n.info.Types[m]
			if !ok || tv.Value == nil {
				return true
			}
			if l := n.literal(m.Pos(), tv); l != nil {
				cur.Replace(l)
			}
			return false
		}
		return true
	}, nil)
}

// literal writes a constant as an expression of its type: 1.5, int64(3),
// T(0.5). It returns nil for a type that constants do not have.
func (n *normaliser) literal(pos token.Pos, tv types.TypeAndValue) ast.Expr {
	b, ok := tv.Type.Underlying().(*types.Basic)
	if !ok {
		return nil
	}
	convert := func(to ast.Expr, x ast.Expr) ast.Expr {
		return &ast.CallExpr{Fun: to, Lparen: pos, Args: []ast.Expr{x}, Rparen: pos}
	}
	integer := func() ast.Expr { return number(pos, token.INT, constant.ToInt(tv.Value).ExactString()) }
	var e ast.Expr
	kind := b.Kind()
	switch {
	case b.Info()&types.IsBoolean != 0:
		e = ident(strconv.FormatBool(constant.BoolVal(tv.Value)), pos)
	case b.Info()&types.IsString != 0:
		e = &ast.BasicLit{ValuePos: pos, Kind: token.STRING, Value: strconv.Quote(constant.StringVal(tv.Value))}
	case kind == types.Int, kind == types.UntypedInt:
		e = integer()
	case kind == types.UntypedRune:
		e = convert(ident("int32", pos), integer())
	case b.Info()&types.IsInteger != 0:
		e = convert(ident(types.Typ[kind].Name(), pos), integer())
	case kind == types.Float32:
		e = convert(ident("float32", pos), number(pos, token.FLOAT, floatText(tv.Value, 32)))
	case b.Info()&types.IsFloat != 0:
		e = number(pos, token.FLOAT, floatText(tv.Value, 64))
	case b.Info()&types.IsComplex != 0:
		bits := 64
		if kind == types.Complex64 {
			bits = 32
		}
		v := constant.ToComplex(tv.Value)
		re := number(pos, token.FLOAT, floatText(constant.Real(v), bits))
		im := number(pos, token.IMAG, floatText(constant.Imag(v), bits)+"i")
		e = &ast.BinaryExpr{X: re, OpPos: pos, Op: token.ADD, Y: im}
		if kind == types.Complex64 {
			e = convert(ident("complex64", pos), e)
		}
	default:
		return nil
	}
	if t, ok := types.Unalias(tv.Type).(*types.Named); ok {
		to := ast.Expr(ident(t.Obj().Name(), pos))
		if p := t.Obj().Pkg(); p != nil && p != n.pkg {
			to = &ast.SelectorExpr{X: ident(p.Name(), pos), Sel: ident(t.Obj().Name(), pos)}
			n.need[p.Path()] = p.Name()
		}
		e = convert(to, e)
	}
	return e
}

// number is a numeric literal; a negative one is a negated literal.
func number(pos token.Pos, kind token.Token, text string) ast.Expr {
	if digits, negative := strings.CutPrefix(text, "-"); negative {
		return &ast.UnaryExpr{OpPos: pos, Op: token.SUB, X: &ast.BasicLit{ValuePos: pos, Kind: kind, Value: digits}}
	}
	return &ast.BasicLit{ValuePos: pos, Kind: kind, Value: text}
}

// floatText is the shortest decimal that gives the value back, with a point or
// an exponent.
func floatText(v constant.Value, bits int) string {
	f, _ := constant.Float64Val(constant.ToFloat(v))
	if bits == 32 {
		g, _ := constant.Float32Val(constant.ToFloat(v))
		f = float64(g)
	}
	s := strconv.FormatFloat(f, 'g', -1, 64)
	if !strings.ContainsAny(s, ".e") {
		s += ".0"
	}
	return s
}
