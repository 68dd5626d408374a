package program

import (
	"strings"
	"testing"
)

// TestLint checks that each construct that the interpreter gets wrong, and that
// is not rewritten, is refused at its place. Every case is the body of a
// function with some declarations around it; @ marks the place.
func TestLint(t *testing.T) {
	for _, c := range []struct{ body, want string }{
		{"var c @chan int; _ = c", "channels are not available"},
		{"@select {}", "select is not available"},
		{"@go f(1)", "go statements are not available"},
		{"@defer f(1)", "defer is not available"},
		{"_ = @recover()", "recover is not available"},
		{"@print(1)", "print is not available"},
		{"_ = @cap(xs)", "cap is not available"},
		{"@for k := range map[string]int{} { _ = k }", "order of a range over a map"},
		{"for i := range \"abc\" { _ = i }", ""},
		{"var keys []string; for k := range map[string]int{} { keys = append(keys, k) }; sort.Strings(keys)", ""},
		{"keys := make([]int, 0, 3); for k := range map[int]int{} { keys = append(keys, k) }; sort.Ints(keys)", ""},
		{"keys := []string{}; _ = xs; @for k := range map[string]int{} { keys = append(keys, k) }; sort.Strings(keys)", "order of a range over a map"},
		{"keys := []string{\"a\"}; @for k := range map[string]int{} { keys = append(keys, k) }; sort.Strings(keys)", "order of a range over a map"},
		{"keys := []string{}; @for k := range map[string]int{} { keys = append(keys, k) }; _ = keys; sort.Strings(keys)", "order of a range over a map"},
		{"keys := []string{}; @for k := range map[string]int{} { keys = append(keys, k) }", "order of a range over a map"},
		{"keys := []string{}; other := []string{}; @for k := range map[string]int{} { keys = append(keys, k) }; sort.Strings(other)", "order of a range over a map"},
		{"keys := []string{}; @for k := range map[string]int{} { keys = append(keys, k); x++ }; sort.Strings(keys)", "order of a range over a map"},
		{"keys := []int{}; @for _, k := range map[string]int{} { keys = append(keys, k) }; sort.Ints(keys)", "order of a range over a map"},
		{"keys := make([]string, 1); @for k := range map[string]int{} { keys = append(keys, k) }; sort.Strings(keys)", "order of a range over a map"},
		{"for _, v := range @&array { _ = v }", "range over a pointer to an array"},
		{"p := &array; _ = @p[1:]", "slicing a pointer to an array"},
		{"top: xs = nil; if len(xs) > 1 { @goto top }", "goto is not available"},
		{"switch { case true: @a: for { break a } }", "a label inside a case"},
		{"_ = xs[0] / @0.0", "division by the constant zero"},
		{"xs[0] /= @0.0", "division by the constant zero"},
		{"n := 2; _ = 1 << n", ""},
		{"n := 2; _ = 1 << uint(n)", ""},
		{"_ = len(xs) > 0 && @func() bool { return true }()", "function literal that is called within &&"},
		{"var a, b any; _ = @a == b", "comparison of interface values"},
		{"var err error; _ = err == nil", ""},
		{"_ = map[@any]int{}", "map keys of interface type"},
		{"var a any = shape{}; _ = @a.(shape)", "test for type shape"},
		{"var a any = 1; switch a.(type) { case int: case @error: }", "test for interface error"},
		{"_ = @shape.area", "method expression"},
		{"g := s.area; _ = g", ""},
		{"type wrap struct{ shape }; g := @wrap{}.area; _ = g", "method value wrap{}.area"},
		{"g := func() float64 { return s.area() }; _ = g", ""},
		{"var ps []*shape; for i := 0; i < 2; i++ { s := shape{}; ps = append(ps, &s) }", ""},
		{"var ps []*shape; for i := 0; i < 2; i++ { s := shape{}; ps = append(ps, @&s); if i == 1 { return } }", "s would be the same variable"},
		{"var ps []*int; for i := 0; i < 2; i++ { ps = append(ps, @&i) }", "i would be the same variable"},
		{"var ps [][]int; for i := 0; i < 2; i++ { a := array; ps = append(ps, @a[:]); if i == 1 { return } }", "a would be the same variable"},
		{"var ps [][]int; for i := 0; i < 2; i++ { a := array; ps = append(ps, a[:]) }", ""},
		{"var ps []*shape; for i := 0; i < 2; i++ { ps = append(ps, &shape{}) }", ""},
		{"var fs []func() int; for i := 0; i < 2; i++ { fs = append(fs, @func() int { return i }) }", "write i := i just before it"},
		{"var fs []func() int; for i := 0; i < 2; i++ { i := i; fs = append(fs, func() int { return i }) }", ""},
		{"var fs []func() int; for i := 0; i < 2; i++ { k := i; fs = append(fs, @func() int { k++; return k }); if i == 1 { return } }", "k, a variable of the loop"},
		{"var fs []func() int; for i := 0; i < 2; i++ { k := i; fs = append(fs, func() int { return k }); k = 5 }", ""},
		{"for i := range xs { sort.SliceStable(xs, func(a, b int) bool { return xs[a] < xs[b]*float64(i) }) }", ""},
		{"_ = struct{ @error }{}", "embedding interface error"},
		{"_ = struct{ @strings.Builder }{}", "embedding type strings.Builder"},
		{"xs[0], s = 1, shape{}", ""},
		{"m := map[string]float64{}; m[\"a\"], xs[0] = 1, 2; m[\"a\"], xs[0] = two()", ""},
		{"for i, ys := 0, xs; i < 2; i, ys = i+1, nil { _ = ys }", ""},
		{"var b strings.Builder; fmt.Fprint(&b, 1); fmt.Fprintf(&b, \"%d\", 1)", ""},
		{"var b strings.Builder; fmt.Fprintf(&b, @\"%p\", &array)", "format %p"},
		{"_ = fmt.Sprintf(@\"%p\", &array)", "format %p"},
		{"_ = fmt.Sprintf(@\"%+v\", s)", "format %+v"},
		{"_ = fmt.Sprintf(\"%d %s\", 1, @2.5)", "%s does not print values of type float64"},
		{"_ = fmt.Sprintf(\"%d\", @s)", "%d does not print values of type shape"},
		{"_ = fmt.Sprintf(@\"%d %d\", 1)", "there is no value for %d"},
		{"_ = fmt.Sprintf(\"%d\", 1, @2)", "no verb for this value"},
		{"_ = fmt.Sprintf(@\"%[1]d\", 1)", "argument numbers"},
		{"_ = fmt.Sprintf(@\"5%\")", "ends within a verb"},
		{"_ = fmt.Sprintf(\"%*.*f %-+8.3e %5t %% %q %x %v %6.2f\", 3, 2, 1.5, 2.5, true, \"a\", []byte{1}, s, xs)", ""},
		{"_ = fmt.Errorf(\"%w and %v\", errors.New(\"a\"), errors.New(\"b\"))", ""},
		{"_ = fmt.Sprint(@map[float64]int{})", "could be NaN"},
		{"var b strings.Builder; _ = b.@Cap()", "Cap is not available"},
		{"format := \"%d\"; _ = fmt.Sprintf(@format, 1)", "the format of Sprintf is not a constant"},
		{"_ = fmt.Sprint(@any(1))", "no printed form"},
		{"_ = fmt.Sprint(@[]*int{})", "no printed form"},
		{"_ = fmt.Sprint([]any{1}@...)", "hidden in a slice"},
		{"_ = fmt.Sprint(s, xs, array, map[string]int{})", ""},
		{"sort.@Slice(xs, func(i, j int) bool { return false })", "sort.SliceStable"},
		{"fmt.@Println(1)", "fmt.Println is not available"},
	} {
		body, col := c.body, strings.LastIndex(c.body, "@")
		body = strings.ReplaceAll(body, "@", "")
		const head = "\nfunc F() (x int) {\n"
		src := head + body + "\nreturn\n}\nfunc f(int) {}\nfunc two() (float64, float64) { return 1, 2 }\ntype shape struct{ r float64 }\nfunc (s shape) area() float64 { return s.r }\n"
		src = strings.Replace(src, "{\n", "{ xs := []float64{1}; array := [2]int{}; s := shape{}; _, _, _ = xs, array, s\n", 1)
		_, diags := Check("r.md", []byte(src))
		if c.want == "" {
			if len(diags) > 0 {
				t.Errorf("%s: %v", c.body, diags)
			}
			continue
		}
		found := false
		for _, d := range diags {
			if strings.Contains(d.String(), strings.TrimPrefix(c.want, "@")) {
				found = true
				at := col + 1 - strings.Count(c.body[:max(col, 0)], "@")
				if col >= 0 && d.Pos.Col != at && !strings.Contains(c.want, "hidden") {
					t.Errorf("%s: reported in column %d, not %d: %v", c.body, d.Pos.Col, at, d)
				}
			}
		}
		if !found {
			t.Errorf("%s: %v, want %s", c.body, diags, c.want)
		}
	}
}

