package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

// TestSymbolFiles checks that the symbol files on disk are those that the
// export data beside them gives, so that the two were made together, and that
// making them again gives the same bytes.
func TestSymbolFiles(t *testing.T) {
	importer := exportdata.NewImporter()
	for _, p := range available.Packages {
		if !exportdata.Has(p.Path) {
			continue
		}
		pkg, err := importer.Import(p.Path)
		if err != nil {
			t.Fatal(err)
		}
		want, err := symbolFile(pkg)
		if err != nil {
			t.Fatal(err)
		}
		name := filepath.Join("..", "symbols", "table_"+strings.ReplaceAll(p.Path, "/", "_")+".go")
		got, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		if string(got) != string(want) {
			t.Errorf("%s is out of date; run go generate ./runner/program/...", name)
		}
	}
}
