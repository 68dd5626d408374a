package program

import (
	"go/types"
	"testing"

	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

// TestNoSignedFunctions checks that nothing in the available packages takes or
// gives functions of floating-point numbers, which are not the functions that
// the rewriting makes of those of a recipe.
func TestNoSignedFunctions(t *testing.T) {
	importer := exportdata.NewImporter()
	for _, p := range available.Packages {
		if !exportdata.Has(p.Path) {
			continue
		}
		pkg, err := importer.Import(p.Path)
		if err != nil {
			t.Fatal(err)
		}
		for _, name := range pkg.Scope().Names() {
			o := pkg.Scope().Lookup(name)
			if !o.Exported() || available.Withheld(p.Path+"."+name) != "" {
				continue
			}
			seen := map[types.Type]bool{}
			if _, function := o.(*types.Func); function {
				sig := o.Type().(*types.Signature)
				for _, list := range []*types.Tuple{sig.Params(), sig.Results()} {
					for i := 0; i < list.Len(); i++ {
						noSignedFunction(t, o, list.At(i).Type(), seen)
					}
				}
				continue
			}
			noSignedFunction(t, o, o.Type(), seen)
		}
	}
}

func noSignedFunction(t *testing.T, o types.Object, typ types.Type, seen map[types.Type]bool) {
	if seen[typ] {
		return
	}
	seen[typ] = true
	parts := func(list *types.Tuple) {
		for i := 0; i < list.Len(); i++ {
			noSignedFunction(t, o, list.At(i).Type(), seen)
		}
	}
	switch u := typ.(type) {
	case *types.Alias:
		noSignedFunction(t, o, types.Unalias(u), seen)
	case *types.Named:
		noSignedFunction(t, o, u.Underlying(), seen)
		for i := 0; i < u.NumMethods(); i++ {
			if m := u.Method(i); m.Exported() {
				parts(m.Signature().Params())
				parts(m.Signature().Results())
			}
		}
	case *types.Pointer:
		noSignedFunction(t, o, u.Elem(), seen)
	case *types.Slice:
		noSignedFunction(t, o, u.Elem(), seen)
	case *types.Array:
		noSignedFunction(t, o, u.Elem(), seen)
	case *types.Map:
		noSignedFunction(t, o, u.Elem(), seen)
	case *types.Struct:
		for i := 0; i < u.NumFields(); i++ {
			if u.Field(i).Exported() {
				noSignedFunction(t, o, u.Field(i).Type(), seen)
			}
		}
	case *types.Interface:
		for i := 0; i < u.NumMethods(); i++ {
			if takesSigned(u.Method(i).Signature()) {
				t.Errorf("%s: interface method %s takes floating-point numbers: signs.go has to know it", o, u.Method(i).Name())
			}
		}
	case *types.Signature:
		if takesSigned(u) {
			t.Errorf("%s has a function of floating-point numbers in its type: signs.go has to know it", o)
		}
		parts(u.Params())
		parts(u.Results())
	}
}
