package worker

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"strings"
	"sync"
	"syscall"
	"time"

	"rimlight/runner/diag"
	"rimlight/runner/program"
	"rimlight/steps/lightcurve"
)

// Name is what a worker is called in the list of processes, and how the
// program knows that it was started as one.
const Name = "rimlight-worker"

// A Worker is a running worker process. Its methods may not be called
// concurrently, but Close may be called at any time.
type Worker struct {
	cmd    *exec.Cmd
	in     io.WriteCloser
	out    io.Reader
	stderr *tail
	limit  int64
	done   chan struct{}
	close  sync.Once
	state  *os.ProcessState
}

// A Failure is why a step gave no results.
type Failure struct {
	Text  string   // what went wrong
	Pos   diag.Pos // where in the recipe, when known
	Panic bool     // the step did not return an error, it crashed
}

// Error gives the place, when known, and the text.
func (f *Failure) Error() string {
	if f.Pos.Line == 0 {
		return f.Text
	}
	return f.Pos.String() + ": " + f.Text
}

// Values is what a call or a read gave.
type Values struct {
	Sealed [][]byte // each result in its typed envelope
	Log    string   // what the step printed or the reader noted
	Took   time.Duration
	SHA256 []string // of the files that were read, hex
	Notes  []string // what a reader had to say about its files
}

// A LostError says that the worker ended without answering.
type LostError struct {
	How    string // how the process ended
	Stderr string // the last that it wrote
}

// Error says how the process ended.
func (e *LostError) Error() string {
	s := "the worker process ended without an answer: " + e.How
	if e.Stderr != "" {
		s += "; its last words: " + e.Stderr
	}
	return s
}

// DefaultLimit is how many bytes of results one answer may hold.
const DefaultLimit = 8 << 30

// Start starts a worker. The files, which may be none, are handed over open;
// the caller still has to close its own descriptors. The worker is killed when
// ctx ends.
func Start(ctx context.Context, files ...*os.File) (*Worker, error) {
	exe, err := executable()
	if err != nil {
		return nil, err
	}
	dir, err := os.MkdirTemp("", "rimlight-worker-")
	if err != nil {
		return nil, fmt.Errorf("no working directory for a worker: %w", err)
	}
	w := &Worker{stderr: &tail{max: 4096}, limit: DefaultLimit, done: make(chan struct{})}
	w.cmd = exec.CommandContext(ctx, exe)
	w.cmd.Args = []string{Name}
	w.cmd.Env = []string{}
	w.cmd.Dir = dir
	w.cmd.Stderr = w.stderr
	w.cmd.ExtraFiles = files
	w.cmd.WaitDelay = time.Second
	w.cmd.SysProcAttr = attributes()
	w.cmd.Cancel = func() error { return killGroup(w.cmd.Process) }
	if w.in, err = w.cmd.StdinPipe(); err != nil {
		return nil, err
	}
	// An own pipe: exec's StdoutPipe is closed by Wait, which runs here while
	// answers may still be read.
	r, pw, err := os.Pipe()
	if err != nil {
		return nil, err
	}
	w.cmd.Stdout = pw
	w.out = r
	err = w.cmd.Start()
	pw.Close()
	if err != nil {
		r.Close()
		os.Remove(dir)
		return nil, fmt.Errorf("cannot start a worker process: %w", err)
	}
	go func() {
		w.cmd.Wait()
		w.state = w.cmd.ProcessState
		os.Remove(dir)
		close(w.done)
	}()
	return w, nil
}

// Close ends the worker and waits until it is gone.
func (w *Worker) Close() {
	w.close.Do(func() {
		w.in.Close()
		killGroup(w.cmd.Process)
		<-w.done
		if c, ok := w.out.(io.Closer); ok {
			c.Close()
		}
	})
}

// Check asks for a look at the Go code of a recipe.
func (w *Worker) Check(code Code) ([]program.Step, diag.List, error) {
	m, err := w.ask(askCheck, code)
	if err != nil {
		return nil, nil, err
	}
	var a struct {
		Steps []program.Step
		Diags diag.List
	}
	if err := json.Unmarshal(m.Head, &a); err != nil {
		return nil, nil, fmt.Errorf("the worker's answer is malformed: %w", err)
	}
	return a.Steps, a.Diags, nil
}

// Load makes the worker ready for calls of a recipe's steps.
func (w *Worker) Load(code Code) error {
	_, err := w.ask(askLoad, code)
	return err
}

// Call runs a step of the loaded recipe on arguments in their envelopes. A
// failure of the step itself comes back as a *[Failure], a worker that died as
// a *[LostError].
func (w *Worker) Call(step string, args [][]byte) (Values, error) {
	return w.values(w.ask(askCall, callHead{step}, args...))
}

// Read reads the files that the worker was started with, in the given layout.
// The names are for messages only.
func (w *Worker) Read(layout string, columns lightcurve.Columns, names []string, sizes []int64) (Values, error) {
	h := readHead{Layout: layout, Names: names, Sizes: sizes}
	for _, c := range columns {
		h.Columns = append(h.Columns, columnHead(c))
	}
	return w.values(w.ask(askRead, h))
}

func (w *Worker) values(m Message, err error) (Values, error) {
	if err != nil {
		return Values{}, err
	}
	var h valuesHead
	if err := json.Unmarshal(m.Head, &h); err != nil {
		return Values{}, fmt.Errorf("the worker's answer is malformed: %w", err)
	}
	v := Values{m.Blobs, h.Log, time.Duration(h.Nanos), h.SHA256, h.Notes}
	if h.Failure != nil {
		return v, h.Failure
	}
	return v, nil
}

func (w *Worker) ask(kind string, head any, blobs ...[]byte) (Message, error) {
	q, err := message(kind, head, blobs...)
	if err != nil {
		return Message{}, err
	}
	if err := q.Write(w.in); err != nil {
		return Message{}, w.lost(err)
	}
	a, err := ReadMessage(w.out, w.limit)
	if err != nil {
		return Message{}, w.lost(err)
	}
	switch a.Kind {
	case answer:
		return a, nil
	case refusal:
		var text string
		json.Unmarshal(a.Head, &text)
		return Message{}, errors.New(text)
	}
	return Message{}, fmt.Errorf("the worker gave an answer of unknown kind %q", a.Kind)
}

// lost waits for the process to end and says how it did.
func (w *Worker) lost(cause error) error {
	select {
	case <-w.done:
	case <-time.After(2 * time.Second):
		killGroup(w.cmd.Process)
		<-w.done
	}
	how := cause.Error()
	if w.state != nil {
		how = w.state.String()
		if ws, ok := w.state.Sys().(syscall.WaitStatus); ok && ws.Signaled() {
			how = "signal " + ws.Signal().String()
		}
	}
	return &LostError{how, w.stderr.String()}
}

// tail keeps the end of what is written to it.
type tail struct {
	mu  sync.Mutex
	buf bytes.Buffer
	max int
}

func (t *tail) Write(p []byte) (int, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.buf.Write(p)
	if over := t.buf.Len() - t.max; over > 0 {
		t.buf.Next(over)
	}
	return len(p), nil
}

func (t *tail) String() string {
	t.mu.Lock()
	defer t.mu.Unlock()
	return strings.Join(strings.Fields(t.buf.String()), " ")
}
