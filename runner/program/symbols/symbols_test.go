package symbols

import (
	"go/types"
	"testing"

	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

// TestSymbolsMatchExportData checks that whatever a recipe can name after the
// type check is there at run time. Constants are folded, generic and withheld
// functions and variables are refused.
func TestSymbolsMatchExportData(t *testing.T) {
	importer := exportdata.NewImporter()
	packages := 0
	for _, p := range available.Packages {
		if !exportdata.Has(p.Path) {
			continue
		}
		packages++
		pkg, err := importer.Import(p.Path)
		if err != nil {
			t.Error(err)
			continue
		}
		if pkg.Name() != p.Name {
			t.Errorf("package %s is called %s in the table", p.Path, p.Name)
		}
		table := Table[p.Path+"/"+p.Name]
		wanted := map[string]bool{}
		for _, name := range pkg.Scope().Names() {
			o := pkg.Scope().Lookup(name)
			if !o.Exported() || available.Withheld(p.Path+"."+name) != "" {
				continue
			}
			switch o := o.(type) {
			case *types.Func:
				wanted[name] = o.Signature().TypeParams() == nil
			case *types.TypeName:
				n, ok := o.Type().(*types.Named)
				generic := ok && n.TypeParams() != nil
				i, isInterface := o.Type().Underlying().(*types.Interface)
				wanted[name] = !generic && !(isInterface && !i.IsMethodSet())
			case *types.Var:
				wanted[name] = types.Identical(o.Type(), types.Universe.Lookup("error").Type())
			}
		}
		for name, want := range wanted {
			if _, have := table[name]; have != want {
				t.Errorf("%s.%s: in the symbol table %v, wanted %v", p.Name, name, have, want)
			}
		}
		for name := range table {
			if name[0] != '_' && !wanted[name] {
				t.Errorf("%s.%s is in the symbol table but not in the export data", p.Name, name)
			}
		}
	}
	if packages < 9 {
		t.Errorf("%d packages have export data", packages)
	}
}