// TestLintDeclarations does the same for top-level declarations.
func TestLintDeclarations(t *testing.T) {
	for src, want := range map[string]string{
		"var x = 1":                         "2:1: a variable outside functions",
		"func init() {}":                    "2:6: func init is never called",
		"func main() {}":                    "2:6: func main is never called",
		"func f[T any](x T) {}":             "2:7: type parameters are not available",
		"type s[T any] struct{ x T }":       "2:7: type parameters are not available",
		"type c interface{ ~int | string }": "2:8: a constraint is not available",
		"type t struct{}\nfunc (t) Error() string { return \"\" }": "3:10: method Error would not be found",
		"type fit struct{}": "2:6: type fit would hide",
		"type float64 int":  "2:6: type float64 would hide",
		"func f() float64":  "2:6: func f has no body",
		"//each:a in b\n\nfunc F(a int) (x int) { return a }":              "belongs to no step",
		"// each:a in b\nfunc F(a int) (x int) { return a }":               "malformed directive",
		"//each:a in b\n//each:a in c\nfunc F(a int) (x int) { return a }": "second directive",
		"//eech:a in b\nfunc F(a int) (x int) { return a }":                "nearest known name: each",
		"func F() (x complex128) { return 1i }":                            "complex numbers",
		"func F() (x map[float64]int) { return }":                          "keys are neither strings nor integers",
		"type list struct{ Next []list }\nfunc F() (x list) { return }":    "contains itself",
		"func F(f func()) (x int) { return 1 }":                            "holds a function",
		"func F() {}":                                                      "step F has no result",
		"func F() (x int, e error) { return }":                             "the error of step F is called e; call it err",
		"func F() (err int) { return }":                                    "result err of step F is no error",
		"func F() (x int, _ error) { return }":                             "write (x int, err error)",
	} {
		_, diags := Check("r.md", []byte("\n"+src+"\n"))
		if !strings.Contains(diags.Error(), want) {
			t.Errorf("%s: %v, want %s", src, diags, want)
		}
	}
}
