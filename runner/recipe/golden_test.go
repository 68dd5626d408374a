package recipe

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// wrongDir holds recipes that are right but for one fault. Those whose names
// begin with one of these topics are found out by Parse; the others need a
// look at the code or at the files, and are tested elsewhere.
const wrongDir = "../../testdata/wrong"

var topics = []string{"input-", "setting-", "prior-", "column-", "table-", "section-"}

func TestWrongRecipes(t *testing.T) {
	var files []string
	for _, topic := range topics {
		found, err := filepath.Glob(filepath.Join(wrongDir, topic+"*.md"))
		if err != nil || len(found) == 0 {
			t.Fatalf("no recipe for the topic %s (%v)", topic, err)
		}
		files = append(files, found...)
	}
	for _, file := range files {
		t.Run(strings.TrimSuffix(filepath.Base(file), ".md"), func(t *testing.T) {
			source, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			_, diags := Parse(filepath.Base(file), source)
			if len(diags) == 0 {
				t.Fatal("no fault is found")
			}
			golden(t, strings.TrimSuffix(file, ".md")+".txt", diags.Error()+"\n")
		})
	}
}

func TestGoodRecipes(t *testing.T) {
	files, err := filepath.Glob("testdata/good/*.md")
	if err != nil || len(files) == 0 {
		t.Fatalf("no recipes (%v)", err)
	}
	for _, file := range files {
		t.Run(strings.TrimSuffix(filepath.Base(file), ".md"), func(t *testing.T) {
			source, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			r, diags := Parse(filepath.Base(file), source)
			if err := diags.Err(); err != nil {
				t.Fatal(err)
			}
			golden(t, strings.TrimSuffix(file, ".md")+".txt", dump(r))
		})
	}
}

// TestNoOrphans finds golden files without a recipe.
func TestNoOrphans(t *testing.T) {
	for _, dir := range []string{wrongDir, "testdata/good"} {
		files, err := filepath.Glob(filepath.Join(dir, "*.txt"))
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range files {
			if _, err := os.Stat(strings.TrimSuffix(f, ".txt") + ".md"); err != nil {
				t.Errorf("%s belongs to no recipe", f)
			}
		}
	}
}

func golden(t *testing.T, file, got string) {
	t.Helper()
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o666); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		t.Errorf("%s differs (go test -update rewrites it)\ngot:\n%s\nwant:\n%s", file, got, want)
	}
}
