package program

import (
	"fmt"
	"math/rand/v2"
	"strings"
)

// randomPrelude declares what random programs use. Numbers are kept in bounds
// by clamp and ix, so that no program divides by zero or runs out of a slice.
const randomPrelude = `type P struct { X, Y float64; N int; A [2]float64; S []float64 }
type Q struct { P P; L []P; F func(float64) float64; M map[string]float64 }
type V []float64
type D float64
type K int
type Shape interface { Area(k float64) float64 }
type Sq struct { S float64; H [2]float64 }
type Ci struct { R float64; N int }
const C1 = 2.5
const C2 = 7
const ( K0 K = iota; K1; K2 )
func ix(i, n int) int { if n == 0 { return 0 }; i %= n; if i < 0 { i += n }; return i }
func (p P) Val(k float64) float64 { p.X += k; p.A[0] = p.X; return p.X + p.Y*p.A[0] }
func (p *P) Inc(k float64) { p.X += k; p.N++; p.A[1] -= k; p.S = append(p.S, k) }
func (p P) With(k float64) P { p.Y = k; p.A[1] = k * 2; return p }
func (v V) Dot(w []float64) (s float64) { for i, x := range v { s += x * w[ix(i, len(w))] }; return }
func mkP(a, b float64, n int) P { return P{X: a, Y: b, N: n, S: []float64{a}} }
func two(a float64, n int) (half float64, next int) { half, next = a*0.5, n+1; return }
func app(f func(float64) float64, x float64) float64 { return f(f(x)) }
func clamp(x float64) float64 { if x != x || x > 1e6 || x < -1e6 { return 1.25 }; return x }
func u32(x uint32) uint32 { return x }
func u8(x uint8) uint8 { return x }
func ci(n int) int { return n % 10007 }
func (q Sq) Area(k float64) float64 { q.H[0] += k; return q.S*q.S*k + q.H[0] }
func (c *Ci) Area(k float64) float64 { c.N++; return c.R*k + float64(c.N) }
func mkS(k int, x float64) Shape { if k%2 == 0 { return Sq{S: x} }; return &Ci{R: x} }
func tot(ss []Shape, k float64) (t float64) { for _, s := range ss { t += s.Area(k) }; return t }
func stat(xs []float64) (mean, sd float64, err error) { if len(xs) == 0 { return 0, 0, errors.New("empty") }; for _, x := range xs { mean += x }; mean /= float64(len(xs)); for _, x := range xs { sd += (x - mean) * (x - mean) }; sd = math.Sqrt(sd); return }
func vsum(k float64, xs ...float64) float64 { var s float64; for i, x := range xs { s += x * k * float64(i+1) }; return s }
func mapf(f func(float64) float64, xs []float64) []float64 { out := make([]float64, 0, len(xs)); for _, x := range xs { out = append(out, f(x)) }; return out }
func adder(k float64) func(float64) float64 { return func(x float64) float64 { k += 0.5; return x + k } }
func fact(n int) float64 { if n <= 1 { return 1 }; return float64(n) * fact(n-1) }
func rec(p P, n int) (r P) { p.X += float64(n); if n <= 0 { return p }; r = rec(p, n-1); r.A[0] += p.X; return }
func fold(xs []float64, init float64, f func(a, b float64) float64) float64 { a := init; for _, x := range xs { a = f(a, x) }; return a }
func find(xs []float64, pred func(float64) bool) (at int, ok bool) { for i, x := range xs { if pred(x) { return i, true } }; return -1, ok }
func upd(p *P, f func(float64) float64) { p.X = f(p.X); p.A[1] = f(p.A[1]) }
func nz() float64 { z := 0.0; return -z }
func (p P) neg() P { return P{X: -p.X, A: [2]float64{-p.A[0], -p.A[1]}} }
func arr(a [2]float64, k float64) [2]float64 { a[0] *= k; return a }
func pick(n int) (func(float64) float64, int) { if n%2 == 0 { return clamp, n }; return math.Floor, n + 1 }
func counted(n int) (next func() int, start int) { next = func() int { start++; return start }; return next, n }
`

// A kind is the type of a random expression.
type kind string

// typeText is each kind's type in Go.
var typeText = map[kind]string{
	"f": "float64", "i": "int", "b": "bool", "s": "[]float64", "a": "[2]float64", "P": "P", "u": "uint32", "y": "uint8",
	"D": "D", "k": "K", "F": "func(float64) float64", "l": "[]P", "p": "*P", "m": "map[string]float64", "Q": "Q",
	"g": "[][]float64", "t": "string", "S": "Shape", "SS": "[]Shape", "MP": "map[string]P",
}

