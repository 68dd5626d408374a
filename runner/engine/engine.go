package engine

import (
	"cmp"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"sync"
	"time"

	"rimlight/runner/canon"
	"rimlight/runner/confine"
	"rimlight/runner/plan"
	"rimlight/runner/store"
	"rimlight/runner/worker"
	"rimlight/steps/lightcurve"
)

// An Engine carries out one plan against one store. Its exported fields are
// set before Run and not changed afterwards.
type Engine struct {
	Plan    *plan.Plan
	Store   *store.Store
	Library *plan.Library
	Build   plan.Build
	Code    worker.Code
	Jobs    int            // worker processes at a time, at least 1
	Host    string         // who computes, user@machine, for records
	Limits  worker.Options // what a step may use up

	// Confinement is what the worker that checked the recipe said about its own,
	// for records.
	Confinement confine.Report

	// Before gives the text of the key that a step had in the run before, ""
	// when there was none. The element is -1 for a plain step, the input's
	// name stands for a step's when an input is read.
	Before func(step string, element int) plan.KeyText

	// Again, when set, names the steps whose results are to be computed although
	// they are known, to see whether they come out the same.
	Again func(step string) bool

	// Elsewhere, when set, may take the work of steps.
	Elsewhere Elsewhere

	// NoGaps makes a fan-out fail when one of its elements does, instead of
	// leaving a gap in its results.
	NoGaps bool

	// Observe is told what happens, one event at a time.
	Observe func(Event)

	outcome *Outcome
	slots   chan struct{}
	turn    chan struct{} // taken by whoever handles mass data
	watch   sync.Mutex    // guards Observe
	heal    []sync.Mutex  // one per step: a step is healed by one caller at a time
	state   sync.RWMutex  // guards outcome.Steps, which mending may rewrite
	standby standby
	notes   []string
	differs []string

	// Of an engine that works for another one: whose values it cannot mend, and
	// which is told how each element ended.
	foreign bool
	ended   func(element int, err error)
}

// State says where results came from.
type State string

// States of inputs, steps and elements.
const (
	Computed   State = "computed"
	Reused     State = "reused"
	Failed     State = "failed"
	NotReached State = "not reached"
)

// An Outcome is what a run came to.
type Outcome struct {
	Inputs      []Input
	Steps       []Step
	Interrupted bool
	Differs     []string // steps that gave other results than the time before
	Notes       []string // what happened to the store: damage found and healed, results that came out differently
}

// A Computation is one thing that was looked up or computed: an input as read,
// a plain step, or an element of a fan-out.
type Computation struct {
	State   State
	Why     string // why it was computed
	Err     string // why it failed
	Log     string
	Text    plan.KeyText
	Seed    uint64 // wired in, 0 when none is
	Results []Value
	Took    time.Duration // of the computing, whenever that was
	When    time.Time
	Host    string
	cause   error // behind Err
}

// An Input is a raw input as used.
type Input struct {
	Computation
	Name  string
	Files []File
	done  chan struct{}
}

// A File is a raw file with its identity.
type File struct {
	Path   string
	Size   int64
	SHA256 string
}

// A Step is a step with its results; of a fan-out, the results are the
// collected ones, and Elements has the single computations. Elements that failed
// may have left gaps in the results of a step that did not; see [Step.Gaps].
type Step struct {
	Computation
	Name     string
	Elements []Computation
	done     chan struct{}
}

// An Event is a change that an observer may want to show.
type Event struct {
	Step   string // name of the step, or of the input
	Input  bool
	Absent bool  // an optional input that was not given
	State  State // of the step; empty while it runs
	Why    string
	Err    string
	Done   int // elements of a fan-out that are there
	Total  int // elements in all; 0 for a plain step
	Took   time.Duration
	Where  string // it is computed, when that is elsewhere
}

