package worker

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"syscall"
	"testing"
	"time"

	"rimlight/runner/canon"
	"rimlight/runner/confine"
)

func TestMain(m *testing.M) {
	if Requested() {
		os.Exit(Main())
	}
	os.Exit(m.Run())
}

// code is a recipe of which each test calls what it needs.
func code(text string) Code { return Code{File: "test.md", Text: []byte(text)} }

const ordinary = `
func Double(x float64) (y float64) {
	y = 2 * x
	return
}

func Sum(list []float64) (sum float64) {
	for _, v := range list {
		sum += v
	}
	return
}

func Spin(x float64) (y float64) {
	for x > 0 {
		y += x
	}
	return
}

func Eat(x float64) (y float64) {
	var all [][]float64
	for x > 0 {
		all = append(all, make([]float64, 1<<16))
	}
	y = float64(len(all))
	return
}

func fall(n float64) float64 { return fall(n+1) + 1 }

func Fall(x float64) (y float64) {
	y = fall(x)
	return
}

func Flood(x float64) (text string, err error) {
	text = strings.Repeat("ab", int(x))
	return
}

func Repeat(x float64) (list []string) {
	text := strings.Repeat("ab", 10000000)
	for i := 0; i < int(x); i++ {
		list = append(list, text)
	}
	return
}
`

func begin(t testing.TB, o Options, files ...*os.File) *Worker {
	t.Helper()
	w, err := Start(context.Background(), o, files...)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(w.Close)
	return w
}

func loaded(t testing.TB, o Options) *Worker {
	t.Helper()
	w := begin(t, o)
	if err := w.Load(code(ordinary)); err != nil {
		t.Fatal(err)
	}
	return w
}

func sealed(t testing.TB, typ string, v any) []byte {
	t.Helper()
	layout, err := canon.Layout(reflect.TypeOf(v))
	if err != nil {
		t.Fatal(err)
	}
	b, err := canon.Marshal(v)
	if err != nil {
		t.Fatal(err)
	}
	return canon.Seal(typ, layout, b)
}

// objects is a receiver that holds on to what it gets.
type objects struct {
	list [][]byte
	now  []byte
}

func (o *objects) Part(b []byte) error {
	o.now = append(o.now, b...)
	return nil
}

func (o *objects) End() error {
	o.list, o.now = append(o.list, o.now), nil
	return nil
}

// discard is a receiver that does not.
type discard struct{}

func (discard) Part([]byte) error { return nil }
func (discard) End() error        { return nil }

func call(w *Worker, step string, args ...Arg) ([][]byte, Values, error) {
	var o objects
	v, err := w.Call(step, args, &o)
	return o.list, v, err
}

func TestCall(t *testing.T) {
	w := loaded(t, Options{})
	got, v, err := call(w, "Double", Bytes(sealed(t, "float64", 21.0)))
	if err != nil {
		t.Fatal(err)
	}
	if want := sealed(t, "float64", 42.0); len(got) != 1 || string(got[0]) != string(want) || !reflect.DeepEqual(v.Results, []Result{{"float64", "float64", 1}}) {
		t.Errorf("got %x, %+v, want %x", got, v.Results, want)
	}
}

// TestEnds holds that each way to end is told from the others, and that none
// is put down to chance.
func TestEnds(t *testing.T) {
	small := Options{StepTime: time.Minute, Memory: 256 << 20}
	for _, c := range []struct {
		step  string
		opts  Options
		cause Cause
		says  string
	}{
		{"Eat", small, OutOfMemory, "more than 256 MiB were needed; keep less at a time, or raise --step-memory"},
		{"Fall", Options{}, OutOfStack, "calls itself without end"},
	} {
		t.Run(c.step, func(t *testing.T) {
			t.Parallel()
			if racing && c.opts.Memory != 0 {
				t.Skip("a small limit of memory")
			}
			_, _, err := call(loaded(t, c.opts), c.step, Bytes(sealed(t, "float64", 1.0)))
			var lost *LostError
			if !errors.As(err, &lost) {
				t.Fatalf("got %v", err)
			}
			if lost.Cause != c.cause || lost.Outside() || !strings.Contains(err.Error(), c.says) || strings.Contains(err.Error(), "\n") {
				t.Errorf("cause %q, outside %v: %v (%s)", lost.Cause, lost.Outside(), err, lost.Stderr)
			}
		})
	}
}

func TestTimeLimit(t *testing.T) {
	w := loaded(t, Options{StepTime: 2 * time.Second})
	began := time.Now()
	_, _, err := call(w, "Spin", Bytes(sealed(t, "float64", 1.0)))
	var late *TimeLimitError
	if !errors.As(err, &late) || late.Limit != 2*time.Second || late.Flag != TimeFlag {
		t.Fatalf("got %v", err)
	}
	if took := time.Since(began); took > 20*time.Second {
		t.Errorf("it took %v to stop", took)
	}
	if !w.Spent() {
		t.Error("a worker that was stopped is not spent")
	}
}

