package program

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// FuzzCheck feeds arbitrary sources to the check: it must not panic, must give
// a program or complaints but not both, and a program must have a normal form
// and compile or say why not.
func FuzzCheck(f *testing.F) {
	f.Add(sampleRecipe)
	f.Add(reached)
	for i, s := range corpus(f) {
		if i%40 == 0 {
			f.Add(s.source())
		}
	}
	files, err := filepath.Glob("../../testdata/wrong/go-*.md")
	if err != nil {
		f.Fatal(err)
	}
	for _, name := range files {
		md, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		src, _ := goLines(md)
		f.Add(string(src))
	}
	f.Fuzz(func(t *testing.T, src string) {
		if len(src) > 10000 {
			return
		}
		p, diags := Check("f.md", []byte(src))
		for _, d := range diags {
			if d.Pos.File != "f.md" || d.Message == "" || d.Pos.Line > strings.Count(src, "\n")+3 {
				t.Fatalf("%+v", d)
			}
		}
		if len(diags) > 0 {
			if _, err := p.Compile(); err == nil {
				t.Fatalf("a program with faults compiles: %v", diags)
			}
			return
		}
		for _, s := range p.Steps {
			if s.Code == "" || s.Name == "" || len(s.CodeHash) != 64 {
				t.Fatalf("%+v", s)
			}
		}
		if _, err := p.Compile(); err != nil {
			t.Logf("%v", err)
		}
	})
}