// Run carries out the plan. It returns when everything that could be reached
// is done, or soon after ctx ends. The error is only for what keeps a run from
// taking place at all; failures of steps are in the outcome.
func (e *Engine) Run(ctx context.Context) *Outcome {
	e.outcome = &Outcome{Inputs: make([]Input, len(e.Plan.Inputs)), Steps: make([]Step, len(e.Plan.Steps))}
	e.slots, e.turn = make(chan struct{}, max(1, e.Jobs)), make(chan struct{}, 1)
	e.heal = make([]sync.Mutex, len(e.Plan.Steps))
	e.standby.waiting.Store(int64(len(e.Plan.Steps)))
	var all sync.WaitGroup
	for i := range e.outcome.Inputs {
		in := &e.outcome.Inputs[i]
		in.Name, in.State, in.done = e.Plan.Inputs[i].Name, NotReached, make(chan struct{})
		all.Go(func() {
			defer close(in.done)
			e.input(ctx, i)
		})
	}
	for i := range e.outcome.Steps {
		s := &e.outcome.Steps[i]
		s.Name, s.State, s.done = e.Plan.Steps[i].Name, NotReached, make(chan struct{})
		all.Go(func() {
			defer close(s.done)
			if e.ready(ctx, i) {
				e.step(ctx, i)
			}
			if s.State == NotReached {
				e.observe(Event{Step: s.Name, State: NotReached})
			}
		})
	}
	all.Wait()
	e.standby.dismiss()
	e.outcome.Interrupted = ctx.Err() != nil
	e.outcome.Notes = e.Notes()
	e.outcome.Differs = e.differs
	// A copy, since results that are damaged when they are read for the report
	// are computed again.
	out := *e.outcome
	out.Inputs, out.Steps = slices.Clone(out.Inputs), slices.Clone(out.Steps)
	return &out
}

// ready waits for everything that step i needs and reports whether it is all
// there.
func (e *Engine) ready(ctx context.Context, i int) bool {
	ok := true
	for _, a := range e.Plan.Steps[i].Args {
		switch a.Source {
		case plan.FromInput:
			in := &e.outcome.Inputs[a.Input]
			<-in.done
			ok = ok && in.Finished()
		case plan.FromResult, plan.FromElement:
			s := &e.outcome.Steps[a.Step]
			<-s.done
			ok = ok && s.Finished()
		}
	}
	return ok && ctx.Err() == nil
}

// Finished reports whether there are results.
func (c *Computation) Finished() bool { return c.State == Computed || c.State == Reused }

func (c *Computation) fail(err error) { c.State, c.Err, c.cause = Failed, err.Error(), err }

func (e *Engine) observe(ev Event) {
	if e.Observe == nil {
		return
	}
	e.watch.Lock()
	defer e.watch.Unlock()
	e.Observe(ev)
}

func (e *Engine) note(format string, args ...any) {
	e.watch.Lock()
	defer e.watch.Unlock()
	e.notes = append(e.notes, fmt.Sprintf(format, args...))
}

// Notes tells what happened to the store: damage found and healed, and results
// that came out differently. Reading results after Run can add to it.
func (e *Engine) Notes() []string {
	e.watch.Lock()
	defer e.watch.Unlock()
	out := slices.Clone(e.notes)
	told := strings.Join(out, "\n")
	for _, d := range e.Store.Damage() {
		if !strings.Contains(told, d.Path) {
			out = append(out, d.Error())
		}
	}
	return out
}

// lookUp fills c from the store when the result of its key is known and whole.
// Otherwise it says why the result has to be computed.
func (e *Engine) lookUp(c *Computation, name string, element int) bool {
	if e.Again != nil && e.Again(name) {
		c.Why = "asked for again"
		return false
	}
	r, ok, err := e.Store.Record(c.Text.Key())
	if err != nil {
		e.note("%s: its record in the store is of no use (%v); it was computed again", name, err)
	}
	if !ok {
		before := plan.KeyText("")
		if e.Before != nil {
			before = e.Before(name, element)
		}
		c.Why = cmp.Or(c.Text.Why(before), "not in the store")
		return false
	}
	values := make([]Value, len(r.Results))
	for i, res := range r.Results {
		if values[i], err = known(e.Store, res); err != nil {
			e.note("%s: %v; it was computed again", name, err)
			c.Why = "its kept result was damaged or missing"
			return false
		}
	}
	c.State, c.Why, c.Results, c.Log, c.Took, c.When, c.Host = Reused, "", values, r.Log, r.Took, r.When, r.Host
	return true
}

// input identifies and reads a raw input.
func (e *Engine) input(ctx context.Context, i int) {
	in, spec := &e.outcome.Inputs[i], &e.Plan.Inputs[i]
	if err := e.readInput(ctx, in, spec); err != nil {
		if ctx.Err() != nil {
			return
		}
		in.fail(err)
	}
	e.observe(Event{Step: in.Name, Input: true, Absent: len(spec.Paths) == 0, State: in.State, Why: in.Why, Err: in.Err, Took: in.Took})
}

