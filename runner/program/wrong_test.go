package program

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the expected texts in testdata")

// goLines blanks everything of a Markdown text but its Go blocks.
func goLines(md []byte) (src []byte, fences []Fence) {
	lines := bytes.SplitAfter(md, []byte("\n"))
	inside := false
	for i, line := range lines {
		switch text := strings.TrimRight(string(line), "\n"); {
		case !inside && text == "```go":
			inside = true
			fences = append(fences, Fence{Start: i + 2})
		case inside && text == "```":
			inside = false
			fences[len(fences)-1].End = i
		case inside:
			src = append(src, line...)
			continue
		}
		src = append(src, '\n')
	}
	return src, fences
}

// TestWrongRecipes holds what is said about each faulty recipe against the
// text beside it.
func TestWrongRecipes(t *testing.T) {
	files, err := filepath.Glob("../../testdata/wrong/go-*.md")
	if err != nil || len(files) == 0 {
		t.Fatalf("no recipes: %v", err)
	}
	for _, name := range files {
		md, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		src, fences := goLines(md)
		p, diags := Check(filepath.Base(name), src, fences...)
		if _, err := p.Compile(); err == nil || len(diags) == 0 {
			t.Errorf("%s is accepted", name)
			continue
		}
		if _, without := Check(filepath.Base(name), src); without.Error() != diags.Error() {
			t.Errorf("%s: without fences the report is\n%v\nnot\n%v", name, without, diags)
		}
		got := diags.Error() + "\n"
		expected := strings.TrimSuffix(name, ".md") + ".txt"
		if *update {
			if err := os.WriteFile(expected, []byte(got), 0o644); err != nil {
				t.Fatal(err)
			}
			continue
		}
		want, err := os.ReadFile(expected)
		if err != nil {
			t.Fatal(err)
		}
		if got != string(want) {
			t.Errorf("%s: got\n%swant\n%s", name, got, want)
		}
	}
}
