package program

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// A sample is one small program of a differential test: a function Run that
// gives a text, and what it needs. Samples of one origin share declarations.
type sample struct {
	name   string
	shared string
	body   string
	turn   int // in a file of programs made by rule; 0 in other files
}

// corpus reads the programs in testdata/program. A file holds programs under
// lines "=== NAME"; one called prelude stands before each of the others, and
// what stands under "=== define NAME" is put where they say «NAME».
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
		var defined []string
		turn := 0
		for _, part := range strings.Split("\n"+string(b), "\n=== ")[1:] {
			title, body, _ := strings.Cut(part, "\n")
			if title == "prelude" {
				prelude = body + "\n"
				continue
			}
			if name, ok := strings.CutPrefix(title, "define "); ok {
				defined = append(defined, "«"+name+"»", strings.TrimSpace(body))
				continue
			}
			body = strings.NewReplacer(defined...).Replace(body)
			if seen[title] {
				t.Fatalf("%s: two programs are called %s", name, title)
			}
			seen[title] = true
			if systematic[filepath.Base(name)] {
				turn++
			}
			out = append(out, sample{title, prelude, body, turn})
		}
	}
	return out
}

// systematic are the files whose programs are made by rule, one for each
// combination of things.
var systematic = map[string]bool{"constants.txt": true, "assignments.txt": true, "places.txt": true, "copies.txt": true, "effects.txt": true}

// source makes a recipe's source of the sample. Run becomes a helper, run_, and
// a function literal with the same body; the step Run calls the helper in a
// loop, the literal, and both from compiled code.
func (s sample) source() string {
	body := strings.Replace(s.body, "func Run() ", "func run_() ", 1)
	return "\n" + s.shared + body + "\nfunc Run() (text string) {\n" +
		"\tall_ := \"\"\n\tfor i := 0; i < 3; i++ {\n\t\tall_ += \"#\" + run_()\n\t}\n" +
		"\tinside_ := func() " + literal(body) + "\n\tall_ += \"#in a literal \" + inside_() + \"#\" + inside_()\n" +
		"\t_ = strings.Map(func(r rune) rune { all_ += \"#from compiled code \" + run_() + \"#\" + inside_(); return r }, \"a\")\n" +
		"\treturn all_\n}\n"
}

// literal is what follows func() in the declaration of run_.
func literal(body string) string {
	const head = "package main\n"
	fset := token.NewFileSet()
	f, err := parser.ParseFile(fset, "", head+body, parser.SkipObjectResolution)
	if err == nil {
		for _, d := range f.Decls {
			if fn, ok := d.(*ast.FuncDecl); ok && fn.Name.Name == "run_" {
				return (head + body)[fset.Position(fn.Type.Params.End()).Offset:fset.Position(fn.End()).Offset]
			}
		}
	}
	return "string { return run_() }" // the fault is met again by the check
}

// outcome is what the step Run gives, as the compiled program shows it.
func (p *Program) outcome() string {
	m, err := p.Compile()
	if err != nil {
		return "COMPILE " + err.Error()
	}
	results, err := m.Call("Run", nil)
	if _, ok := err.(*PanicError); ok {
		return "PANIC"
	}
	if err != nil {
		return "ERROR " + err.Error()
	}
	return fmt.Sprint(results[0])
}
