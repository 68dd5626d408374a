package trial

import (
	"bytes"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/command"
	"rimlight/runner/worker"
)

// TestMain lets this test binary serve as the program and as the worker that
// the program starts, as main of runner/cmd/rimlight does.
func TestMain(m *testing.M) {
	if worker.Requested() || filepath.Base(os.Args[0]) == "rimlight" {
		command.Main()
	}
	os.Exit(m.Run())
}

// elements is how many elements the fan-out of the recipe has.
const elements = 200

// recipe is a recipe of everything that a store keeps: an input, lists, a
// fan-out of 200 elements of some milliseconds with two results, one of which
// is kept as a list and one as a slice of numbers, a spectrum and a check.
const recipe = `# Two hundred channels

| input | file | layout | about |
|---|---|---|---|
| raw | raw.txt | text | a word |

| setting | value | unit | about |
|---|---|---|---|
| count | 200 | | channels |
| work | 5000 | | additions for each |

` + "```go" + `
// List makes the channels.
func List(count int) (channels []lightcurve.Channel) {
	for i := 0; i < count; i++ {
		channels = append(channels, lightcurve.Channel{Index: i, Lo: 1 + 0.01*float64(i), Hi: 1.01 + 0.01*float64(i)})
	}
	return
}

// Fit takes its time.
//
//each:channel in channels
func Fit(channel lightcurve.Channel, raw string, work int) (points spectrum.Point, steps float64) {
	for i := 0; i < work; i++ {
		steps += 1
	}
	points = spectrum.Point{Channel: channel, Depth: 0.01 + steps*1e-8 + float64(channel.Index)*1e-5, DepthErr: 1e-4 + float64(len(raw))*1e-6, Used: 10, Dof: 5}
	return
}

// Assemble makes the spectrum.
func Assemble(points []spectrum.Point) (depths spectrum.Spectrum, err error) {
	depths, err = spectrum.Assemble(points, nil)
	return
}

// Total adds up.
func Total(steps []float64) (total float64) {
	for _, s := range steps {
		total += s
	}
	return
}

// Check is content.
func Check(total float64) (checks []check.Check) {
	checks = append(checks, check.Check{Name: "the total", Value: total, Limit: "above 1", Passed: total > 1, Why: "All channels are to be there."})
	return
}
` + "```" + `
`

// A bench is a folder with the recipe in it, and room for its store and its
// report.
type bench struct {
	t     testing.TB
	dir   string
	store string
	out   string
	exe   string // the program
	gap   bool   // a run left a gap for an element that cost two workers their lives
}

func newBench(t testing.TB) *bench {
	t.Helper()
	dir := room(t)
	b := &bench{t: t, dir: dir, store: filepath.Join(dir, "rimlight.store"), out: filepath.Join(dir, "r.out")}
	b.write("r.md", recipe)
	b.write("raw.txt", "word\n")
	exe, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	b.exe = filepath.Join(dir, "rimlight")
	if err := os.Symlink(exe, b.exe); err != nil {
		t.Fatal(err)
	}
	return b
}

// room makes a folder that everybody may look into, in memory where there is
// such a place: it is processes that end here, not disks, and waiting for disks
// takes most of the time.
func room(t testing.TB) string {
	t.Helper()
	dir, err := os.MkdirTemp("/dev/shm", "rimlight-trial-")
	if err != nil {
		dir = t.TempDir()
	}
	if err := os.Chmod(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	return dir
}

func (b *bench) write(name, text string) {
	b.t.Helper()
	if err := os.WriteFile(filepath.Join(b.dir, name), []byte(text), 0o644); err != nil {
		b.t.Fatal(err)
	}
}

// program is the program as a process of its own.
func (b *bench) program(args ...string) *exec.Cmd {
	c := exec.Command(b.exe, args...)
	c.Dir = b.dir
	c.Env = append(os.Environ(), "TMPDIR="+b.tmp())
	return c
}

// tmp is the folder for temporary files of the program.
func (b *bench) tmp() string {
	dir := filepath.Join(b.dir, "tmp")
	if err := os.MkdirAll(dir, 0o777); err != nil {
		b.t.Fatal(err)
	}
	return dir
}

// command is the command line of a run of the recipe.
func (b *bench) command(args ...string) *exec.Cmd {
	return b.program(append([]string{"run", "r.md", "--jobs", "2"}, args...)...)
}

// run runs the recipe to its end, demands an exit status, and gives what was
// said.
func (b *bench) run(status int, args ...string) string {
	b.t.Helper()
	return demand(b.t, b.command(args...), status)
}

// verify has the store verified, demands an exit status, and gives what was
// said.
func (b *bench) verify(status int) string {
	b.t.Helper()
	return demand(b.t, b.program("store", "verify", b.store), status)
}

// started is a run that goes on, with what it will have said.
func (b *bench) started() (c *exec.Cmd, said *bytes.Buffer) {
	b.t.Helper()
	c, said = b.command(), new(bytes.Buffer)
	c.Stdout, c.Stderr = said, said
	if err := c.Start(); err != nil {
		b.t.Fatal(err)
	}
	return c, said
}

// demand runs a command and demands its exit status. It gives what was said.
func demand(t testing.TB, c *exec.Cmd, status int) string {
	t.Helper()
	var said bytes.Buffer
	c.Stdout, c.Stderr = &said, &said
	err := c.Run()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		t.Fatal(err)
	}
	if got := c.ProcessState.ExitCode(); got != status {
		t.Fatalf("%s: %v, expected exit status %d; it said\n%s", strings.Join(c.Args, " "), c.ProcessState, status, said.String())
	}
	return said.String()
}

// says demands that each of some texts was said.
func says(t testing.TB, said string, want ...string) {
	t.Helper()
	for _, w := range want {
		if !strings.Contains(said, w) {
			t.Errorf("nothing says %q in\n%s", w, said)
		}
	}
}