func TestCheckingTooLarge(t *testing.T) {
	e := &LostError{Cause: OutOfMemory, task: askCheck, limits: Options{}.Checking()}
	if s := e.Error(); !strings.Contains(s, "512 MiB") || strings.Contains(s, MemoryFlag) {
		t.Error(s)
	}
	late := &TimeLimitError{Limit: time.Second}
	if s := late.Error(); strings.Contains(s, "raise") {
		t.Error(s)
	}
}

// TestKilledFromOutside holds that a worker somebody kills is worth a second
// try.
func TestKilledFromOutside(t *testing.T) {
	w := loaded(t, Options{})
	time.AfterFunc(300*time.Millisecond, func() { syscall.Kill(w.cmd.Process.Pid, syscall.SIGTERM) })
	_, _, err := call(w, "Spin", Bytes(sealed(t, "float64", 1.0)))
	var lost *LostError
	if !errors.As(err, &lost) || lost.Cause != Killed || !lost.Outside() {
		t.Errorf("got %v", err)
	}
}

func TestResultsTooLarge(t *testing.T) {
	if racing {
		t.Skip("a small limit of memory")
	}
	w := loaded(t, Options{Memory: 512 << 20})
	_, err := w.Call("Flood", []Arg{Bytes(sealed(t, "float64", 60e6))}, discard{})
	if err != nil {
		t.Errorf("120 MB: %v", err)
	}
	var failed *Failure
	_, err = w.Call("Repeat", []Arg{Bytes(sealed(t, "float64", 30.0))}, discard{})
	if !errors.As(err, &failed) || !strings.Contains(err.Error(), "the results take more than 128 MiB, a quarter of --step-memory and four times what the step was given; return less, or raise it") {
		t.Errorf("600 MB in a list of one text: %v", err)
	}
}

func TestConfinement(t *testing.T) {
	w := begin(t, Options{Require: os.Getenv("RIMLIGHT_REQUIRE") != "", Memory: 1 << 30}.For(1<<30))
	if got := w.options.results(); got != 1<<28+4<<30 {
		t.Errorf("results may have %d bytes", got)
	}
	if len(w.Confinement()) < 8 {
		t.Errorf("layers: %v", w.Confinement())
	}
	err := error(&UnconfinedError{[]confine.Layer{{Name: "Landlock", Detail: "the kernel has none"}, {Name: "seccomp", Detail: "nor this"}}})
	const want = "--require-confinement: steps cannot be confined by Landlock (the kernel has none), nor by seccomp (nor this); nothing was run"
	if err.Error() != want {
		t.Errorf("got %q, want %q", err, want)
	}
}

// TestCallOfTheDead holds that a question to a worker that has died already is
// answered by the reason of its death.
func TestCallOfTheDead(t *testing.T) {
	w := loaded(t, Options{})
	syscall.Kill(w.cmd.Process.Pid, syscall.SIGTERM)
	<-w.done
	_, _, err := call(w, "Double", Bytes(sealed(t, "float64", 1.0)))
	var lost *LostError
	if !errors.As(err, &lost) || lost.Cause != Killed {
		t.Errorf("got %v", err)
	}
}

// TestNothingLeftBehind holds that a worker's working directory is gone while
// it works, and that the worker is gone after Close.
func TestNothingLeftBehind(t *testing.T) {
	dir := t.TempDir()
	t.Setenv("TMPDIR", dir)
	w := begin(t, Options{})
	if left, _ := os.ReadDir(dir); len(left) != 0 {
		t.Errorf("left in the folder for temporary files: %v", left)
	}
	w.Close()
	if err := syscall.Kill(w.cmd.Process.Pid, 0); err == nil {
		t.Error("the process is still there")
	}
}

// TestLimitsComeFirst holds that a worker looks at nothing before it is
// confined, and is confined only once.
func TestLimitsComeFirst(t *testing.T) {
	var s server
	if _, err := s.serve(Message{Kind: askCheck, Head: []byte("not looked at")}); err == nil || !strings.Contains(err.Error(), "out of turn") {
		t.Errorf("a question before the limits: %v", err)
	}
	w := begin(t, Options{})
	if _, err := w.ask(askLimits, Options{}.For(0).limits(0), nil, nil); err == nil || !strings.Contains(err.Error(), "out of turn") {
		t.Errorf("limits for the second time: %v", err)
	}
}

func TestRead(t *testing.T) {
	path := filepath.Join(t.TempDir(), "text")
	if err := os.WriteFile(path, []byte("hello"), 0o600); err != nil {
		t.Fatal(err)
	}
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var got objects
	v, err := begin(t, Options{}.Reading(5), f).Read("text", nil, []string{"text"}, []int64{5}, &got)
	if err != nil {
		t.Fatal(err)
	}
	if want := sealed(t, "string", "hello"); len(got.list) != 1 || string(got.list[0]) != string(want) {
		t.Errorf("got %q, want %q", got.list, want)
	}
	if want := fmt.Sprintf("%x", sha256.Sum256([]byte("hello"))); len(v.SHA256) != 1 || v.SHA256[0] != want {
		t.Errorf("the file has the hash %v, want %s", v.SHA256, want)
	}
}

