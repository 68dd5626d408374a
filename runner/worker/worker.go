package worker

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"os/exec"
	"sync"
	"sync/atomic"
	"syscall"
	"time"

	"rimlight/runner/confine"
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
	cmd       *exec.Cmd
	options   Options
	layers    confine.Report
	spent     time.Duration
	in        io.WriteCloser
	questions *bufio.Writer // on in
	answers   *bufio.Reader // on out
	kept      map[int]bool  // common arguments that the worker has, by their number
	out       *os.File
	stderr    *ends
	done      chan struct{}
	close     sync.Once
	state     *os.ProcessState
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

// Values is what a call or a read gave, besides the objects that a [Receiver]
// got.
type Values struct {
	Results []Result
	Log     string // what the step printed or the reader noted
	Took    time.Duration
	SHA256  []string // of the files that were read, hex
	Notes   []string // what a reader had to say about its files
}

// maxText is how many bytes of a message from a worker are kept.
const maxText = 4096

// Start starts a worker and has it confine itself. The files, which may be
// none, are handed over open; the caller still has to close its own
// descriptors. The worker is killed when ctx ends. Where a layer of confinement
// is missing that the options require, the error is an *[UnconfinedError].
func Start(ctx context.Context, o Options, files ...*os.File) (*Worker, error) {
	o = o.For(o.given)
	w, err := start(ctx, o, files)
	if err != nil {
		return nil, err
	}
	m, err := w.ask(askLimits, o.limits(len(files)), nil, nil)
	if err == nil {
		err = json.Unmarshal(m.Head, &w.layers)
	}
	if err != nil {
		w.Close()
		return nil, fmt.Errorf("a worker process could not be confined: %w", err)
	}
	if missing := w.layers.Missing(); o.Require && len(missing) > 0 {
		w.Close()
		return nil, &UnconfinedError{missing}
	}
	return w, nil
}

func start(ctx context.Context, o Options, files []*os.File) (*Worker, error) {
	exe, err := executable()
	if err != nil {
		return nil, err
	}
	dir, err := os.MkdirTemp("", "rimlight-worker-")
	if err != nil {
		return nil, fmt.Errorf("no working directory for a worker: %w", err)
	}
	w := &Worker{options: o, stderr: &ends{max: maxText / 2}, done: make(chan struct{})}
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
	w.questions, w.answers, w.kept = bufio.NewWriterSize(w.in, 64<<10), bufio.NewReaderSize(r, 64<<10), map[int]bool{}
	err = w.cmd.Start()
	pw.Close()
	if err != nil {
		r.Close()
		os.Remove(dir)
		return nil, fmt.Errorf("cannot start a worker process: %w", err)
	}
	widen(w.in)
	widen(r)
	// The worker is in it; where that does not keep it in the file system, it
	// goes now, and is not left behind when this process is killed.
	os.Remove(dir)
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
		w.kill()
		<-w.done
		w.out.Close()
	})
}

// Confinement lists the layers that the worker is confined by, and those that
// could not be had.
func (w *Worker) Confinement() confine.Report { return w.layers }

// Spent reports whether the worker has worked for so long that it should be
// replaced before it is asked again.
func (w *Worker) Spent() bool { return w.spent > w.options.StepTime }

// Check asks for a look at the Go code of a recipe.
func (w *Worker) Check(code Code) ([]program.Step, diag.List, error) {
	m, err := w.ask(askCheck, code, nil, nil)
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
	_, err := w.ask(askLoad, code, nil, nil)
	return err
}

// Call runs a step of the loaded recipe. A failure of the step itself comes
// back as a *[Failure], a worker that took too long and was stopped as a
// *[TimeLimitError], one that died as a *[LostError], and an argument that could
// not be had as an *[ArgError]. After an error, what the receiver got is of no
// use.
func (w *Worker) Call(step string, args []Arg, to Receiver) (Values, error) {
	h := callHead{step, make([]argHead, len(args))}
	room := int64(maxKept)
	var send []numbered
	for i, a := range args {
		h.Args[i] = argHead{Limit: a.Size, Kept: w.kept[i], Keep: a.Common && a.Size <= room && !w.kept[i]}
		if h.Args[i].Kept || h.Args[i].Keep {
			room -= a.Size
		}
		if !h.Args[i].Kept {
			send = append(send, numbered{a, i})
		}
	}
	m, err := w.ask(askCall, h, send, to)
	if err == nil {
		for i, a := range h.Args {
			if a.Keep {
				w.kept[i] = true
			}
		}
	}
	return w.values(m, err)
}

// A numbered argument knows its place among the others.
type numbered struct {
	Arg
	number int
}

// maxKept is how many bytes of common arguments a worker holds on to. Larger
// ones are sent at each call.
const maxKept = 16 << 20

// Read reads the files that the worker was started with, in the given layout.
// The names are for messages only.
func (w *Worker) Read(layout string, columns lightcurve.Columns, names []string, sizes []int64, to Receiver) (Values, error) {
	h := readHead{Layout: layout, Names: names, Sizes: sizes}
	for _, c := range columns {
		h.Columns = append(h.Columns, columnHead(c))
	}
	m, err := w.ask(askRead, h, nil, to)
	return w.values(m, err)
}