// atoms are the expressions without operands.
var atoms = map[kind][]string{
	"f": {"0.5", "nz()", "1.5", "-2.25", "3.0", "C1", "1", "C2/2.0", "1e-3", "float64(C2)", "C1*C2", "7/2"},
	"i": {"0", "1", "2", "3", "-4", "C2", "5", "C2/2", "11%4", "ci(7)"},
	"b": {"true", "false", "C2 > 3"},
	"s": {"[]float64{1, 2.5, -3}"}, "a": {"[2]float64{1, 0.5}"}, "P": {"mkP(1, 2, 3)", "P{X: nz()}"},
	"u": {"u32(7)", "u32(4000000000)"}, "y": {"u8(200)", "u8(3)"}, "D": {"D(1.5)", "D(C1)"}, "k": {"K0", "K1", "K2"},
	"l": {"[]P{mkP(1, 2, 3), mkP(4, 5, 6)}"}, "p": {"&P{X: 1, Y: 2}"}, "F": {"func(x float64) float64 { return x + 1 }"},
	"m": {`map[string]float64{"a": 1, "b": 2}`}, "Q": {"Q{P: mkP(1, 1, 1)}"}, "g": {"[][]float64{{1, 2}, {3, 4}}"},
	"t": {`"a"`, `"b"`, `"zz"`}, "S": {"mkS(0, 2)"}, "SS": {"[]Shape{mkS(2, 1.5), mkS(3, 2)}"}, "MP": {`map[string]P{"a": mkP(1, 2, 3)}`},
}

// A form is an expression with holes: $X stands for an expression of kind X,
// #X for a variable of it, or the form is not used.
var forms = map[kind][]string{
	"f": {"($f + $f)", "($f - $f)", "($f * $f)", "($f / ($f + 1.5))", "-($f)", "float64($i)", "math.Abs($f)", "math.Sin($f)", "math.Max($f, $f)",
		"clamp($f)", "float64($u)/3", "float64($D)", "app($F, $f)", "#s[ix($i, len(#s))]", "#a[ix($i, 2)]", "#P.X", "#P.Y", "#P.A[1]", "#P.Val($f)", "#P.With($f).Y",
		"#p.X", "#p.Val($f)", "#l[ix($i, len(#l))].X", "#l[ix($i, len(#l))].A[0]", "#m[$t]", "#Q.P.X", "#Q.P.A[1]", "#Q.P.Val(1)", "#g[ix($i, len(#g))][0]",
		"V($s).Dot(append($s, 1))", "func() float64 { return $f }()", "func(q float64, n int) (r float64) { r = q * 2; r += float64(n); return }($f, $i)",
		"mkS($i, $f).Area($f)", "tot($SS, $f)", "vsum($f, $f, $f)", "vsum($f, $s...)", "vsum($f)", "adder($f)($f)", "fact(ix($i, 6))", "rec($P, ix($i, 4)).A[0]",
		"fold($s, $f, func(a, b float64) float64 { return clamp(a*0.5 + b) })", "#S.Area($f)", "tot(#SS, $f)", "#MP[$t].X", "math.Floor($f)", "#F($f)"},
	"i": {"($i + $i)", "($i - $i)", "($i * $i)", "($i | $i)", "($i & $i)", "($i ^ $i)", "($i / 3)", "($i % 5)", "len($s)", "int(clamp($f))", "int($y)", "int($k)",
		"#P.N", "#p.N", "ci($i)", "($i << 2)", "($i >> 1)", "-($i)", "len($l)", `strings.Count($t, "a")`, "len(#MP)", "func() (n int) { n = $i; return }()"},
	"b": {"($f < $f)", "($f >= $f)", "($f == $f)", "($f != $f)", "($i < $i)", "($i == $i)", "($b && $b)", "($b || $b)", "!($b)", "($a == $a)", "($y > 100)", "($k == K1)",
		`($t == "a")`, "(#p != nil)", `strings.HasPrefix($t, "a")`, "sort.Float64sAreSorted($s)"},
	"s": {"append([]float64(nil), $s...)", "append([]float64{$f}, $f, $f)", "mapf($F, $s)", "[]float64{$f, $f}", "#s[:ix($i, len(#s)+1)]", "#a[:]", "#P.S", "mapf(adder($f), $s)",
		"func() (out []float64, n int) { out, n = []float64{$f}, $i; return }()#0"},
	"a": {"[2]float64{$f, $f}", "arr($a, $f)", "#P.A", "#p.A"},
	"P": {"mkP($f, $f, $i)", "$P.neg()", "P{X: $f, A: $a}", "$P.With($f)", "#l[ix($i, len(#l))]", "(*#p)", "#Q.P", "rec($P, ix($i, 3))", "#MP[$t]"},
	"u": {"($u + $u)", "($u - $u)", "($u * $u)", "($u ^ $u)", "($u &^ $u)", "($u << 3)", "($u >> 5)", "uint32(ci($i))", "uint32($y)", "^$u"},
	"y": {"($y + $y)", "($y - $y)", "($y * $y)", "uint8(ci($i))", "($y << 3)", "uint8($u >> 9)"},
	"D": {"D($f)", "($D * $D)", "($D + 2)", "($D - C1)"},
	"k": {"K(ix($i, 3))", "($k + 1)"},
	"t": {"($t + $t)", "strconv.Itoa($i)"},
	"F": {"func(x float64) float64 { return x * $f }", "func(x float64) (r float64) { r = x; r -= $f; return }", "math.Sqrt", "clamp", "adder($f)", "func() func(float64) float64 { f, n := pick($i); _ = n; return f }()"},
	"l": {"[]P{$P, $P}", "append([]P(nil), $l...)", "append($l, $P)"},
	"p": {"&P{X: $f, Y: $f}"}, "m": {`map[string]float64{"a": $f, "zz": $f}`}, "Q": {"Q{P: $P, L: $l, F: $F}"}, "g": {"[][]float64{$s, $s}"},
	"S": {"mkS($i, $f)"}, "SS": {"[]Shape{mkS($i, $f), mkS(3, $f)}"}, "MP": {`map[string]P{"a": $P, "b": $P}`},
}

