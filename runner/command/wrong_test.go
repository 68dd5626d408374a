package command

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite golden files")

// TestWrongRecipes runs "rimlight check" on every recipe under testdata/wrong
// and compares what it says, word for word, with the golden file beside it.
func TestWrongRecipes(t *testing.T) {
	t.Chdir("../../testdata/wrong")
	files, err := filepath.Glob("*.md")
	if err != nil {
		t.Fatal(err)
	}
	if len(files) < 40 {
		t.Fatalf("%d wrong recipes, expected at least 40", len(files))
	}
	dir := t.TempDir()
	for i, f := range files {
		if testing.Short() && i%8 != 0 {
			continue
		}
		t.Run(strings.TrimSuffix(f, ".md"), func(t *testing.T) {
			var out, errs bytes.Buffer
			status := Run([]string{"check", f, "--out", filepath.Join(dir, "out"), "--store", filepath.Join(dir, "store")}, &out, &errs)
			if status != ExitWrong {
				t.Errorf("exit status %d, expected %d; it said %s%s", status, ExitWrong, out.String(), errs.String())
			}
			golden := strings.TrimSuffix(f, ".md") + ".txt"
			if *update {
				if err := os.WriteFile(golden, errs.Bytes(), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(golden)
			if err != nil {
				t.Fatal(err)
			}
			if got := errs.String(); got != string(want) {
				t.Errorf("it said\n%s\nexpected\n%s", got, want)
			}
			for _, line := range strings.Split(strings.TrimSpace(errs.String()), "\n") {
				if !strings.HasPrefix(line, f+":") {
					t.Errorf("%q does not begin with a place in %s", line, f)
				}
			}
		})
	}
	golden, _ := filepath.Glob("*.txt")
	if len(golden) != len(files) {
		t.Errorf("%d golden files for %d recipes", len(golden), len(files))
	}
}
