package command

import (
	"bytes"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"sort"
	"strings"
	"testing"

	"rimlight/runner/record"
)

// arithmetic is a recipe of plain numbers, quick to run: a helper that two
// steps reach, a fan-out, a sum, a seed, and a step that depends on none.
const arithmetic = `# Squares

Text that nobody computes with.

| setting | value | unit | about |
|---|---|---|---|
| count | 12 | | numbers |
| offset | 0.5 | | added to each square |
| label | squares | | a name |

## Steps

` + "```go" + `
type pair struct {
	Index int
	Value float64
}

// square is used by one step only.
func square(x float64) float64 { return x * x }

// List makes the numbers.
func List(count int) (values []pair) {
	for i := 0; i < count; i++ {
		values = append(values, pair{Index: i, Value: float64(i)})
	}
	return
}

// Square squares one of them.
//
//each:value in values
func Square(value pair, offset float64) (squared float64, err error) {
	squared = square(value.Value) + offset
	return
}

// Sum adds up.
func Sum(squared []float64) (sum float64) {
	for _, s := range squared {
		sum += s
	}
	return
}

// Name writes a line.
func Name(label string) (line string) {
	line = strings.ToUpper(label)
	return
}

// Draw returns its seed.
func Draw(offset float64, seed uint64) (drawn uint64) {
	drawn = seed
	return
}
` + "```" + `
`

// A bench is a folder with a recipe in it, to run again and again.
type bench struct {
	t   *testing.T
	dir string
}

func newBench(t *testing.T, recipe string) *bench {
	b := &bench{t: t, dir: t.TempDir()}
	b.write(recipe)
	return b
}

func (b *bench) write(recipe string) {
	b.t.Helper()
	if err := os.WriteFile(filepath.Join(b.dir, "r.md"), []byte(recipe), 0o644); err != nil {
		b.t.Fatal(err)
	}
}

// run runs the recipe, demands an exit status, and returns the record and what
// was said.
func (b *bench) run(status int, args ...string) (*record.Record, string) {
	b.t.Helper()
	var out, errs bytes.Buffer
	got := Run(append([]string{"run", filepath.Join(b.dir, "r.md")}, args...), &out, &errs)
	said := out.String() + errs.String()
	if got != status {
		b.t.Fatalf("exit status %d, expected %d; it said\n%s", got, status, said)
	}
	r, err := record.Read(filepath.Join(b.dir, "r.out", recordFile))
	if err != nil && status != ExitWrong {
		b.t.Fatal(err)
	}
	return r, said
}

// reasons says in one line what each step did: "Name: why" for those computed,
// nothing for those reused.
func reasons(r *record.Record) string {
	var out []string
	for _, s := range r.Steps {
		switch s.State {
		case "computed":
			out = append(out, s.Name+": "+s.Why)
		case "reused":
		default:
			out = append(out, s.Name+": "+s.State)
		}
	}
	return strings.Join(out, "; ")
}

// hashes are the content hashes of all results, by name.
func hashes(r *record.Record) string {
	var out []string
	for _, s := range r.Steps {
		for _, v := range s.Results {
			out = append(out, v.Name+" "+v.Hash)
		}
	}
	sort.Strings(out)
	return strings.Join(out, "\n")
}

func TestRunTwiceReusesEverything(t *testing.T) {
	b := newBench(t, arithmetic)
	first, _ := b.run(ExitDone)
	if got := reasons(first); strings.Count(got, "first time") != 5 {
		t.Errorf("the first run computed: %s", got)
	}
	second, _ := b.run(ExitDone)
	if got := reasons(second); got != "" {
		t.Errorf("the second run computed: %s", got)
	}
	if hashes(first) != hashes(second) {
		t.Errorf("results differ:\n%s\n%s", hashes(first), hashes(second))
	}
}