// A statement form may also declare: @X is a new variable of kind X, ^X a
// variable of kind X that may be assigned to, %n a block of up to n statements.
var statements = []string{
	"^f = $f", "^f += $f", "^f *= $f", "^f = clamp(^f + $f)", "^i = $i", "^i++", "^i ^= $i", "^b = $b", "^u -= $u", "^y += $y", "^D *= $D", "^P = $P", "^a = $a", "^F = $F", "^s = $s",
	"if len(^s) < 50 { ^s = append(^s, $f) }", "if len(^l) < 20 { ^l = append(^l, $P) }", "if len(#s) > 0 { #s[ix($i, len(#s))] += $f }",
	"if len(#l) > 0 { #l[ix($i, len(#l))].X = $f }", "^a[ix($i, 2)] = $f", "^P.X = $f", "^P.A[1] = $f", "^P.N++", "#p.X = $f", "*#p = $P", "^Q.P = $P", "^Q.P.X = $f", "#m[$t] = $f", "#MP[$t] = $P",
	"^P.Inc($f)", "#p.Inc($f)", "{ x, y := $f, $f; ^f, ^P.Y = y, x }", "@f, @i := two($f, $i)", "@f, @f, e := stat($s); _ = e", "@i, @b := find($s, func(x float64) bool { return x > $f })",
	"if $b %2", "if $b %2 else %1", "if $b %1 else if $b %1 else %1", "switch $k { case K0: %1; case K1, K2: %1; default: %1 }", "switch x := $i; { case x > 5: %1; case x < 0: %1; default: %1 }",
	"func() %2()", "var @S Shape = $S", "var @D D = $D", "const c = 7 / 2; var @f float64 = c",
	"if len(#l) > 0 { e := &#l[ix($i, len(#l))]; e.X += $f; e.A[0] = $f; e.Inc($f) }", "if x, ok := #m[$t]; ok { ^f += x }", "if x, ok := #MP[$t]; ok { ^f += x.X }",
	"{ g := func() { ^f = clamp(^f + $f) }; g(); g() }", "{ g := func(x float64) { if len(^s) < 40 { ^s = append(^s, x) } }; g($f); g($f) }",
	"^P.Y = fold($s, ^P.Y, func(a, b float64) float64 { return clamp(a - b + $f) })", "{ c := ^a; c[0]++; ^a[1] -= c[0]; ^f = c[1] }", "{ c := ^P; c.X++; c.A[0] -= ^P.A[0]; ^P.Y = c.X }",
	"sort.SliceStable(#l, func(i, j int) bool { return #l[i].X < #l[j].X })", "{ n := 5; for n > 0 { n -= 2; %1 } }", "func() { ^P = P{X: $f} }()",
	// what the normaliser rewrites
	"@i, @s := int($i), []float64{$f, $f}", "@P, @f := P{X: $f}, float64($f)", "^f, ^s = $f, []float64{$f}", "x := float64($f); x, y := float64($f), x; ^f = x - y", "var @i, @s = int($i), []float64{$f}",
	"if x, v := float64($f), []float64{$f}; x < v[0] %1 else %1", "#m[$t], ^i = two($f, $i)", `x := map[string]int{}; ^f, x["n"] = two($f, $i); ^i = x["n"]`,
	"{ var i int; var x float64; for i, x = range $s { ^f += x }; ^i += i }", "for i, x := range $s { x *= 2; i += 3; ^f += x; ^i += i }",
	"{ var fs []func(float64) float64; for i := 0; i < 3; i++ { k := float64(i) + $f; fs = append(fs, func(x float64) float64 { return x*k + ^f }) }; for _, f := range fs { ^f = clamp(f($f)) } }",
	"^f, ^i = clamp(^f + $f), ^i + len($s)", "^i, ^f = ^i + 1, clamp($f)", "#p.X, ^a[1], ^f = ^f, clamp($f), #p.X", "^f, ^i = func() (float64, int) { q := Q{F: $F}; return q.F($f), $i + 1 }()",
	"{ q := Sq{S: $f}; var s Shape = q; q.S = $f; ^f = clamp(s.Area(1) + q.S) }", "{ g := ^P.Val; ^P.X = $f; ^f = clamp(g($f)) }", "{ g := ^P.Inc; h := ^P.With; g($f); ^f = h($f).Y }",
	"{ var ss []Shape; for i := 0; i < 3; i++ { ss = append(ss, Sq{S: $f}); q := Sq{S: float64(i)}; ss = append(ss, q, mkS(i, $f)); q.S = 9 }; ^f = clamp(tot(ss, 1)) }",
	"{ var ps []*P; for i := 0; i < 4; i++ { q := $P; if i == 2 { continue }; ps = append(ps, &q); q.X += $f }; for _, q := range ps { ^f = clamp(^f + q.X) } }",
	"{ var fs []func() int; for i := 0; i < 3; i++ { n := $i; fs = append(fs, func() int { n++; return n }) }; ^i = fs[0]() + fs[0]() + fs[2]() }",
	"for i, r := range $t { ^i += i * int(r) }", "^i = 1 << ix($i, 5) | $i >> ix($i, 4)", "{ var b strings.Builder; fmt.Fprintf(&b, \"%d %.3g\", $i, float64($f)); ^i += b.Len() }",
	"{ var keys []string; for k := range #m { keys = append(keys, k) }; sort.Strings(keys); for i, k := range keys { ^f = clamp(^f + #m[k]*float64(i)) } }",
	"{ f, n := pick($i); ^f = f($f); ^i += n }", "{ fs := []func(float64) float64{clamp, $F}; fs[0], ^i = clamp, $i; ^f = clamp(fs[ix($i, 2)]($f)) }",
	"for _, r := range $t { ^i += int(r) }", "for i := 0; i < 3; { i++; %1 }", "{ next, n := counted($i); ^i = next()*n + next() }",
	"{ len := $i; sort := len + 1; ^i = sort }", "{ f := func(x float64) (r float64, ok bool) { if x > 1 { r = x; return }; g := func() { r = 3 }; g(); return r + 1, true }; x, ok := f($f); if ok { ^f = x } }",
	"outer: for i := 0; i < 3; i++ { for j := 0; j < 3; j++ { if j == 2 { continue outer }; if i == 2 && $b { break outer }; ^f += $f } }",
}