func TestOptions(t *testing.T) {
	var o Options
	if c := o.Checking(); c.Memory != checkMemory || c.StepTime != checkTime {
		t.Errorf("checking: %+v", c)
	}
	if r := o.Reading(0); r.Memory != readMemory || r.StepTime != readTime {
		t.Errorf("reading nothing: %+v", r)
	}
	if r := o.Reading(1 << 40); r.Memory < DefaultMemory || r.Memory > max(DefaultMemory, machineMemory()) || r.StepTime != DefaultStepTime {
		t.Errorf("reading a lot: %+v", r)
	}
	if f := o.For(0); f.Memory != DefaultMemory {
		t.Errorf("for no arguments: %+v", f)
	}
	if f, most := o.For(100<<20), machineMemory()/4*3; f.Memory != max(DefaultMemory, min(DefaultMemory+600<<20, most)) {
		t.Errorf("for 100 MiB of arguments: %+v", f)
	}
	if f := (Options{Memory: 1 << 30}).For(1 << 40); f.Memory != 1<<30 {
		t.Errorf("a limit that was set: %+v", f)
	}
	o = Options{StepTime: time.Second, Memory: confine.MinMemory}
	if c := o.Checking(); c.StepTime != o.StepTime || c.Memory != o.Memory {
		t.Errorf("strict limits were widened: %+v", c)
	}
}

func TestPlain(t *testing.T) {
	for _, c := range []struct {
		in   string
		max  int
		want string
	}{
		{"a\tb\nü", 100, "a\tb\nü"},
		{"\x1b]0;x\x07\u202e\x9b\xff", 100, "�]0;x���"},
		{strings.Repeat("x", 5000), 10, "xxxxxxxxxx … (4.9 KiB in all)"},
	} {
		if got := plain(c.in, c.max); got != c.want {
			t.Errorf("%q: got %q, want %q", c.in, got, c.want)
		}
	}
}

func TestEndsOfOutput(t *testing.T) {
	e := &ends{max: 4}
	for _, s := range []string{"ab", "cdef", "ghijklmn", "", "o"} {
		if n, err := e.Write([]byte(s)); n != len(s) || err != nil {
			t.Fatal(n, err)
		}
	}
	if got, want := e.String(), "abcdlmno"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

// resident is the memory, in KiB, that a process is resident with.
func resident(t testing.TB, pid int) (kib int) {
	b, err := os.ReadFile(fmt.Sprintf("/proc/%d/status", pid))
	if err != nil {
		t.Skip(err)
	}
	_, rest, _ := strings.Cut(string(b), "VmRSS:")
	fmt.Sscan(rest, &kib)
	return kib
}

// TestNoLeak holds that a worker does not grow over 10,000 calls.
func TestNoLeak(t *testing.T) {
	if testing.Short() {
		t.Skip("10,000 calls")
	}
	w := loaded(t, Options{})
	list := make([]float64, 1000)
	args := []Arg{Bytes(sealed(t, "[]float64", list))}
	call := func(n int) int {
		for range n {
			if _, err := w.Call("Sum", args, discard{}); err != nil {
				t.Fatal(err)
			}
		}
		return resident(t, w.cmd.Process.Pid)
	}
	first := call(2000)
	last := call(8000)
	t.Logf("resident after 2,000 calls %d KiB, after 10,000 calls %d KiB", first, last)
	if last > first+16<<10 {
		t.Errorf("the worker grew from %d to %d KiB in 8,000 calls", first, last)
	}
}

// BenchmarkStart is the time from nothing to a confined worker.
func BenchmarkStart(b *testing.B) {
	for b.Loop() {
		w, err := Start(context.Background(), Options{})
		if err != nil {
			b.Fatal(err)
		}
		w.Close()
	}
}

// BenchmarkStartAndLoad is the time to the first answer of a step.
func BenchmarkStartAndLoad(b *testing.B) {
	args := []Arg{Bytes(sealed(b, "float64", 1.0))}
	for b.Loop() {
		w, err := Start(context.Background(), Options{})
		if err != nil {
			b.Fatal(err)
		}
		if err := w.Load(code(ordinary)); err != nil {
			b.Fatal(err)
		}
		if _, err := w.Call("Double", args, discard{}); err != nil {
			b.Fatal(err)
		}
		w.Close()
	}
}

// BenchmarkCall is what a call costs besides the step itself.
func BenchmarkCall(b *testing.B) {
	w := loaded(b, Options{})
	args := []Arg{Bytes(sealed(b, "float64", 1.0))}
	for b.Loop() {
		if _, err := w.Call("Double", args, discard{}); err != nil {
			b.Fatal(err)
		}
	}
}