// TestWhatRunsAgain changes one thing at a time and holds that exactly the
// steps that can see it run again, for the right reason.
func TestWhatRunsAgain(t *testing.T) {
	for _, c := range []struct {
		name, old, new string
		args           []string
		want           string
	}{
		{"prose", "Text that nobody computes with.", "Other text, and more of it.\n\nA paragraph.", nil, ""},
		{"comment", "// square is used by one step only.", "// square multiplies x by itself.", nil, ""},
		{"formatting", "func square(x float64) float64 { return x * x }", "func square(x float64) float64 {\n\treturn (x * x)\n}", nil, ""},
		{"title", "# Squares", "# Other squares", nil, ""},
		{"about", "added to each square", "added to every square", nil, ""},
		{"equal value", "| offset | 0.5 |", "| offset | 5e-1 |", nil, ""},
		{"helper", "return x * x", "return x * x * 1.5", nil, "Square: code changed; Sum: result squared changed"},
		{"unused helper", "// square is", "func cube(x float64) float64 { return x * x * x }\n\n// square is", nil, ""},
		{"step", "sum += s", "sum += s + 1", nil, "Sum: code changed"},
		{"setting in the recipe", "| label | squares |", "| label | cubes |", nil, "Name: setting label changed"},
		{"setting on the command line", "", "", []string{"--set", "label=lines"}, "Name: setting label changed"},
		{"setting of a fan-out", "", "", []string{"--set", "offset=2"}, "Square: setting offset changed; Sum: result squared changed; Draw: setting offset changed"},
		{"more elements", "", "", []string{"--set", "count=14"}, "List: setting count changed; Square: first time (2 of 14 elements); Sum: result squared changed"},
		{"same result by other code", "sum += s", "sum = sum + s", nil, "Sum: code changed"},
		{"a result that does not change stops the ripple", "squared = square(value.Value) + offset", "squared = offset + square(value.Value)", nil, "Square: code changed"},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			b := newBench(t, arithmetic)
			b.run(ExitDone)
			if c.old != "" {
				changed := strings.Replace(arithmetic, c.old, c.new, 1)
				if changed == arithmetic {
					t.Fatalf("%q is not in the recipe", c.old)
				}
				b.write(changed)
			}
			r, _ := b.run(ExitDone, c.args...)
			if got := reasons(r); got != c.want {
				t.Errorf("computed %q, expected %q", got, c.want)
			}
		})
	}
}

func TestJobsDoNotShow(t *testing.T) {
	want := ""
	for _, jobs := range []string{"1", "2", "5"} {
		b := newBench(t, arithmetic)
		r, _ := b.run(ExitDone, "--jobs", jobs)
		if got := hashes(r); want == "" {
			want = got
		} else if got != want {
			t.Errorf("with %s jobs the results are\n%s\nexpected\n%s", jobs, got, want)
		}
	}
}

// TestDamageHeals damages every object of the store, one run each, and holds
// that the run says so and comes to the same results.
func TestDamageHeals(t *testing.T) {
	b := newBench(t, arithmetic)
	first, _ := b.run(ExitDone)
	objects, err := filepath.Glob(filepath.Join(b.dir, "rimlight.store", "objects", "*", "*"))
	if err != nil || len(objects) < 10 {
		t.Fatalf("%d objects, error %v", len(objects), err)
	}
	for i, name := range objects {
		if i%3 != 0 {
			continue
		}
		data, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		data[len(data)/2] ^= 4
		os.Chmod(name, 0o644)
		if err := os.WriteFile(name, data, 0o644); err != nil {
			t.Fatal(err)
		}
		again, _ := b.run(ExitDone)
		if hashes(first) != hashes(again) {
			t.Errorf("with object %d damaged, results differ:\n%s\n%s", i, hashes(first), hashes(again))
		}
	}
}

func TestStepFailure(t *testing.T) {
	failing := strings.Replace(arithmetic, "squared = square(value.Value) + offset", "if value.Index == 7 {\n\t\terr = errors.New(\"seven is out\")\n\t\treturn\n\t}\n\tsquared = square(value.Value) + offset", 1)
	b := newBench(t, failing)
	r, said := b.run(ExitFailed)
	if !strings.Contains(said, "seven is out") || !strings.Contains(said, "1 of 12 elements") {
		t.Errorf("it said\n%s", said)
	}
	if got, want := reasons(r), "List: first time; Square: failed; Sum: not reached; Name: first time; Draw: first time"; got != want {
		t.Errorf("the run was %q, expected %q", got, want)
	}
	b.write(arithmetic)
	r, _ = b.run(ExitDone)
	if got := reasons(r); !strings.HasPrefix(got, "Square: code changed") {
		t.Errorf("after the repair: %q", got)
	}
}

// TestRecordOfFailure holds that the record of a run in which a step failed after
// a change can be read, and still tells the next run what changed.
func TestRecordOfFailure(t *testing.T) {
	b := newBench(t, arithmetic)
	b.run(ExitDone)
	b.write(strings.Replace(arithmetic, "sum += s\n", "sum += squared[int(s)+100]\n", 1))
	r, _ := b.run(ExitFailed, "--set", "offset=7")
	if sum := r.Steps[2]; sum.State != "failed" || sum.Key != "" || sum.KeyText == "" {
		t.Errorf("the step that failed is %+v", sum)
	}
	b.write(arithmetic)
	r, _ = b.run(ExitDone, "--set", "offset=7")
	if got := reasons(r); got != "Sum: result squared changed" {
		t.Errorf("after the repair: %q", got)
	}
}

func TestPanicIsAFailure(t *testing.T) {
	b := newBench(t, strings.Replace(arithmetic, "sum += s", "sum += squared[int(s)+100]", 1))
	_, said := b.run(ExitFailed)
	if !strings.Contains(said, "r.md:") || !strings.Contains(said, "index out of range") {
		t.Errorf("it said\n%s", said)
	}
}