func (w *Worker) values(m Message, err error) (Values, error) {
	if err != nil {
		return Values{}, err
	}
	var h valuesHead
	if err := json.Unmarshal(m.Head, &h); err != nil {
		return Values{}, fmt.Errorf("the worker's answer is malformed: %w", err)
	}
	v := Values{h.Results, plain(h.Log, 1<<20), time.Duration(h.Nanos), h.SHA256, h.Notes}
	for i, n := range v.Notes {
		v.Notes[i] = plain(n, maxText)
	}
	if h.Failure != nil {
		h.Failure.Text = plain(h.Failure.Text, 2*maxText)
		return v, h.Failure
	}
	return v, nil
}

// ask puts a question, with arguments, and gives the answer. Objects that come
// before it go to the receiver.
func (w *Worker) ask(kind string, head any, args []numbered, to Receiver) (Message, error) {
	q, err := message(kind, head)
	if err != nil {
		return Message{}, err
	}
	began := time.Now()
	var expired atomic.Bool
	limit := w.limit(kind)
	timer := time.AfterFunc(limit, func() {
		expired.Store(true)
		w.kill()
		w.out.SetReadDeadline(time.Now().Add(time.Second)) // should anything else hold the pipe open
	})
	a, err := w.exchange(q, args, to)
	timer.Stop()
	if limit == w.options.StepTime {
		w.spent += time.Since(began)
	}
	switch {
	case err != nil && expired.Load():
		flag := TimeFlag
		if kind == askCheck {
			flag = ""
		}
		return Message{}, &TimeLimitError{limit, flag}
	case err != nil:
		var arg *ArgError
		var receiver *receiverError
		switch {
		case errors.As(err, &arg):
			w.end()
			return Message{}, arg
		case errors.As(err, &receiver):
			w.end()
			return Message{}, receiver.error
		}
		return Message{}, w.lost(kind, err)
	}
	switch a.Kind {
	case answer:
		return a, nil
	case refusal:
		var text string
		json.Unmarshal(a.Head, &text)
		return Message{}, errors.New(plain(text, 2*maxText))
	}
	return Message{}, fmt.Errorf("the worker gave an answer of unknown kind %q", a.Kind)
}

// limit is how long the answer to a question may take. Getting ready is no work
// of a step's, and takes long on a busy machine only.
func (w *Worker) limit(kind string) time.Duration {
	switch kind {
	case askLimits, askCheck, askLoad:
		return max(w.options.StepTime, checkTime)
	}
	return w.options.StepTime
}

func (w *Worker) exchange(q Message, args []numbered, to Receiver) (Message, error) {
	if err := w.put(q, args); err != nil {
		return Message{}, err
	}
	var body []byte
	left, objects := w.options.results(), 0
	for {
		m, err := readMessage(w.answers, body)
		if err != nil {
			return Message{}, err
		}
		if m.Kind != more && m.Kind != last {
			return m, nil
		}
		body = m.Body
		if left -= int64(len(body)); left < 0 || to == nil {
			return Message{}, fmt.Errorf("its results take more than %s", Size(w.options.results()))
		}
		if err := to.Part(body); err != nil {
			return Message{}, &receiverError{err}
		}
		if m.Kind == more {
			continue
		}
		if objects++; objects > maxObjects {
			return Message{}, fmt.Errorf("more than %d parts of results", maxObjects)
		}
		if err := to.End(); err != nil {
			return Message{}, &receiverError{err}
		}
	}
}

// maxObjects is how many objects the results of one call may consist of.
const maxObjects = 1 << 20

// put sends a question with its arguments.
func (w *Worker) put(q Message, args []numbered) error {
	if err := q.Write(w.questions); err != nil {
		return err
	}
	for _, a := range args {
		p := partWriter{w: w.questions, left: math.MaxInt64} // whether it is as long as it should be, the source knows
		err := a.Write(&p)
		if err == nil {
			err = p.end()
		}
		if p.err != nil {
			return p.err
		}
		if err != nil {
			return &ArgError{a.number, err}
		}
	}
	return w.questions.Flush()
}

// A receiverError is why a receiver took no more.
type receiverError struct{ error }

// lost says how a worker ended that gave no answer. One that goes on after a
// malformed answer is ended.
func (w *Worker) lost(task string, err error) error {
	e := &LostError{task: task, limits: w.options}
	ended := errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, syscall.EPIPE) || errors.Is(err, os.ErrClosed)
	if ended {
		select {
		case <-w.done:
		case <-time.After(2 * time.Second): // it closed the pipe and goes on
			ended = false
		}
	}
	if ended {
		e.Cause, e.How = causeOf(w.state, w.stderr.String(), w.options)
	} else {
		w.end()
		e.Cause, e.How = Malformed, err.Error()
	}
	e.Stderr = w.stderr.String()
	return e
}

// end kills the process and waits until it is gone.
func (w *Worker) end() {
	w.kill()
	<-w.done
}

// kill ends the process, unless it has ended.
func (w *Worker) kill() {
	select {
	case <-w.done:
	default:
		killGroup(w.cmd.Process)
	}
}
