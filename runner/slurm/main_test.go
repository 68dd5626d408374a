package slurm_test

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"rimlight/runner/command"
	"rimlight/runner/record"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// TestMain lets this test binary serve as the program, here and on nodes, and as
// the worker that it starts.
func TestMain(m *testing.M) {
	if worker.Requested() || filepath.Base(os.Args[0]) == "rimlight" {
		command.Main()
	}
	os.Exit(m.Run())
}

// recipe measures channels one by one, each in a time that the setting loops
// decides on, and ends in a spectrum.
const recipe = `# Channels

| setting | value | unit | about |
|---|---|---|---|
| count | 16 | | channels |
| loops | 2000000 | | work for each |
| bad | -1 | | a channel that fails |

` + "```go" + `
// List makes the channels.
func List(count int) (curves []lightcurve.Curve) {
	for i := 0; i < count; i++ {
		curves = append(curves, lightcurve.Curve{Channel: lightcurve.Channel{Index: i, Lo: 1 + 0.1*float64(i), Hi: 1.1 + 0.1*float64(i)}})
	}
	return
}

// Measure measures one.
//
//each:curve in curves
func Measure(curve lightcurve.Curve, loops int, bad int, seed uint64) (point spectrum.Point, err error) {
	if curve.Channel.Index == bad {
		err = errors.New("this channel is bad")
		return
	}
	s := 0.0
	for i := 0; i < loops; i++ {
		s += 1
	}
	ratio := 0.1 + 0.001*float64(seed%1000)/1000
	point = spectrum.Point{Channel: curve.Channel, Depth: ratio * ratio, DepthErr: 1e-5, RadiusRatio: ratio, RadiusRatioErr: 1e-5 * s / float64(loops), Dof: 10, Used: 10, Chi2: 9}
	return
}

// Assemble puts the channels together.
func Assemble(point []spectrum.Point) (assembled spectrum.Spectrum, err error) {
	assembled, err = spectrum.Assemble(point, nil)
	return
}
` + "```\n"

// A bench is a folder with the recipe in it.
type bench struct {
	t    *testing.T
	dir  string
	args []string
	env  []string
}

func newBench(t *testing.T, args ...string) *bench {
	b := &bench{t: t, dir: t.TempDir(), args: args}
	if err := os.WriteFile(b.path("r.md"), []byte(recipe), 0o644); err != nil {
		t.Fatal(err)
	}
	return b
}

func (b *bench) path(names ...string) string {
	return filepath.Join(append([]string{b.dir}, names...)...)
}

// start starts a run as a process of its own.
func (b *bench) start(args ...string) (*exec.Cmd, *bytes.Buffer) {
	b.t.Helper()
	exe, err := os.Executable()
	if err != nil {
		b.t.Fatal(err)
	}
	c := exec.Command(exe)
	c.Args = append(append([]string{"rimlight", "run", b.path("r.md")}, b.args...), args...)
	c.Env = append(os.Environ(), b.env...)
	said := new(bytes.Buffer)
	c.Stdout, c.Stderr = said, said
	if err := c.Start(); err != nil {
		b.t.Fatal(err)
	}
	b.t.Cleanup(func() { c.Process.Kill(); c.Wait() })
	return c, said
}

// run runs the recipe to the end, demands an exit status, and gives the record
// and what was said.
func (b *bench) run(status int, args ...string) (*record.Record, string) {
	b.t.Helper()
	c, said := b.start(args...)
	return b.wait(c, said, status), said.String()
}

func (b *bench) wait(c *exec.Cmd, said *bytes.Buffer, status int) *record.Record {
	b.t.Helper()
	c.Wait()
	if got := c.ProcessState.ExitCode(); got != status {
		b.t.Fatalf("exit status %d, expected %d; it said\n%s", got, status, said)
	}
	r, err := record.Read(b.path("r.out", "run.json"))
	if err != nil {
		b.t.Fatalf("%v; it said\n%s", err, said)
	}
	return r
}

// tree is what a run came to: every object, every key with what it gave, and
// the spectrum.
func (b *bench) tree() string {
	b.t.Helper()
	var out []string
	objects, _ := filepath.Glob(b.path("rimlight.store", "objects", "*", "*"))
	for _, o := range objects {
		data, err := os.ReadFile(o)
		if err != nil || store.HashOf(data).String() != filepath.Base(o) {
			b.t.Errorf("%s: %v, or damaged", o, err)
		}
		out = append(out, filepath.Base(o))
	}
	s, err := store.Open(b.path("rimlight.store"))
	if err != nil {
		b.t.Fatal(err)
	}
	for _, name := range b.records() {
		key, err := store.ParseKey(filepath.Base(name))
		if err != nil {
			b.t.Errorf("%s is not reproducible", name)
			continue
		}
		r, ok, err := s.Record(key)
		if !ok {
			b.t.Errorf("record %s: %v", name, err)
		}
		for _, res := range r.Results {
			out = append(out, key.String()+" "+res.Name+" "+res.Hash.String())
		}
	}
	csv, err := os.ReadFile(b.path("r.out", "spectrum.csv"))
	if err != nil {
		b.t.Error(err)
	}
	return strings.Join(out, "\n") + "\n" + string(csv)
}

// records are the files of the records.
func (b *bench) records() []string {
	names, _ := filepath.Glob(b.path("rimlight.store", "records", "*", "*"))
	return names
}

// until waits for something that takes at most a minute, even on a busy machine.
func (b *bench) until(what string, ok func() bool) {
	b.t.Helper()
	for deadline := time.Now().Add(time.Minute); !ok(); time.Sleep(20 * time.Millisecond) {
		if time.Now().After(deadline) {
			b.t.Fatalf("%s: not within a minute", what)
		}
	}
}

// finished gives the records there are, and when they were written.
func (b *bench) finished() map[string]time.Time {
	out := map[string]time.Time{}
	for _, name := range b.records() {
		if st, err := os.Stat(name); err == nil {
			out[name] = st.ModTime()
		}
	}
	return out
}

// untouched holds that none of those records was written again, or set aside.
func (b *bench) untouched(before map[string]time.Time) {
	b.t.Helper()
	now := b.finished()
	for name, when := range before {
		if !now[name].Equal(when) {
			b.t.Errorf("%s was computed again", name)
		}
	}
}

// logs are the logs of the jobs of a batch that runs.
func (b *bench) logs() map[string]string {
	out := map[string]string{}
	names, _ := filepath.Glob(b.path("r.out", "slurm", "*", "log-*.txt"))
	for _, n := range names {
		if text, err := os.ReadFile(n); err == nil {
			out[n] = string(text)
		}
	}
	return out
}

// clean holds that nothing but gathered logs is left of the jobs.
func (b *bench) clean() {
	b.t.Helper()
	entries, err := os.ReadDir(b.path("r.out", "slurm"))
	if err != nil {
		b.t.Error(err)
	}
	for _, e := range entries {
		if !strings.HasSuffix(e.Name(), ".log") {
			b.t.Errorf("%s is left behind", e.Name())
		}
	}
}
