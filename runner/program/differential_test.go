package program

import (
	"encoding/json"
	"fmt"
	"go/ast"
	"go/types"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"sort"
	"strconv"
	"strings"
	"testing"

	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

// defaultRandom is the number of random programs of an ordinary test run;
// RIMLIGHT_RANDOM_PROGRAMS sets another, RIMLIGHT_RANDOM_SEED other ones.
const defaultRandom = 100

// signOfZero names the programs whose results differ from compiled Go in the
// sign of a zero alone: a -0 given to a function of the recipe arrives as +0.
var signOfZero = map[string]bool{"r12": true, "r13": true, "r14": true, "r15": true, "s1": true, "s2": true, "s3": true}

// TestInterpreterAgreesWithGo runs every program that is not refused in the
// interpreter, and all of them compiled, and compares what they give. Programs
// that could depend on Go's change of loop variables are compiled both ways.
func TestInterpreterAgreesWithGo(t *testing.T) {
	if testing.Short() {
		t.Skip("needs the Go toolchain and half a minute")
	}
	samples := corpus(t)
	handmade := len(samples)
	samples = append(samples, randomSamples(t)...)

	var accepted []sample
	got := map[string]string{}
	refused, refusedRandom := 0, 0
	for i, s := range samples {
		out, err := interpret(s.name, s.src)
		if err != nil {
			refused++
			if i >= handmade {
				refusedRandom++
				t.Logf("%s is refused: %v", s.name, err)
			}
			continue
		}
		got[s.name] = out
		accepted = append(accepted, s)
	}
	want := compiled(t, accepted)
	same, signs := 0, 0
	for _, s := range accepted {
		var wrong []string
		for _, w := range want[s.name] {
			if w != got[s.name] {
				wrong = append(wrong, w)
			}
		}
		switch {
		case len(want[s.name]) == 0:
			t.Errorf("%s: the compiled program gave nothing", s.name)
		case len(wrong) == 0:
			same++
			if signOfZero[s.name] {
				t.Errorf("%s is listed for the sign of zero but agrees", s.name)
			}
		case signOfZero[s.name], strings.HasPrefix(s.name, "random") && differInSign(got[s.name], wrong):
			signs++
		default:
			t.Errorf("%s differs:\ninterpreted %.600s\ncompiled    %.600s\n%s", s.name, got[s.name], wrong[0], s.src)
		}
	}
	t.Logf("%d programs (%d random): %d same, %d refused (%d random), %d differ in the sign of zero, %d wrong",
		len(samples), len(samples)-handmade, same, refused, refusedRandom, signs, len(accepted)-same-signs)
	if refusedRandom > (len(samples)-handmade)/10 {
		t.Errorf("more than a tenth of the random programs are refused: the generator or the rules are off")
	}
}

var negativeZero = regexp.MustCompile(`-0([^.\w]|$)`)

func differInSign(got string, wrong []string) bool {
	plain := func(s string) string { return negativeZero.ReplaceAllString(s, "0$1") }
	for _, w := range wrong {
		if plain(w) != plain(got) {
			return false
		}
	}
	return true
}

func randomSamples(t *testing.T) []sample {
	count, seed := defaultRandom, uint64(1)
	if v := os.Getenv("RIMLIGHT_RANDOM_PROGRAMS"); v != "" {
		n, err := strconv.Atoi(v)
		if err != nil {
			t.Fatalf("RIMLIGHT_RANDOM_PROGRAMS: %v", err)
		}
		count = n
	}
	if v := os.Getenv("RIMLIGHT_RANDOM_SEED"); v != "" {
		n, err := strconv.ParseUint(v, 10, 64)
		if err != nil {
			t.Fatalf("RIMLIGHT_RANDOM_SEED: %v", err)
		}
		seed = n
	}
	var out []sample
	for i := 0; i < count; i++ {
		out = append(out, sample{fmt.Sprintf("random%d_%d", seed, i), source(randomProgram(seed, uint64(i)))})
	}
	return out
}

// compiled builds one program of all samples and runs it. A sample has one
// output, or two when it was compiled for both rules of loop variables.
func compiled(t *testing.T, samples []sample) map[string][]string {
	dir := t.TempDir()
	here, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	overlay := struct{ Replace map[string]string }{map[string]string{}}
	add := func(name, content string) {
		real := filepath.Join(dir, name)
		if err := os.WriteFile(real, []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
		overlay.Replace[filepath.Join(here, "compiledsamples", name)] = real
	}
	var calls []string
	const perFile = 50
	for start := 0; start < len(samples); start += perFile {
		part := samples[start:min(start+perFile, len(samples))]
		for _, rule := range []string{"new", "old"} {
			var body strings.Builder
			for i, s := range part {
				if rule == "old" && !(strings.Contains(s.src, "for ") && (strings.Contains(s.src, "func(") || strings.Contains(s.src, "&"))) {
					continue
				}
				prefix := fmt.Sprintf("%s%d_", rule, start+i)
				body.WriteString(prefixed(t, s, prefix))
				calls = append(calls, fmt.Sprintf("\tshow(%q, %sRun)", s.name, prefix))
			}
			head := "package main\n\nimport (\n"
			uses := ""
			for _, p := range available.Packages {
				if !available.IsStep(p.Path) && exportdata.Has(p.Path) {
					head += fmt.Sprintf("\t%q\n", p.Path)
					uses += "var _ = " + anyOf[p.Path] + "\n"
				}
			}
			head += ")\n\n" + uses
			if rule == "old" {
				head = "//go:build go1.21\n\n" + head
			}
			add(fmt.Sprintf("%s%d.go", rule, start), head+body.String())
		}
	}
	add("main.go", `package main

import "fmt"

func show(name string, run func() string) {
	defer func() {
		if r := recover(); r != nil {
			fmt.Printf("%s\x00PANIC\x01", name)
		}
	}()
	fmt.Printf("%s\x00%s\x01", name, run())
}

func main() {
`+strings.Join(calls, "\n")+"\n}\n")
	description, err := json.Marshal(overlay)
	if err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(dir, "overlay.json")
	if err := os.WriteFile(file, description, 0o644); err != nil {
		t.Fatal(err)
	}
	binary := filepath.Join(dir, "samples")
	build := exec.Command("go", "build", "-overlay", file, "-o", binary, "./compiledsamples")
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("go build: %v\n%.4000s", err, out)
	}
	out, err := exec.Command(binary).Output()
	if err != nil {
		t.Fatalf("compiled programs: %v", err)
	}
	result := map[string][]string{}
	for _, record := range strings.Split(string(out), "\x01") {
		if name, text, ok := strings.Cut(record, "\x00"); ok {
			result[name] = append(result[name], text)
		}
	}
	return result
}

// anyOf has an object of each standard package, so that its import is used.
var anyOf = map[string]string{
	"math/bits": "bits.Len", "math/cmplx": "cmplx.Abs", "errors": "errors.New", "fmt": "fmt.Sprint", "math": "math.Abs",
	"sort": "sort.Ints", "strconv": "strconv.Itoa", "strings": "strings.Count", "unicode/utf8": "utf8.RuneLen",
}

// prefixed is the sample as written, with a prefix before the names that it
// declares at top level.
func prefixed(t *testing.T, s sample, prefix string) string {
	c := check(s.name, []byte(s.src), nil)
	if len(c.diags) > 0 {
		t.Fatalf("%s: %v", s.name, c.diags)
	}
	top := c.pkg.Scope()
	declared := func(o types.Object) bool {
		if v, ok := o.(*types.Var); ok && v.Embedded() {
			n := named(v.Type())
			return n != nil && n.Obj().Parent() == top
		}
		return o != nil && o.Parent() == top
	}
	base := c.fset.File(c.tree.FileStart).Base()
	var offsets []int
	ast.Inspect(c.tree, func(n ast.Node) bool {
		if id, ok := n.(*ast.Ident); ok && id.Name != "_" && (declared(c.info.Defs[id]) || declared(c.info.Uses[id])) {
			offsets = append(offsets, int(id.Pos())-base)
		}
		return true
	})
	sort.Ints(offsets)
	var b strings.Builder
	last := strings.IndexByte(string(c.src), '\n') + 1
	for i, at := range offsets {
		if i > 0 && at == offsets[i-1] {
			continue
		}
		b.Write(c.src[last:at])
		b.WriteString(prefix)
		last = at
	}
	b.Write(c.src[last:])
	return b.String()
}
