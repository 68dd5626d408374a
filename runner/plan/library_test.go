package plan

import (
	"reflect"
	"testing"
	"testing/fstest"
)

func library(t *testing.T, files map[string]string) *Library {
	t.Helper()
	m := fstest.MapFS{}
	for name, src := range files {
		m[name] = &fstest.MapFile{Data: []byte(src)}
	}
	l, err := readLibrary(m)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func TestLibraryHash(t *testing.T) {
	const src = "package a\n\nimport \"rimlight/steps/b\"\n\n// F is.\nfunc F(x float64) float64 { return b.G(x) + 1 }\n"
	base := library(t, map[string]string{"a/a.go": src, "b/b.go": "package b\n"})
	same := library(t, map[string]string{
		"a/a.go":      "package a\n\nimport \"rimlight/steps/b\"\n\nfunc F(x   float64) float64 {\n\treturn b.G(x) + 1 // better\n}\n",
		"a/a_test.go": "package a\n",
		"b/b.go":      "package b\n",
	})
	if base.Hash("rimlight/steps/a") != same.Hash("rimlight/steps/a") {
		t.Error("comments, formatting or tests changed the hash of a package")
	}
	other := library(t, map[string]string{"a/a.go": "package a\n\nimport \"rimlight/steps/b\"\n\nfunc F(x float64) float64 { return b.G(x) + 2 }\n", "b/b.go": "package b\n"})
	if base.Hash("rimlight/steps/a") == other.Hash("rimlight/steps/a") {
		t.Error("another constant left the hash of a package as it was")
	}
	if got, want := base.Reached([]string{"rimlight/steps/a"}), []string{"rimlight/steps/a", "rimlight/steps/b"}; !reflect.DeepEqual(got, want) {
		t.Errorf("reached %v, want %v", got, want)
	}
}

// TestOwnLibrary holds that the real library can be fingerprinted and obeys
// its import rule.
func TestOwnLibrary(t *testing.T) {
	l, err := OpenLibrary()
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range []string{"lightcurve", "fit", "transit", "spectrum", "figure"} {
		if l.Hash(libraryPath+p) == "" {
			t.Errorf("no fingerprint of steps/%s", p)
		}
	}
}
