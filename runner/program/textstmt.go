package program

import (
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
)

// block writes statements in braces, one per line.
func (w *writer) block(b *ast.BlockStmt) {
	w.put("{")
	w.body(b.List)
	w.line()
	w.put("}")
}

func (w *writer) body(list []ast.Stmt) {
	w.depth++
	for _, s := range list {
		if _, empty := s.(*ast.EmptyStmt); empty {
			continue
		}
		w.line()
		w.stmt(s)
	}
	w.depth--
}

func (w *writer) stmt(s ast.Stmt) {
	switch s := s.(type) {
	case *ast.EmptyStmt:
	case *ast.ExprStmt:
		w.expr(s.X)
	case *ast.AssignStmt:
		w.list(s.Lhs)
		w.put(" ", s.Tok.String(), " ")
		w.list(s.Rhs)
	case *ast.IncDecStmt:
		w.expr(s.X)
		w.put(s.Tok.String())
	case *ast.DeclStmt:
		w.decl(s.Decl.(*ast.GenDecl))
	case *ast.ReturnStmt:
		w.put("return")
		if len(s.Results) > 0 {
			w.put(" ")
		}
		w.list(s.Results)
	case *ast.BranchStmt:
		w.put(s.Tok.String())
		if s.Label != nil {
			w.put(" ", s.Label.Name)
		}
	case *ast.BlockStmt:
		w.block(s)
	case *ast.LabeledStmt:
		w.put(s.Label.Name, ": ")
		w.stmt(s.Stmt)
	case *ast.IfStmt:
		w.put("if ")
		w.header(s.Init)
		w.expr(s.Cond)
		w.put(" ")
		w.block(s.Body)
		if s.Else != nil {
			w.put(" else ")
			w.stmt(s.Else)
		}
	case *ast.ForStmt:
		w.put("for ")
		if s.Init != nil || s.Post != nil {
			w.header(s.Init)
			if s.Init == nil {
				w.put("; ")
			}
			w.expr(s.Cond)
			w.put("; ")
			if s.Post != nil {
				w.stmt(s.Post)
				w.put(" ")
			}
		} else if s.Cond != nil {
			w.expr(s.Cond)
			w.put(" ")
		}
		w.block(s.Body)
	case *ast.RangeStmt:
		w.put("for ")
		if s.Key != nil {
			w.expr(s.Key)
			if s.Value != nil {
				w.put(", ")
				w.expr(s.Value)
			}
			w.put(" ", s.Tok.String(), " ")
		}
		w.put("range ")
		w.expr(s.X)
		w.put(" ")
		w.block(s.Body)
	case *ast.SwitchStmt:
		w.put("switch ")
		w.header(s.Init)
		w.expr(s.Tag)
		w.put(" ")
		w.block(s.Body)
	case *ast.TypeSwitchStmt:
		w.put("switch ")
		w.header(s.Init)
		w.stmt(s.Assign)
		w.put(" ")
		w.block(s.Body)
	case *ast.CaseClause:
		if s.List == nil {
			w.put("default:")
		} else {
			w.put("case ")
			w.list(s.List)
			w.put(":")
		}
		w.body(s.Body)
	default:
		// The rest (go, defer, select, send) is refused before it gets here.
		panic(fmt.Sprintf("program: statement %T has no normal form", s))
	}
}

func (w *writer) header(init ast.Stmt) {
	if init != nil {
		w.stmt(init)
		w.put("; ")
	}
}

// decl writes a declaration within a function, one line per specification.
// Constants are written with their values, whatever expression gave them.
func (w *writer) decl(d *ast.GenDecl) {
	first := true
	next := func() {
		if !first {
			w.line()
		}
		first = false
	}
	for _, s := range d.Specs {
		switch s := s.(type) {
		case *ast.TypeSpec:
			next()
			w.typeSpec(s)
		case *ast.ValueSpec:
			if d.Tok == token.CONST {
				for _, n := range s.Names {
					if o, ok := w.info.Defs[n].(*types.Const); ok {
						next()
						w.constant(o)
					}
				}
				continue
			}
			next()
			w.put("var")
			for k, n := range s.Names {
				if k > 0 {
					w.put(",")
				}
				w.put(" ", n.Name)
			}
			if s.Type != nil {
				w.put(" ")
				w.expr(s.Type)
			}
			if len(s.Values) > 0 {
				w.put(" = ")
				w.list(s.Values)
			}
		}
	}
}

// constant writes a constant as its type and exact value.
func (w *writer) constant(o *types.Const) {
	w.put("const ", o.Name(), " ", types.TypeString(o.Type(), (*types.Package).Name), " = ", o.Val().ExactString())
}

func (w *writer) typeSpec(s *ast.TypeSpec) {
	w.put("type ", s.Name.Name, " ")
	if s.Assign.IsValid() {
		w.put("= ")
	}
	w.expr(s.Type)
}
