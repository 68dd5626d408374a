package program

import (
	"strings"
	"testing"
)

const reached = `
const K = 2.5
const Other = 1
type arrow struct{ X, Y float64 }
func (t arrow) length() float64 { return math.Hypot(t.X, t.Y) * scale(1) }
func scale(n int) float64 { if n == 0 { return K }; return even(n-1) }
func even(n int) float64 { return scale(n) }
func unrelated() int { return Other }
type measured interface{ length() float64 }
func use(m measured) float64 { return m.length() }
func Step(a []float64) (r float64) { return use(arrow{a[0], a[1]}) + float64(len(a)) }
func Second(a []float64) (n int) { return unrelated() + len(a) }
`

func hashes(t *testing.T, src string) map[string]string {
	t.Helper()
	out := map[string]string{}
	for _, s := range accept(t, src).Steps {
		out[s.Name] = s.CodeHash
	}
	return out
}

func TestHashIgnores(t *testing.T) {
	base := hashes(t, reached)
	for name, src := range map[string]string{
		"a comment":              change(t, "func use(m measured)", "// use measures.\nfunc use(m /* it */ measured)"),
		"layout":                 change(t, "{ if n == 0 { return K }; return even(n-1) }", "{\n\tif n == 0 {\n\n\t\treturn K // it\n\t}\n\treturn even( n - 1 );\n}"),
		"parentheses":            change(t, "return even(n-1)", "return (even)((n-1))"),
		"constants moved":        change(t, "const K = 2.5\nconst Other = 1\n", "const (\n\tOther = 2 - 1\n\tK = 5.0 / 2\n)\n"),
		"order":                  change(t, "func use(m measured) float64 { return m.length() }\n", "") + "func use(m measured) float64 { return m.length() }\n",
		"an import":              change(t, "const K", "import \"math\"\nconst K"),
		"parameters apart":       change(t, "struct{ X, Y float64 }", "struct{ X float64; Y float64 }"),
		"an unused helper":       reached + "func idle() int { return 3 }\n",
		"a documented step":      change(t, "func Step", "// Step steps.\n//\n//each:a in numbers\nfunc Step"),
		"lines between the code": strings.ReplaceAll(reached, "\nfunc", "\n\n\n\nfunc"),
	} {
		for step, h := range hashes(t, src) {
			if h != base[step] {
				t.Errorf("%s changes the hash of %s", name, step)
			}
		}
	}
}

func TestHashSees(t *testing.T) {
	base := hashes(t, reached)
	for name, c := range map[string]struct {
		src  string
		both bool // whether Second changes too, besides Step
	}{
		"a constant":            {change(t, "K = 2.5", "K = 2.50001"), false},
		"its type":              {change(t, "const K = 2.5", "const K float64 = 2.5"), false},
		"a method":              {change(t, "math.Hypot(t.X, t.Y)", "math.Hypot(t.Y, t.X)"), false},
		"the order of fields":   {change(t, "X, Y float64 }", "Y, X float64 }"), false},
		"a helper in a cycle":   {change(t, "return scale(n) }", "return scale(n) + 1 }"), false},
		"a literal":             {change(t, "scale(1)", "scale(2)"), false},
		"a local name":          {change(t, "even(n int) float64 { return scale(n) }", "even(k int) float64 { return scale(k) }"), false},
		"a further method":      {change(t, "func scale", "func (t *arrow) grow() {}\nfunc scale"), false},
		"grouping":              {change(t, "return use(arrow{a[0], a[1]}) + float64(len(a))", "return use(arrow{a[0], a[1] + float64(len(a))})"), false},
		"signs":                 {change(t, "scale(1)", "scale(- -1)"), false},
		"both":                  {strings.ReplaceAll(reached, "len(a)", "len(a[1:])"), true},
		"an operator's operand": {change(t, "even(n-1)", "even(-(n-1))"), false},
	} {
		got := hashes(t, c.src)
		if got["Step"] == base["Step"] {
			t.Errorf("%s does not change the hash", name)
		}
		if (got["Second"] != base["Second"]) != c.both {
			t.Errorf("%s: hash of Second", name)
		}
	}
}

// TestPrecedence checks that the normal form tells trees apart that differ by
// parentheses only.
func TestPrecedence(t *testing.T) {
	forms := map[string]string{}
	for _, e := range []string{
		"a - (b - a)", "a - b - a", "-(a + b)", "-a + b", "(a + b) * a", "a + b*a", "a * (b / a)", "a * b / a", "-(-a)", "float64(int(a)<<1 + 1)", "float64(int(a)<<(1+1))",
		"float64(int(a) &^ int(b))", "float64(int(a) & (^int(b)))", "f(a)(b)", "f(f(a)(b))(a)", "*(&a)", "v.p.x", "(*v.p).x", "float64((*g)[0])", "float64(*(&(*g)[0]))",
		"float64(len((*g)[1:]))", "float64(len((*g)[:1]))",
	} {
		src := "\ntype node struct { p *node; x float64 }\nfunc f(a float64) func(float64) float64 { return func(b float64) float64 { return a + b } }\n" +
			"func Step(a, b float64) (r float64) { g := &[]int{1}; v := node{&node{nil, 1}, 2}; _, _ = g, v; return " + e + " }\n"
		code := accept(t, src).Steps[0].Code
		line := code[strings.Index(code, "\treturn "):]
		line = line[:strings.Index(line, "\n")]
		if other := forms[line]; other != "" {
			t.Errorf("%s and %s are both %s", e, other, line)
		}
		forms[line] = e
	}
}

func change(t *testing.T, from, to string) string {
	t.Helper()
	if !strings.Contains(reached, from) {
		t.Fatalf("%q is not in the source", from)
	}
	return strings.Replace(reached, from, to, 1)
}