func TestArgumentsAreTheStepsOwn(t *testing.T) {
	writing := strings.Replace(arithmetic, "for _, s := range squared {\n\t\tsum += s\n\t}", "for i := range squared {\n\t\tsum += squared[i]\n\t\tsquared[i] = 99\n\t}", 1)
	writing = strings.Replace(writing, "// Name writes", "// Again adds up once more.\nfunc Again(squared []float64) (sum2 float64) {\n\tfor _, s := range squared {\n\t\tsum2 += s\n\t}\n\treturn\n}\n\n// Name writes", 1)
	b := newBench(t, writing)
	r, _ := b.run(ExitDone, "--jobs", "1")
	h := map[string]string{}
	for _, s := range r.Steps {
		for _, v := range s.Results {
			h[v.Name] = v.Hash
		}
	}
	if h["sum"] == "" || h["sum"] != h["sum2"] {
		t.Errorf("a step that wrote into its argument changed another's: %v", h)
	}
}

func TestEvents(t *testing.T) {
	b := newBench(t, arithmetic)
	var out, errs bytes.Buffer
	if status := Run([]string{"run", filepath.Join(b.dir, "r.md"), "--json"}, &out, &errs); status != ExitDone {
		t.Fatalf("exit status %d: %s", status, errs.String())
	}
	if errs.Len() > 0 {
		t.Errorf("besides events it said %s", errs.String())
	}
	lines := strings.Split(strings.TrimSpace(out.String()), "\n")
	finished := 0
	for _, l := range lines {
		var ev map[string]any
		if err := json.Unmarshal([]byte(l), &ev); err != nil {
			t.Fatalf("%s: %v", l, err)
		}
		if ev["event"] == "step" && ev["state"] == "computed" {
			finished++
		}
	}
	if finished != 5 || !strings.Contains(lines[len(lines)-1], `"event":"end"`) {
		t.Errorf("%d steps finished; the last event is %s", finished, lines[len(lines)-1])
	}
}

func TestWrongCommands(t *testing.T) {
	b := newBench(t, arithmetic)
	recipe := filepath.Join(b.dir, "r.md")
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"run"}, "accepts 1 arg"},
		{[]string{"run", "nowhere.md"}, "there is no recipe nowhere.md"},
		{[]string{"run", b.dir}, "is a folder"},
		{[]string{"run", recipe, "--set", "cuont=3"}, "nearest: count"},
		{[]string{"run", recipe, "--set", "count"}, "expected NAME=VALUE"},
		{[]string{"run", recipe, "--set", "count=1", "--set", "count=2"}, "given twice"},
		{[]string{"run", recipe, "--set", "count=many"}, "count"},
		{[]string{"run", recipe, "--in", "raw=x.fits"}, "no input of this name"},
		{[]string{"run", recipe, "--jobs", "0"}, "at least 1"},
		{[]string{"run", recipe, "--on", "moon"}, "--on moon: expected local or slurm"},
		{[]string{"run", recipe, "--slurm-account", "x"}, "--slurm-account: only with --on slurm"},
		{[]string{"run", recipe, "--on", "slurm", "--slurm-cpus", "0"}, "--slurm-cpus 0"},
		{[]string{"run", recipe, "--on", "slurm", "--slurm-option", "qos=x"}, "expected an option of sbatch"},
		{[]string{"run", recipe, "--jbos", "2"}, "unknown flag"},
		{[]string{"rnu", recipe}, "unknown command"},
	} {
		var out, errs bytes.Buffer
		status := Run(c.args, &out, &errs)
		if status != ExitWrong || !strings.Contains(errs.String(), c.want) {
			t.Errorf("%v: exit status %d, said %q; expected status %d and %q", c.args, status, errs.String(), ExitWrong, c.want)
		}
	}
}

func TestCheckShowsWhatWouldRun(t *testing.T) {
	b := newBench(t, arithmetic)
	check := func(args ...string) string {
		var out, errs bytes.Buffer
		if status := Run(append([]string{"check", filepath.Join(b.dir, "r.md")}, args...), &out, &errs); status != ExitDone {
			t.Fatalf("exit status %d: %s", status, errs.String())
		}
		return out.String()
	}
	if got := check(); !strings.Contains(got, "would be computed: first time") || !strings.Contains(got, "waits for List") {
		t.Errorf("before the first run check says\n%s", got)
	}
	b.run(ExitDone)
	if got := check(); strings.Contains(got, "computed") || strings.Count(got, "known") != 5 {
		t.Errorf("after the first run check says\n%s", got)
	}
	if got := check("--set", "label=x"); !strings.Contains(got, "setting label changed") || strings.Count(got, "known") != 4 {
		t.Errorf("with another label check says\n%s", got)
	}
}

func ExampleRun() {
	var out, errs bytes.Buffer
	fmt.Println(Run([]string{"check", "nowhere.md"}, &out, &errs), errs.String())
	// Output: 2 rimlight: there is no recipe nowhere.md
}