// declared kinds, in the frequency of their declaration.
var kinds = []kind{"f", "f", "f", "i", "i", "b", "s", "s", "a", "P", "P", "u", "y", "D", "k", "F", "l", "p", "m", "Q", "g", "t", "S", "SS", "MP"}

type variable struct {
	name  string
	kind  kind
	fixed bool
}

type randomWriter struct {
	r      *rand.Rand
	scopes [][]variable
	count  int
	inCase int
	loops  int
	binds  bool // a function variable is assigned to; what it gets may not call it
}

// randomProgram is a program that the rules accept, nearly always, to stand
// below randomPrelude; equal arguments give the same program.
func randomProgram(seed, index uint64) string {
	w := &randomWriter{r: rand.New(rand.NewPCG(seed, index)), scopes: [][]variable{nil}}
	var lines []string
	for n := 8 + w.r.IntN(10); n > 0; n-- {
		lines = append(lines, w.statement(2))
	}
	var shown []string
	for _, v := range w.scopes[0] {
		form := map[kind]string{
			"p": "fmt.Sprint(%[1]s.X, %[1]s.A, %[1]s.N, %[1]s.S)", "F": "fmt.Sprint(%[1]s(1.5))", "Q": "fmt.Sprint(%[1]s.P, %[1]s.L)",
			"S": "fmt.Sprint(%[1]s.Area(2))", "SS": "fmt.Sprint(tot(%[1]s, 1))",
		}[v.kind]
		if form == "" {
			form = "fmt.Sprint(%[1]s)"
		}
		shown = append(shown, fmt.Sprintf(form, v.name))
	}
	return "func Run() string {\n\t" + strings.Join(lines, "\n\t") +
		"\n\treturn strings.Join([]string{" + strings.Join(shown, ", ") + "}, \"|\")\n}\n"
}

