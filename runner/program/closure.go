package program

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"go/ast"
	"go/types"
	"sort"

	"rimlight/runner/program/available"
)

// A closure finds what a step reaches within its recipe and writes it down.
type closure struct {
	c       *checker
	decl    map[types.Object]ast.Node // functions, types and constants at top level
	methods map[types.Object][]types.Object
}

func newClosure(c *checker) *closure {
	cl := &closure{c, map[types.Object]ast.Node{}, map[types.Object][]types.Object{}}
	for _, d := range c.tree.Decls {
		switch d := d.(type) {
		case *ast.FuncDecl:
			o := c.info.Defs[d.Name]
			cl.decl[o] = d
			if recv := o.Type().(*types.Signature).Recv(); recv != nil {
				if t := named(recv.Type()); t != nil {
					cl.methods[t.Obj()] = append(cl.methods[t.Obj()], o)
				}
			}
		case *ast.GenDecl:
			for _, s := range d.Specs {
				switch s := s.(type) {
				case *ast.TypeSpec:
					cl.decl[c.info.Defs[s.Name]] = s
				case *ast.ValueSpec:
					for _, n := range s.Names {
						cl.decl[c.info.Defs[n]] = s
					}
				}
			}
		}
	}
	return cl
}

// named is the named type of t or of what t points to, nil when there is none.
func named(t types.Type) *types.Named {
	if p, ok := types.Unalias(t).(*types.Pointer); ok {
		t = p.Elem()
	}
	n, _ := types.Unalias(t).(*types.Named)
	return n
}

// text is the normal form of a step: a line with the version, the step, and
// what it reaches in order of name. Packages are the step packages it names.
func (cl *closure) text(step *ast.FuncDecl) (code string, packages []string) {
	root := cl.c.info.Defs[step.Name]
	seen := map[types.Object]bool{}
	imported := map[string]bool{}
	cl.visit(root, seen, imported)
	delete(seen, root)

	var w writer
	w.info = cl.c.info
	w.put("program ", Version, "\n")
	var paths []string
	for p := range imported {
		paths = append(paths, p)
		if available.IsStep(p) {
			packages = append(packages, p)
		}
	}
	sort.Strings(paths)
	sort.Strings(packages)
	for _, p := range paths {
		w.put("import ", p, "\n")
	}
	cl.write(&w, root)
	var objects []types.Object
	for o := range seen {
		objects = append(objects, o)
	}
	sort.Slice(objects, func(i, j int) bool { return sortKey(objects[i]) < sortKey(objects[j]) })
	for _, o := range objects {
		cl.write(&w, o)
	}
	return w.String(), packages
}

func hash(text string) string {
	sum := sha256.Sum256([]byte(text))
	return hex.EncodeToString(sum[:])
}

// sortKey orders constants before types before functions, methods beside their
// type's name.
func sortKey(o types.Object) string {
	switch o := o.(type) {
	case *types.Const:
		return "1 " + o.Name()
	case *types.TypeName:
		return "2 " + o.Name()
	case *types.Func:
		return "3 " + o.FullName()
	}
	return "4 " + o.Name()
}

// visit collects o and what its declaration names. A type brings its methods:
// they can be called through an interface without being named.
func (cl *closure) visit(o types.Object, seen map[types.Object]bool, imported map[string]bool) {
	n := cl.decl[o]
	if n == nil || seen[o] {
		return
	}
	seen[o] = true
	if k, ok := o.(*types.Const); ok {
		// A constant is its value; only its type is reached.
		if t := named(k.Type()); t != nil {
			cl.visit(t.Obj(), seen, imported)
			cl.imports(t.Obj(), imported)
		}
		return
	}
	ast.Inspect(n, func(m ast.Node) bool {
		id, ok := m.(*ast.Ident)
		if !ok {
			return true
		}
		used := cl.c.info.Uses[id]
		if used == nil {
			return true
		}
		cl.visit(used, seen, imported)
		if p, ok := used.(*types.PkgName); ok {
			imported[p.Imported().Path()] = true
		}
		cl.imports(used, imported)
		return true
	})
	for _, m := range cl.methods[o] {
		cl.visit(m, seen, imported)
	}
}

// imports notes the package of a method or field of an available package: it
// is reached though the package's name does not appear.
func (cl *closure) imports(o types.Object, imported map[string]bool) {
	if p := o.Pkg(); p != nil && p != cl.c.pkg {
		if _, isName := o.(*types.PkgName); !isName && available.Name(p.Path()) != "" {
			imported[p.Path()] = true
		}
	}
}

// write puts the declaration of o, followed by an empty line's worth of
// separation.
func (cl *closure) write(w *writer, o types.Object) {
	w.put("\n")
	switch o := o.(type) {
	case *types.Const:
		w.constant(o)
	case *types.TypeName:
		w.typeSpec(cl.decl[o].(*ast.TypeSpec))
	case *types.Func:
		d := cl.decl[o].(*ast.FuncDecl)
		w.head(d)
		w.put(" ")
		w.block(d.Body)
	default:
		panic(fmt.Sprintf("program: %v is neither constant, type nor function", o))
	}
	w.put("\n")
}
