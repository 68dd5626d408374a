package command

import (
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// TestLayers holds the direction of dependencies: runner, then reports, then
// steps; and what each may use besides.
func TestLayers(t *testing.T) {
	root := "../.."
	may := map[string][]string{
		"steps":   {"rimlight/steps", "gonum.org/v1/gonum", "gonum.org/v1/plot"},
		"reports": {"rimlight/reports", "rimlight/steps", "github.com/yuin/goldmark"},
		"recipes": {},
	}
	files := 0
	err := filepath.WalkDir(root, func(p string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		rel := filepath.ToSlash(strings.TrimPrefix(p, root+string(filepath.Separator)))
		top, _, _ := strings.Cut(rel, "/")
		if d.IsDir() || !strings.HasSuffix(rel, ".go") || may[top] == nil {
			return nil
		}
		files++
		f, err := parser.ParseFile(token.NewFileSet(), p, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		for _, i := range f.Imports {
			imported, _ := strconv.Unquote(i.Path.Value)
			first, _, _ := strings.Cut(imported, "/")
			if first != "rimlight" && !strings.Contains(first, ".") {
				continue // standard library
			}
			ok := false
			for _, allowed := range may[top] {
				ok = ok || imported == allowed || strings.HasPrefix(imported, allowed+"/")
			}
			if !ok {
				t.Errorf("%s imports %s; %s may import %v and the standard library", rel, imported, top, may[top])
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if files < 20 {
		t.Fatalf("only %d files looked at", files)
	}
}

// TestNoInputOrOutputInSteps holds that the library reads and writes no files:
// recipes call it.
func TestNoInputOrOutputInSteps(t *testing.T) {
	files, err := filepath.Glob("../../steps/*/*.go")
	if err != nil {
		t.Fatal(err)
	}
	banned := map[string]bool{"os": true, "os/exec": true, "net": true, "net/http": true, "syscall": true, "unsafe": true, "math/rand": true, "time": true}
	for _, f := range files {
		if strings.HasSuffix(f, "_test.go") {
			continue
		}
		src, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		parsed, err := parser.ParseFile(token.NewFileSet(), f, src, parser.ImportsOnly)
		if err != nil {
			t.Fatal(err)
		}
		for _, i := range parsed.Imports {
			if p, _ := strconv.Unquote(i.Path.Value); banned[p] {
				t.Errorf("%s imports %s: a step is a pure function of its arguments", path.Base(path.Dir(filepath.ToSlash(f)))+"/"+filepath.Base(f), p)
			}
		}
	}
}
