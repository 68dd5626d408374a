package surface

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"reflect"
	"runtime/debug"
	"runtime/metrics"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"
	"unicode/utf8"

	"rimlight/runner/canon"
)

const (
	timeLimit   = 2 * time.Second // of processor time, for one call
	memoryLimit = 256 << 20       // allocated in all, by one call
	workerLimit = 1 << 30         // data of the worker process
	errorLimit  = 4 << 10         // length of an error's text
)

// A finding is a call that failed.
type finding struct {
	Job  job
	Kind string // "panic", "time", "memory", "result", "error", "argument", "again", "died"
	Text string
}

// A message goes from the worker to the test: the number of the job that is
// about to begin, or that all are done; whether the one before returned without
// an error; a finding.
type message struct {
	Begin   int      `json:",omitempty"` // from 1
	Good    bool     `json:",omitempty"`
	Done    bool     `json:",omitempty"`
	Finding *finding `json:",omitempty"`
}

// workerMark in the environment makes this binary a worker.
const workerMark = "RIMLIGHT_SURFACE_WORKER"

func TestMain(m *testing.M) {
	if os.Getenv(workerMark) != "" {
		work(os.Stdin, os.Stdout)
		return
	}
	os.Exit(m.Run())
}

// work reads jobs, makes the calls and writes messages, all as lines of JSON.
func work(in io.Reader, out io.Writer) {
	debug.SetMaxStack(64 << 20)
	debug.SetMemoryLimit(workerLimit / 2)
	limitData(workerLimit)

	var jobs []job
	must(json.NewDecoder(in).Decode(&jobs))
	w := newWorker(out)
	go w.watch()
	good := false
	for i, j := range jobs {
		w.say(message{Begin: i + 1, Good: good})
		good = w.run(j)
	}
	w.say(message{Done: true, Good: good})
}

type worker struct {
	targets map[string]target
	makers  map[reflect.Type][]target
	samples *samples

	lock    sync.Mutex // guards out and current
	out     *json.Encoder
	flush   *bufio.Writer
	current job

	started atomic.Int64 // processor time at the start of the call; 0 between calls
	calls   atomic.Int64
}

func newWorker(out io.Writer) *worker {
	buffered := bufio.NewWriter(out)
	w := &worker{
		targets: map[string]target{}, makers: map[reflect.Type][]target{}, samples: newSamples(),
		out: json.NewEncoder(buffered), flush: buffered,
	}
	for _, t := range append(targets(), faults...) {
		w.targets[t.Name] = t
		for _, out := range t.Out {
			if out.Kind() == reflect.Pointer || out.Kind() == reflect.Struct && hidden(out) {
				w.makers[out] = append(w.makers[out], t)
			}
		}
	}
	return w
}

func (w *worker) say(m message) {
	w.lock.Lock()
	defer w.lock.Unlock()
	must(w.out.Encode(m))
	must(w.flush.Flush())
}

// watch ends the process when a call takes too long: nothing else stops it.
func (w *worker) watch() {
	for range time.Tick(100 * time.Millisecond) {
		started, calls := w.started.Load(), w.calls.Load()
		if started == 0 || processorTime()-time.Duration(started) < timeLimit || calls != w.calls.Load() {
			continue
		}
		stacks := make([]byte, 1<<16)
		stacks = stacks[:stackOfAll(stacks)]
		w.lock.Lock()
		j := w.current
		w.lock.Unlock()
		w.say(message{Finding: &finding{j, "time", "no end after 2 s\n" + inLibrary(stacks)}})
		os.Exit(1)
	}
}