func (w *randomWriter) pick(list []string) string { return list[w.r.IntN(len(list))] }

func (w *randomWriter) variable(k kind, assigned bool) string {
	var names []string
	if k == "F" && w.binds && !assigned {
		return ""
	}
	for _, s := range w.scopes {
		for _, v := range s {
			if v.kind == k && !(assigned && v.fixed) {
				names = append(names, v.name)
			}
		}
	}
	if names == nil {
		return ""
	}
	return w.pick(names)
}

func (w *randomWriter) declare(k kind) string {
	w.count++
	name := fmt.Sprintf("v%d", w.count)
	w.scopes[len(w.scopes)-1] = append(w.scopes[len(w.scopes)-1], variable{name, k, false})
	return name
}

func (w *randomWriter) expr(k kind, depth int) string {
	if depth <= 0 || w.r.IntN(7) == 0 {
		if v := w.variable(k, false); v != "" && w.r.IntN(4) > 0 {
			return v
		}
		return w.pick(atoms[k])
	}
	for try := 0; try < 4; try++ {
		form := w.pick(forms[k])
		if strings.HasSuffix(form, "#0") {
			// the first of two results, by way of a function
			form = strings.Replace(strings.TrimSuffix(form, "#0"), "func()", "func() []float64 { out, _ := func()", 1) + "; return out }()"
		}
		if out, ok := w.fill(form, depth-1); ok {
			return out
		}
	}
	return w.pick(atoms[k])
}

// fill replaces the holes of a form. The same variable serves all holes of one
// kind that want one.
func (w *randomWriter) fill(form string, depth int) (string, bool) {
	var out strings.Builder
	read, written := map[kind]string{}, map[kind]string{}
	var fresh []variable
	for i := 0; i < len(form); i++ {
		c := form[i]
		if !strings.ContainsRune("$#^@%", rune(c)) || i+1 == len(form) || !isHole(form[i+1]) || c == '%' && form[i+1] > '9' || c == '^' && i > 0 && form[i-1] == '&' {
			out.WriteByte(c)
			continue
		}
		if c == '%' {
			i++
			out.WriteString(w.block(depth-1, int(form[i]-'0')))
			continue
		}
		k := kind(form[i+1 : i+2])
		i++
		if i+1 < len(form) && (form[i:i+2] == "SS" || form[i:i+2] == "MP") {
			k = kind(form[i : i+2])
			i++
		}
		switch c {
		case '$':
			out.WriteString(w.expr(k, depth))
		case '#':
			if read[k] == "" {
				read[k] = w.variable(k, false)
			}
			if read[k] == "" {
				return "", false
			}
			out.WriteString(read[k])
		case '^':
			if written[k] == "" {
				written[k] = w.variable(k, true)
			}
			if written[k] == "" {
				return "", false
			}
			out.WriteString(written[k])
		case '@':
			w.count++
			name := fmt.Sprintf("v%d", w.count)
			fresh = append(fresh, variable{name, k, false})
			out.WriteString(name)
		}
	}
	for _, v := range fresh {
		w.scopes[len(w.scopes)-1] = append(w.scopes[len(w.scopes)-1], v)
		out.WriteString("; _ = " + v.name)
	}
	return out.String(), true
}

