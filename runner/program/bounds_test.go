package program

import (
	"fmt"
	"runtime/debug"
	"strings"
	"testing"
	"time"
)

// lines repeats a line, with its number for #, and the number before for ~.
func lines(count int, line string) string {
	var b strings.Builder
	for i := 1; i <= count; i++ {
		b.WriteString(strings.NewReplacer("#", fmt.Sprint(i), "~", fmt.Sprint(i-1)).Replace(line) + "\n")
	}
	return b.String()
}

// TestHostile checks that sources made to exhaust the type checker or the
// interpreter are refused in little time, with the memory of a worker's stack.
func TestHostile(t *testing.T) {
	defer debug.SetMaxStack(debug.SetMaxStack(64 << 20))
	const step = "func F() (x int) { return 1 }\n"
	for _, c := range []struct{ name, src, want string }{
		{"long", strings.Repeat("\n", maxSource+1), "bytes long"},
		{"brackets", "func F() (x int) { return " + strings.Repeat("(", 200000) + "1" + strings.Repeat(")", 200000) + " }", "nested more than 100 deep"},
		{"operators", "func F() (x int) { return 1" + strings.Repeat("+1", 90000) + " }", "operators in a row"},
		{"unary", "func F() (x int) { return " + strings.Repeat("-", 100000) + "1 }", "operators in a row"},
		{"else", "func F() (x int) { if x > 1 {}" + strings.Repeat(" else if x > 1 {}", 20000) + " }", "operators in a row"},
		{"channels", "func F() (x int) { var c " + strings.Repeat("chan ", 100000) + "int; return 1 }", "operators in a row"},
		{"slices", "func F() (x int) { var c " + strings.Repeat("[]", 100000) + "int; return 1 }", "operators in a row"},
		{"calls", "func F() (x int) { return f" + strings.Repeat("()", 100000) + " }", "operators in a row"},
		{"words", "func F() (x int) {\n" + strings.Repeat("x = 1\n", 60000) + "return x }", "words and signs"},
		{"a long name", "func F() (x int) { " + strings.Repeat("x", 900000) + " := 1; return 1 }", "900000 bytes long"},
		{"undefined long names", "func F() (x int) {" + lines(3000, "_ = "+strings.Repeat("y", 150)+"#") + " }", "more faults"},
		{"functions", lines(9000, "func f#() int { return 1 }"), "more than 3000 declarations"},
		{"steps", lines(2500, "func F#() (x# int) { return f(#) }") + "func f(n int) int {\n" + strings.Repeat("n++\n", 5000) + "return n }", "more than 500 steps"},
		{"shared code", lines(400, "func F#() (x# int) { return f(#) }") + "func f(n int) int {\n" + strings.Repeat("n++\n", 20000) + "return n }", "bytes of code"},
		{"shifted constants", "const a0 = 1\n" + lines(1000, "const a# = a~ << 1000") + step, "overflow"},
		{"squared integers", "const a0 = 3\n" + lines(1000, "const a# = a~ * a~") + step, "overflow"},
		{"squared fractions", "const a0 = 1.0000001/3\n" + lines(40, "const a# = a~ * a~") + "func F() (x float64) { return a40 }", ""},
		{"summed fractions", "const a0 = 1.0/3\n" + lines(2000, "const a# = a~ + 1.0/(#*#+7)") + "func F() (x float64) { return a2000 }", ""},
		{"a large exponent", "func F() (x float64) { return 1e-999999999 * 1e999999999 }", "malformed constant"},
		{"doubled texts", "const a0 = `0123456789`\n" + lines(35, "const a# = a~ + a~") + "func F() (x int) { return len(a35) }", "string constants"},
		{"doubled texts within", "func F() (x int) { const a0 = `0123456789`\n" + lines(35, "const a# = a~ + a~") + "return len(a35) }", "string constants"},
		{"doubled texts in a group", "const (\na0 = `0123456789`\n" + lines(35, "a# = a~ + a~") + ")\nfunc F() (x int) { return len(a35) }", "string constants"},
		{"a text at many places", "const a = `" + strings.Repeat("x", 10000) + "`\nfunc F() (x int) {\n" + lines(10000, "x = len(a)") + "return x }", "string constants"},
		{"a large array", "func F() (x int) { var a [1 << 40]int; return len(a) }", "use a slice"},
		{"arrays of arrays", "func F() (x int) { var a [1000][1000][1000]float64; return len(a) }", "use a slice"},
		{"an array of nothing", "func F() (x int) { var a [1 << 50]struct{}; for range a { x++ }; return x }", "use a slice"},
		{"an array literal", "func F() (x int) { a := [...]int{1 << 30: 1}; return len(a) }", "use a slice"},
		{"doubled structs", "type t0 struct{ a int }\n" + lines(30, "type t# struct{ a, b t~ }") + "func F() (x int) { var t t30; return t.a.a.a.a }", "more than 2000 parts"},
		{"doubled structs in a step", "type t0 struct{ A int }\n" + lines(60, "type t# struct{ A, B t~ }") + "func F(t t60) (x int) { return 1 }", "more than 2000 parts"},
		{"doubled structs with a type error", "type t0 struct{ A int }\n" + lines(60, "type t# struct{ A, B t~ }") + "func F(t t60) (x int) { return y }", "more than 2000 parts"},
		{"doubled pointers", "type t0 struct{ a int }\n" + lines(60, "type t# struct{ a, b *t~ }") + "func F() (x int) { var t t60; _ = t; return 1 }", "more than 2000 parts"},
		{"doubled functions", "type t0 func() int\n" + lines(60, "type t# func(t~) t~") + "func F() (x int) { var t t60; _ = t; return 1 }", "more than 2000 parts"},
		{"doubled maps", "type t0 int\n" + lines(60, "type t# map[string]struct { a, b t~ }") + "func F() (x int) { var t t60; _ = t; return 1 }", "more than 2000 parts"},
		{"doubled interfaces", "type t0 interface{ m0() }\n" + lines(60, "type t# interface{ t~; m#(t~) t~ }") + "func F() (x int) { var t t60; _ = t; return 1 }", "more than 2000 parts"},
		{"many types", "type t0 struct {" + lines(900, "a# int") + "}\n" + lines(200, "type t# struct { a t0; b# int }") + step, "come to more than"},
		{"a chain of types", "type t0 int\n" + lines(2900, "type t# t~") + "func F() (x int) { return int(t2900(1)) }", "come to more than"},
		{"a short chain of types", "type t0 int\n" + lines(200, "type t# t~") + "func F() (x int) { return int(t200(1)) }", ""},
		{"a long chain of types that is too much", lines(2900, "type t~ t#") + "type t2900 int\nfunc F() (x int) { return int(t0(1)) }", "parts"},
		{"a chain of types from the end", lines(2900, "type t~ []t#") + "type t2900 int\nfunc F() (x int) { var t t0; return len(t) }", "more than 2000 parts"},
		{"a chain of constants", lines(2900, "const c~ = c# + 1") + "const c2900 = 1\nfunc F() (x int) { return c0 }", ""},
		{"a chain of functions", lines(2900, "func f~() int { return f#() }") + "func f2900() int { return 1 }\nfunc F() (x int) { return f0() }", ""},
		{"types that multiply", "type d[T any] struct{ a, b T }\nfunc F() (x int) { var t " + strings.Repeat("d[", 60) + "int" + strings.Repeat("]", 60) + "; _ = t; return 1 }", "type parameters"},
		{"kept functions", "func F() (x int) {\nvar fs []func() int\nfor i := 0; i < 3; i++ {\nk := 0\n" + lines(3000, "k++; fs = append(fs, func() int { return k })") + "}\nreturn len(fs) }", ""},
		{"loops", "func F() (x int) {\n" + lines(8000, "for i := 0; i < 2; i++ { x++ }") + "return x }", ""},
		{"ranges over maps", "func F() (x int) {\nvar m map[int]int\n" + lines(9000, "for k := range m { x += k }") + "return x }", "more faults"},
	} {
		start := time.Now()
		p, diags := Check("r.md", []byte("\n"+c.src))
		if took := time.Since(start); took > 2*time.Second {
			t.Logf("%s: checked in %v", c.name, took)
		}
		if c.want == "" {
			if len(diags) > 0 {
				t.Errorf("%s: %v", c.name, diags)
				continue
			}
			if _, err := p.Compile(); err != nil {
				t.Errorf("%s: %v", c.name, err)
			}
			if took := time.Since(start); took > 3*time.Second {
				t.Logf("%s: compiled after %v", c.name, took)
			}
			continue
		}
		text := diags.Error()
		if !strings.Contains(text, c.want) {
			t.Errorf("%s: %.600s, want %s", c.name, text, c.want)
		}
		if len(text) > (maxFaults+1)*(2*maxMessage+100) {
			t.Errorf("%s: the report has %d bytes", c.name, len(text))
		}
	}
}

// TestLimitsLeaveRoom checks that ordinary tables and types pass.
func TestLimitsLeaveRoom(t *testing.T) {
	accept(t, "\nfunc F() (x []float64) {\n\treturn []float64{\n"+strings.Repeat("\t-1.5, +2, -0.25,\n", 5000)+"\t}\n}\n")
	accept(t, "\ntype row struct{ A, B, C, D, E, F, G, H float64; N [10]string }\ntype rows struct{ A, B, C []row; M map[string][]row }\n"+
		"func F(r rows, s []rows) (t rows, grid [300][400]float64) { return r, grid }\n")
	accept(t, "\nconst text = `"+strings.Repeat("a line of text\n", 500)+"`\nfunc F() (x string) { return text + strings.TrimSpace(text) }\n")
}

func TestCut(t *testing.T) {
	long := strings.Repeat("é", 1000)
	if got := cut(long); len(got) > maxMessage+10 || !strings.Contains(got, "é … é") {
		t.Errorf("%q", got)
	}
	if got := cut("short"); got != "short" {
		t.Errorf("%q", got)
	}
}
