package program

import (
	"encoding/json"
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
	"os"
	"os/exec"
	"path/filepath"
	"sort"
	"strconv"
	"strings"
	"testing"

	"rimlight/runner/program/available"
	"rimlight/runner/program/exportdata"
)

// defaultRandom is the number of random programs of an ordinary test run, and
// defaultSeed makes them the same every time. RIMLIGHT_RANDOM_PROGRAMS sets
// another number, RIMLIGHT_SEED asks for others.
const (
	defaultRandom = 40
	defaultSeed   = 1
)

// TestInterpreterAgreesWithGo runs every program that is not refused in the
// interpreter, and all of them compiled, and compares what they give. Programs
// that could depend on Go's change of loop variables are compiled both ways.
// Programs that are refused must have deserved it, or be listed in
// testdata/program/strict.md.
func TestInterpreterAgreesWithGo(t *testing.T) {
	if testing.Short() {
		t.Skip("needs the Go toolchain and half a minute")
	}
	var fixed []sample
	for _, s := range corpus(t) {
		if thorough() || s.turn%3 == 0 {
			fixed = append(fixed, s)
		}
	}
	random, seed := randomSamples(t)
	got := map[string]string{}
	complaint := map[string]string{}
	var valid []sample
	refused, refusedRandom := 0, 0
	samples := append(fixed[:len(fixed):len(fixed)], random...)
	var errands []errand
	for _, s := range samples {
		errands = append(errands, s.errand(checked))
	}
	for i, o := range apart(t, errands) {
		s := samples[i]
		switch {
		case o.Ended != "":
			t.Errorf("%s ends the interpreter: %s\n%s", s.name, o.Ended, s.source())
			continue
		case o.Refused == "":
			got[s.name] = string(o.Text)
		case i >= len(fixed):
			refusedRandom++
			t.Logf("%s is refused: %v", s.name, o.Refused)
			continue
		default:
			refused++
			complaint[s.name] = o.Refused
		}
		if o.Refused == "" || typed(s) != nil && !undetermined(s) {
			valid = append(valid, s)
		}
	}
	want := compiled(t, valid)
	same, wrong := 0, 0
	var suspects []sample
	for _, s := range valid {
		if complaint[s.name] != "" {
			suspects = append(suspects, s)
			continue
		}
		var differ []string
		for _, w := range want[s.name] {
			if w != got[s.name] {
				differ = append(differ, w)
			}
		}
		switch {
		case len(want[s.name]) == 0:
			t.Errorf("%s: the compiled program gave nothing", s.name)
		case len(differ) == 0:
			same++
		default:
			wrong++
			t.Errorf("%s differs:\ninterpreted %.600s\ncompiled    %.600s\n%s", s.name, got[s.name], differ[0], s.source())
		}
	}
	strict := judge(t, suspects, complaint, want)
	t.Logf("%d fixed and %d random programs (RIMLIGHT_SEED=%d): %d same, %d wrong; refused: %d fixed, %d of them needlessly, %d random",
		len(fixed), len(random), seed, same, wrong, refused, strict, refusedRandom)
	if refusedRandom > len(random)/10 {
		t.Errorf("more than a tenth of the random programs are refused: the generator or the rules are off")
	}
}

// thorough reports whether all programs are to be run. Otherwise one in three of
// those made by rule is.
func thorough() bool { return os.Getenv("RIMLIGHT_REQUIRE") != "" || *update }

// setting reads a number from the environment.
func setting(t testing.TB, name string, without uint64) uint64 {
	v := os.Getenv(name)
	if v == "" {
		return without
	}
	n, err := strconv.ParseUint(v, 10, 64)
	if err != nil {
		t.Fatalf("%s: %v", name, err)
	}
	return n
}

func randomSamples(t testing.TB) (out []sample, seed uint64) {
	count := setting(t, "RIMLIGHT_RANDOM_PROGRAMS", defaultRandom)
	seed = setting(t, "RIMLIGHT_SEED", defaultSeed)
	for i := uint64(0); i < count; i++ {
		out = append(out, sample{name: fmt.Sprintf("random%d_%d", seed, i), shared: randomPrelude, body: randomProgram(seed, i)})
	}
	return out, seed
}