func isHole(c byte) bool {
	return c >= '0' && c <= '9' || strings.IndexByte("fibsaPuyDkFlpmQgtSM", c) >= 0
}

func (w *randomWriter) block(depth, n int) string {
	w.scopes = append(w.scopes, nil)
	var lines []string
	for ; n > 0; n-- {
		lines = append(lines, w.statement(depth))
	}
	w.scopes = w.scopes[:len(w.scopes)-1]
	return "{ " + strings.Join(lines, "; ") + " }"
}

func (w *randomWriter) statement(depth int) string {
	choice := w.r.IntN(10)
	switch {
	case choice < 4:
		k := kinds[w.r.IntN(len(kinds))]
		x := w.expr(k, 3)
		v := w.declare(k)
		if w.r.IntN(3) > 0 || k == "S" {
			return fmt.Sprintf("var %s %s = %s; _ = %s", v, typeText[k], x, v)
		}
		return fmt.Sprintf("%s := %s(%s); _ = %s", v, conversion(k), x, v)
	case choice < 5 && depth > 0:
		return w.loop(depth)
	}
	for try := 0; try < 6; try++ {
		form := w.pick(statements)
		nested := strings.ContainsAny(form, "%")
		if nested && depth <= 0 || strings.HasPrefix(form, "outer") && w.loops > 0 {
			continue
		}
		if strings.HasPrefix(form, "outer") || strings.HasPrefix(form, "x :=") || strings.HasPrefix(form, "const c") {
			form = "{ " + form + " }"
			if strings.HasPrefix(form, "{ outer") && w.inCase > 0 || strings.Contains(form, "@") {
				continue
			}
		}
		if strings.HasPrefix(form, "{ outer") {
			w.count++
			form = strings.ReplaceAll(form, "outer", fmt.Sprintf("outer%d", w.count))
		}
		if strings.HasPrefix(form, "switch") {
			w.inCase++
		}
		if strings.Contains(form, "for ") {
			w.loops++
		}
		w.binds = strings.HasPrefix(form, "^F =")
		out, ok := w.fill(form, min(depth, 2))
		w.binds = false
		if strings.Contains(form, "for ") {
			w.loops--
		}
		if strings.HasPrefix(form, "switch") {
			w.inCase--
		}
		if ok {
			return out
		}
	}
	return "_ = 0"
}

func conversion(k kind) string {
	t := typeText[k]
	if strings.HasPrefix(t, "*") || strings.HasPrefix(t, "func") {
		return "(" + t + ")"
	}
	return t
}

// loop is a for or range statement whose variables the body only reads.
func (w *randomWriter) loop(depth int) string {
	w.loops++
	defer func() { w.loops-- }()
	if w.r.IntN(2) == 0 {
		w.count++
		v := fmt.Sprintf("v%d", w.count)
		w.scopes = append(w.scopes, []variable{{v, "i", true}})
		body := w.block(depth-1, 1+w.r.IntN(3))
		w.scopes = w.scopes[:len(w.scopes)-1]
		exit := ""
		if w.r.IntN(3) == 0 {
			exit = fmt.Sprintf("if %s == 2 { %s }; ", v, w.pick([]string{"break", "continue"}))
		}
		return fmt.Sprintf("for %s := 0; %s < %d; %s++ { %s := %s; _ = %s; %s%s }", v, v, 1+w.r.IntN(4), v, v, v, v, exit, body)
	}
	over := []kind{"s", "l", "a", "g"}[w.r.IntN(4)]
	element := map[kind]kind{"s": "f", "l": "P", "a": "f", "g": "s"}[over]
	x := w.expr(over, 2)
	w.count += 2
	i, v := fmt.Sprintf("v%d", w.count-1), fmt.Sprintf("v%d", w.count)
	w.scopes = append(w.scopes, []variable{{i, "i", true}, {v, element, true}})
	body := w.block(depth-1, 1+w.r.IntN(3))
	w.scopes = w.scopes[:len(w.scopes)-1]
	return fmt.Sprintf("for %s, %s := range %s { %s, %s := %s, %s; _ = %s; _ = %s; %s }", i, v, x, i, v, i, v, i, v, body)
}
