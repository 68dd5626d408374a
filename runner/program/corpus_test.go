package program

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// A sample is one small program of a differential test: a function run() that
// gives a text, and what it needs.
type sample struct {
	name string
	src  string
}

// corpus reads the programs in testdata/program. A file holds programs under
// lines "=== NAME"; one called prelude stands before each of the others.
func corpus(t testing.TB) []sample {
	files, err := filepath.Glob("../../testdata/program/*.txt")
	if err != nil || len(files) == 0 {
		t.Fatalf("no programs in testdata/program: %v", err)
	}
	var out []sample
	seen := map[string]bool{}
	for _, name := range files {
		b, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		prelude := ""
		for _, part := range strings.Split("\n"+string(b), "\n=== ")[1:] {
			title, body, _ := strings.Cut(part, "\n")
			if title == "prelude" {
				prelude = body + "\n"
				continue
			}
			if seen[title] {
				t.Fatalf("%s: two programs are called %s", name, title)
			}
			seen[title] = true
			out = append(out, sample{title, source(prelude + body)})
		}
	}
	return out
}

// source makes a recipe's source of a program: run becomes a helper that a
// step calls three times.
func source(body string) string {
	body = strings.Replace(body, "func Run() ", "func run() ", 1)
	return "\n" + body + "\nfunc Run() (text string) {\n\tfor i := 0; i < 3; i++ {\n\t\ttext += \"#\" + run()\n\t}\n\treturn text\n}\n"
}

// interpret checks and runs the step Run of a source. A program that is
// refused gives the complaints instead.
func interpret(name, src string) (out string, refused error) {
	p, diags := Check(name, []byte(src))
	if len(diags) > 0 {
		return "", diags
	}
	m, err := p.Compile()
	if err != nil {
		return "COMPILE " + err.Error(), nil
	}
	results, err := m.Call("Run", nil)
	if _, ok := err.(*PanicError); ok {
		return "PANIC", nil
	}
	if err != nil {
		return "ERROR " + err.Error(), nil
	}
	return fmt.Sprint(results[0]), nil
}