func (e *Engine) readInput(ctx context.Context, in *Input, spec *plan.Input) error {
	if len(spec.Paths) == 0 {
		b, err := zero(spec.Type)
		if err != nil {
			return err
		}
		v, err := putSealed(e.Store, b)
		if err != nil {
			return err
		}
		in.State, in.Results = Reused, []Value{v}
		return nil
	}
	files := make([]*os.File, len(spec.Paths))
	in.Files = make([]File, len(spec.Paths))
	sums, names, sizes := make([]string, len(files)), make([]string, len(files)), make([]int64, len(files))
	for i, p := range spec.Paths {
		f, err := os.Open(p)
		if err != nil {
			return err
		}
		defer f.Close()
		n, sum, err := digest(ctx, f)
		if err != nil {
			return fmt.Errorf("%s: %w", p, err)
		}
		files[i], names[i], sizes[i], sums[i] = f, filepath.Base(p), n, sum
		in.Files[i] = File{p, n, sums[i]}
	}
	in.Text = plan.ReadKey(spec, sums, e.Library, e.Build)
	if e.lookUp(&in.Computation, in.Name, -1) {
		return nil
	}
	total := int64(0)
	for _, n := range sizes {
		total += n
	}
	h := hold{e, total > massData}
	if !h.take(ctx) {
		return ctx.Err()
	}
	defer h.give()
	e.observe(Event{Step: in.Name, Input: true, Why: in.Why})
	e.prepareNext(ctx)
	w, err := worker.Start(ctx, e.Limits.Reading(total), files...)
	if err != nil {
		return err
	}
	defer w.Close()
	var columns lightcurve.Columns
	for _, c := range spec.Columns {
		columns = append(columns, lightcurve.Column{Role: c.Role, HDU: c.HDU, Name: c.Name, Unit: c.Unit, Offset: c.Offset})
	}
	t := &tray{store: e.Store}
	v, err := w.Read(spec.Layout, columns, names, sizes, t)
	if err != nil {
		t.clear()
		return fmt.Errorf("%s: %w", spec.Paths[0], err)
	}
	for i, s := range v.SHA256 {
		if s != sums[i] {
			t.clear()
			return fmt.Errorf("%s changed while it was being read: run again when it is complete", spec.Paths[i])
		}
	}
	for _, n := range v.Notes {
		v.Log += n + "\n"
	}
	return e.keepOne(keeping{c: &in.Computation, name: in.Name, results: []string{in.Name}, values: v, tray: t})
}

// digest gives the size of what r holds, and its SHA-256 in hex.
func digest(ctx context.Context, r io.Reader) (int64, string, error) {
	h := sha256.New()
	n, err := io.Copy(h, contextReader{ctx, r})
	return n, hex.EncodeToString(h.Sum(nil)), err
}

// zero is what fills the parameter of an optional input that is absent.
func zero(typ string) ([]byte, error) {
	t, ok := inputTypes[typ]
	if !ok {
		return nil, fmt.Errorf("an input of type %s can't be left out", typ)
	}
	layout, err := canon.Layout(t)
	if err != nil {
		return nil, err
	}
	b, err := canon.MarshalValue(reflect.Zero(t))
	if err != nil {
		return nil, err
	}
	return canon.Seal(typ, layout, b), nil
}

// acquire waits for a free worker slot; false when ctx ended first.
func (e *Engine) acquire(ctx context.Context) bool {
	select {
	case e.slots <- struct{}{}:
		return ctx.Err() == nil || func() bool { <-e.slots; return false }()
	case <-ctx.Done():
		return false
	}
}

func (e *Engine) release() { <-e.slots }

type contextReader struct {
	ctx context.Context
	r   io.Reader
}

func (c contextReader) Read(p []byte) (int, error) {
	if err := c.ctx.Err(); err != nil {
		return 0, err
	}
	return c.r.Read(p)
}

// damages is one error for what is wrong with several objects of a value. The
// store remembers each.
func damages(flaws []error) error {
	if len(flaws) == 1 {
		return flaws[0]
	}
	return fmt.Errorf("%d kept results are damaged or missing, the first: %w", len(flaws), flaws[0])
}

// damaged reports whether reading a kept result failed for reasons that
// computing it again will mend.
func damaged(err error) bool {
	var d *store.DamagedError
	var f *Fault
	return errors.As(err, &d) || errors.As(err, &f) && f.Unreadable || errors.Is(err, fs.ErrNotExist)
}