// compiled builds one program of all samples and runs it. A sample has one
// output, or two when it was compiled for both rules of loop variables.
func compiled(t testing.TB, samples []sample) map[string][]string {
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
			shared := map[string]string{} // prefixes of declarations that samples share
			for i, s := range part {
				if rule == "old" && !(strings.Contains(s.body, "for ") && (strings.Contains(s.body, "func(") || strings.Contains(s.body, "&"))) {
					continue
				}
				prefix := fmt.Sprintf("%s%d_", rule, start+i)
				first, again := shared[s.shared]
				if !again {
					first = prefix
					shared[s.shared] = first
				}
				body.WriteString(prefixed(s, first, prefix, again))
				calls = append(calls, fmt.Sprintf("\tshow(%q, %sRun)", s.name, prefix))
			}
			head := "package main\n\nimport (\n"
			uses := ""
			for _, p := range available.Packages {
				if anyOf[p.Path] != "" && exportdata.Has(p.Path) {
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
			fmt.Print("PANIC\x01")
		}
	}()
	fmt.Print(name, "\x00")
	fmt.Print(run(), "\x01")
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
	result := map[string][]string{}
	records := strings.Split(string(out), "\x01")
	for _, record := range records {
		if name, text, ok := strings.Cut(record, "\x00"); ok {
			result[name] = append(result[name], text)
		}
	}
	if err != nil {
		last, _, _ := strings.Cut(records[len(records)-1], "\x00")
		t.Fatalf("compiled programs: %v, in %s", err, last)
	}
	return result
}

// anyOf has an object of each package that samples use, so that its import is
// used.
var anyOf = map[string]string{
	"math/bits": "bits.Len", "math/cmplx": "cmplx.Abs", "errors": "errors.New", "fmt": "fmt.Sprint", "math": "math.Abs",
	"sort": "sort.Ints", "strconv": "strconv.Itoa", "strings": "strings.Count", "unicode/utf8": "utf8.RuneLen",
	"rimlight/steps/lightcurve": "lightcurve.Cube{}",
}

// typed is the sample as far as the type checker knows it, nil when it is not
// valid Go.
func typed(s sample) *checker {
	c := &checker{file: s.name, fset: token.NewFileSet(), src: []byte(s.source())}
	c.fset.AddFile("", -1, firstPos)
	if c.scan(); len(c.diags) > 0 {
		return nil
	}
	if c.syntax(nil); len(c.diags) > 0 {
		return nil
	}
	if c.typeCheck(); len(c.diags) > 0 {
		return nil
	}
	return c
}

// prefixed is the sample as written, with a prefix before the names that it
// declares at top level: shared for what it shares with others, own for the
// rest. With again the shared declarations are left out.
func prefixed(s sample, shared, own string, again bool) string {
	c := typed(s)
	top := c.pkg.Scope()
	base := c.fset.File(c.tree.FileStart).Base()
	begin := strings.IndexByte(string(c.src), '\n') + 1
	seam := begin + len(s.shared)
	prefix := map[int]string{}
	consider := func(id *ast.Ident, o types.Object) {
		if v, ok := o.(*types.Var); ok && v.Embedded() {
			if n := named(v.Type()); n != nil {
				o = n.Obj()
			}
		}
		if o == nil || o.Parent() != top {
			return
		}
		p := own
		if int(o.Pos())-base < seam {
			p = shared
		}
		prefix[int(id.Pos())-base] = p
	}
	ast.Inspect(c.tree, func(n ast.Node) bool {
		if id, ok := n.(*ast.Ident); ok && id.Name != "_" {
			consider(id, c.info.Defs[id])
			consider(id, c.info.Uses[id])
		}
		return true
	})
	var offsets []int
	for at := range prefix {
		if !again || at >= seam {
			offsets = append(offsets, at)
		}
	}
	sort.Ints(offsets)
	var b strings.Builder
	last := begin
	if again {
		last = seam
	}
	for _, at := range offsets {
		b.Write(c.src[last:at])
		b.WriteString(prefix[at])
		last = at
	}
	b.Write(c.src[last:])
	return b.String()
}
