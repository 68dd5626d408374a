package exportdata

import (
	"go/types"
	"strings"
	"testing"

	"rimlight/runner/program/available"
)

func TestImporter(t *testing.T) {
	im := NewImporter()
	for _, path := range []string{"os", "unsafe", "rimlight/steps/fits", ""} {
		if p, err := im.Import(path); err == nil || !strings.Contains(err.Error(), "is not available") {
			t.Errorf("import %q gives %v, %v", path, p, err)
		}
	}
	var sorted *types.Package
	for _, p := range available.Packages {
		if !Has(p.Path) {
			continue
		}
		pkg, err := im.Import(p.Path)
		if err != nil || !pkg.Complete() || pkg.Name() != p.Name {
			t.Errorf("%s: %v %v", p.Path, pkg, err)
		}
		if again, err := im.Import(p.Path); err != nil || again != pkg {
			t.Errorf("%s gives two packages", p.Path)
		}
		if p.Name == "sort" {
			sorted = pkg
		}
	}
	if sorted.Scope().Lookup("SliceStable") == nil {
		t.Error("package sort has no SliceStable")
	}
}

// TestNoPaths checks that the data does not tell where it was made.
func TestNoPaths(t *testing.T) {
	entries, err := files.ReadDir("data")
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		b, err := files.ReadFile("data/" + e.Name())
		if err != nil {
			t.Fatal(err)
		}
		if s := string(b); strings.Contains(s, ".go\x00") || strings.Contains(s, "/src/") || strings.Contains(s, "/home/") {
			t.Errorf("%s holds a file name", e.Name())
		}
	}
}

func BenchmarkImportAll(b *testing.B) {
	for b.Loop() {
		im := NewImporter()
		for _, p := range available.Packages {
			if Has(p.Path) {
				if _, err := im.Import(p.Path); err != nil {
					b.Fatal(err)
				}
			}
		}
	}
}