// run makes one call and reports what is wrong with it. good says that it
// returned without an error.
func (w *worker) run(j job) (good bool) {
	t, ok := w.targets[j.Target]
	if !ok {
		w.say(message{Finding: &finding{j, "target", "there is no such function"}})
		return false
	}
	w.lock.Lock()
	w.current = j
	w.lock.Unlock()
	fail := func(kind, text string) { w.say(message{Finding: &finding{j, kind, text}}) }

	g := newGenerator(j, w.samples, w.makers)
	args, problem := guard(func() []reflect.Value { return g.arguments(t, 0) })
	if problem != "" {
		fail("panic", "making the arguments: "+problem)
		return false
	}
	if len(args) < len(t.In) || asksForMuch(args) {
		return false
	}
	before, keepable := encode(args)
	allocated := allocatedBytes()
	w.calls.Add(1)
	w.started.Store(int64(processorTime()))
	results, problem := guard(func() []reflect.Value { return t.call(args) })
	w.started.Store(0)
	allocated = allocatedBytes() - allocated

	if problem != "" {
		fail("panic", problem)
		return false
	}
	if allocated > memoryLimit {
		fail("memory", fmt.Sprintf("%d MiB allocated", allocated>>20))
	}
	after, _ := encode(args)
	if !bytes.Equal(before, after) {
		fail("argument", "the call wrote to its arguments")
	}
	if len(results) < len(t.Out) {
		return false // ended by a generated function
	}
	if n := len(results); n > 0 {
		if err, _ := results[n-1].Interface().(error); err != nil {
			if problem := unreadable(err, keepable); problem != "" {
				fail("error", problem)
			}
			return false
		}
		if t.Out[n-1] == errorType {
			results = results[:n-1]
		}
	}
	if !keepable {
		return true
	}
	if problem := unkeepable(results); problem != "" {
		fail("result", problem)
		return false
	}
	if j.Seed%16 == 0 {
		w.again(j, t, results)
	}
	return true
}

// again makes a call for the second time and compares the results.
func (w *worker) again(j job, t target, first []reflect.Value) {
	args := newGenerator(j, w.samples, w.makers).arguments(t, 0)
	second, problem := guard(func() []reflect.Value { return t.call(args) })
	if len(second) < len(t.Out) {
		if problem != "" {
			w.say(message{Finding: &finding{j, "again", problem}})
		}
		return
	}
	a, _ := encode(first)
	b, _ := encode(second[:len(first)])
	if !bytes.Equal(a, b) {
		w.say(message{Finding: &finding{j, "again", "the same arguments gave other results"}})
	}
}

var errorType = reflect.TypeFor[error]()

// guard calls f and describes its panic. When that came out of a generated
// function, both results are empty, whatever f would have returned.
func guard(f func() []reflect.Value) (results []reflect.Value, problem string) {
	defer func() {
		if r := recover(); r != nil {
			results = nil
			if _, ours := r.(bomb); !ours {
				problem = fmt.Sprintf("%v\n%s", r, inLibrary(debug.Stack()))
			}
		}
	}()
	return f(), ""
}

// inLibrary gives the lines of a stack that lie in the step library.
func inLibrary(stack []byte) string {
	var lines []string
	for line := range strings.Lines(string(stack)) {
		if _, place, ok := strings.Cut(line, "/steps/"); ok && strings.Contains(line, ".go:") {
			place, _, _ = strings.Cut(strings.TrimSpace(place), " +")
			lines = append(lines, "steps/"+place)
		}
	}
	return strings.Join(lines[:min(len(lines), 6)], "\n")
}

// encode gives the canonical bytes of values one after another, and whether all
// have some.
func encode(values []reflect.Value) (data []byte, all bool) {
	all = true
	for _, v := range values {
		b, err := canon.MarshalValue(v)
		all = all && err == nil
		data = append(data, b...)
	}
	return data, all
}

// unkeepable says what keeps a result from being stored. Values whose type has
// no encoding at all, such as an orbit's path, are for use within a step.
func unkeepable(results []reflect.Value) string {
	for _, r := range results {
		if _, err := canon.Layout(r.Type()); err != nil {
			continue
		}
		if _, err := canon.MarshalValue(r); err != nil {
			return fmt.Sprintf("a result of type %s: %v", r.Type(), err)
		}
	}
	return ""
}

// unreadable says what is wrong with the text of an error.
func unreadable(err error, validText bool) string {
	text := err.Error()
	switch {
	case text == "":
		return "an error without text"
	case len(text) > errorLimit:
		return fmt.Sprintf("an error of %d bytes: %s...", len(text), text[:100])
	case validText && !utf8.ValidString(text):
		return fmt.Sprintf("an error that is not text: %q", text)
	case strings.Contains(text, "%!"):
		return "an error with a formatting mistake: " + text
	}
	return ""
}

// allocatedBytes counts what was allocated since the process began.
func allocatedBytes() uint64 {
	sample := []metrics.Sample{{Name: "/gc/heap/allocs:bytes"}}
	metrics.Read(sample)
	return sample[0].Value.Uint64()
}
