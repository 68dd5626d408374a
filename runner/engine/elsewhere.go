package engine

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"time"

	"rimlight/runner/plan"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// Elsewhere is a place other than this machine where the work of a step can be
// done, such as a cluster that shares the folder of the store. What is computed
// there is put into the store there; here, it is taken up from the store.
type Elsewhere interface {
	// Takes reports whether a number of computations of a step, which take so
	// long each, are to be done there; 0 when no one knows how long they take.
	Takes(units int, each time.Duration) bool

	// Do does the work and tells of each unit, by its index, how it ended: with a
	// record in the store, or with an error, which may be a [*Fault] or
	// [ErrUntried]. It tells when Where has something else to say. Both are told
	// from one goroutine. The error is why the work as a whole could not be done.
	// When ctx ends, what was finished is told of before Do returns.
	Do(ctx context.Context, w Work, ended func(unit int, err error), moved func()) error

	// Where says in a few words where the work of a step is done, for people.
	Where(step string) string
}

// Work is what is to be done elsewhere of one step. It names all values by the
// objects in the store that hold them.
type Work struct {
	Step    string
	Results []string // their names
	Args    []Argument
	Code    worker.Code
	Limits  worker.Options
	Each    time.Duration `json:"-"` // how long one unit takes, 0 if nobody knows
	Units   []Unit        `json:"-"`
}

// An Argument is what a parameter is filled with.
type Argument struct {
	Name   string
	Type   string
	Source plan.Source
	Value  *store.Result `json:",omitempty"` // an input, or a result of an earlier step
	Sealed ready         `json:",omitempty"` // a setting or priors, in their envelope
}

// A ready value is in its envelope already.
type ready []byte

// A Unit is one computation of a step: the step, or one element of a fan-out.
type Unit struct {
	Text    plan.KeyText
	Element *store.Result `json:",omitempty"`
}

// A Fault is an error as it travels from one machine to another. Its text is
// that of the error.
type Fault struct {
	Text       string
	Failure    *worker.Failure `json:",omitempty"` // the step returned an error or panicked
	Fatal      bool            `json:",omitempty"` // it cost the process that computed it its life
	Unreadable bool            `json:",omitempty"` // what was to be computed with is damaged or missing
	Log        string          `json:",omitempty"` // what the step had said
}

// Error gives the text.
func (f *Fault) Error() string { return f.Text }

// Unwrap gives the failure of the step itself, if it is one.
func (f *Fault) Unwrap() error {
	if f.Failure == nil {
		return nil
	}
	return f.Failure
}

// ErrUntried is the error of a unit that was left alone because of others.
var ErrUntried = errors.New("not tried")

// faultOf makes an error fit to travel.
func faultOf(err error, log string) *Fault {
	f := &Fault{Text: err.Error(), Fatal: fatal(err), Unreadable: damaged(err), Log: log}
	errors.As(err, &f.Failure)
	return f
}

// firstWave is how many elements of a fan-out are computed to see how long they
// take, when no one knows.
const firstWave = 4

// assumed is how long a computation is taken to last when not even trying told.
const assumed = time.Minute

// mayLeave reports whether work of a step may be done elsewhere. What is asked
// for again is computed here, as there is a record of it already.
func (e *Engine) mayLeave(spec *plan.Step) bool {
	return e.Elsewhere != nil && (e.Again == nil || !e.Again(spec.Name))
}

// computeAway has a plain step computed elsewhere.
func (e *Engine) computeAway(ctx context.Context, spec *plan.Step, c *Computation, took time.Duration) error {
	one := []Computation{*c}
	err := e.away(ctx, spec, nil, one, []int{0}, took)
	*c = one[0]
	switch {
	case err != nil:
		return err
	case c.State == Failed:
		return c.cause
	}
	return ctx.Err()
}

// missing computes the elements listed in todo, here or elsewhere.
func (e *Engine) missing(ctx context.Context, spec *plan.Step, items []Value, comps []Computation, todo []int) error {
	if !e.mayLeave(spec) {
		return e.missingHere(ctx, spec, items, comps, todo)
	}
	each := e.measured(spec.Name, comps, todo)
	if each == 0 {
		wave := todo[:min(firstWave, len(todo))]
		todo = todo[len(wave):]
		if err := e.dispatch(ctx, spec, items, comps, wave, 0); err != nil || ctx.Err() != nil {
			return err
		}
		if each = mean(comps, wave); each == 0 {
			each = assumed
		}
	}
	if len(todo) == 0 {
		return nil
	}
	return e.dispatch(ctx, spec, items, comps, todo, each)
}

func (e *Engine) dispatch(ctx context.Context, spec *plan.Step, items []Value, comps []Computation, todo []int, each time.Duration) error {
	if e.Elsewhere.Takes(len(todo), each) {
		return e.away(ctx, spec, items, comps, todo, each)
	}
	return e.missingHere(ctx, spec, items, comps, todo)
}

// measured is how long an element takes, as far as is known: from the elements
// that are in the store, or else from the run before; 0 when nothing is known.
func (e *Engine) measured(step string, comps []Computation, todo []int) time.Duration {
	if d := mean(comps, nil); d > 0 || e.Before == nil {
		return d
	}
	var sum time.Duration
	known := 0
	for _, n := range todo {
		if d := e.tookBefore(step, n); d > 0 {
			sum, known = sum+d, known+1
		}
	}
	return sum / time.Duration(max(1, known))
}

// tookBefore is how long a computation took in the run before, 0 when that is
// not known.
func (e *Engine) tookBefore(step string, element int) time.Duration {
	if e.Before == nil {
		return 0
	}
	text := e.Before(step, element)
	if text == "" {
		return 0
	}
	r, ok, err := e.Store.Record(text.Key())
	if !ok || err != nil {
		return 0
	}
	return r.Took
}

// mean is how long those computations took that are finished, of those listed,
// or of all without a list.
func mean(comps []Computation, list []int) time.Duration {
	var sum time.Duration
	known := 0
	add := func(c *Computation) {
		if c.Finished() {
			sum, known = sum+c.Took, known+1
		}
	}
	if list == nil {
		for n := range comps {
			add(&comps[n])
		}
	}
	for _, n := range list {
		add(&comps[n])
	}
	return sum / time.Duration(max(1, known))
}

// away has the elements listed in todo computed elsewhere. A plain step has one
// computation and no items.
func (e *Engine) away(ctx context.Context, spec *plan.Step, items []Value, comps []Computation, todo []int, each time.Duration) error {
	w, err := e.work(spec, items, each)
	if err != nil {
		return err
	}
	total := len(comps)
	if items == nil {
		total = 0
	}
	done := 0
	patient := patience{total: len(comps)}
	for n := range comps {
		if comps[n].State != NotReached {
			done++
		}
		if comps[n].Finished() {
			patient.good++
		}
	}
	enough, stop := context.WithCancel(ctx)
	defer stop()
	show := func() {
		e.observe(Event{Step: spec.Name, Why: comps[todo[0]].Why, Done: done, Total: total, Where: e.Elsewhere.Where(spec.Name)})
	}
	show()
	// Twice, because what a result is computed with may turn out to be damaged.
	for attempt := 0; ; attempt++ {
		w.Units = nil
		for _, n := range todo {
			u := Unit{Text: comps[n].Text}
			if items != nil {
				u.Element = items[n].named("")
			}
			w.Units = append(w.Units, u)
		}
		var again, untried []int
		err := e.Elsewhere.Do(enough, w, func(unit int, err error) {
			n := todo[unit]
			c := &comps[n]
			if err == nil {
				err = e.arrived(c)
			}
			if damaged(err) && attempt == 0 {
				again = append(again, n)
				return
			}
			var f *Fault
			switch {
			case errors.Is(err, ErrUntried):
				untried = append(untried, n)
				return
			case errors.As(err, &f):
				c.Log = f.Log
			}
			if err != nil {
				c.fail(err)
			}
			switch {
			case err == nil:
				patient.good++
			case fatal(err):
				patient.deaths++
			}
			if err != nil && !own(err) || patient.out() {
				stop()
			}
			done++
			show()
		}, show)
		if err != nil || len(again) == 0 || enough.Err() != nil {
			return err
		}
		if err := e.mendFor(ctx, spec, items, again); err != nil {
			return err
		}
		todo = append(again, untried...) // which were left alone because of those
	}
}

// work describes what a step computes with, for elsewhere.
func (e *Engine) work(spec *plan.Step, items []Value, each time.Duration) (Work, error) {
	w := Work{Step: spec.Name, Code: e.Code, Limits: e.Limits, Each: each}
	for _, r := range spec.Results {
		w.Results = append(w.Results, r.Name)
	}
	for _, a := range spec.Args {
		arg := Argument{Name: a.Name, Type: a.Type, Source: a.Source}
		switch a.Source {
		case plan.FromInput:
			arg.Value = e.outcome.Inputs[a.Input].Results[0].named(a.Name)
		case plan.FromResult:
			arg.Value = e.result(a.Step, a.Result).named(a.Name)
		case plan.FromSetting, plan.FromPriors:
			var err error
			if arg.Sealed, err = sealGo(a.Type, a.Value); err != nil {
				return w, fmt.Errorf("argument %s: %w", a.Name, err)
			}
		}
		w.Args = append(w.Args, arg)
	}
	// What workers there may use follows what they are given, as it does here, and
	// is settled here, because room for it has to be asked for.
	given, largest := int64(0), int64(0)
	for _, a := range w.Args {
		if a.Value != nil {
			given += a.Value.Size
		}
	}
	for _, v := range items {
		largest = max(largest, v.Size)
	}
	w.Limits = w.Limits.For(given + largest)
	return w, nil
}

// named is a value as records name it.
func (v Value) named(name string) *store.Result {
	return &store.Result{Name: name, Type: v.Type, Layout: v.Layout, Hash: v.Hash, Size: v.Size}
}

// arrived takes up what was computed elsewhere.
func (e *Engine) arrived(c *Computation) error {
	r, ok, err := e.Store.Record(c.Text.Key())
	if !ok && err == nil {
		err = &Fault{Text: "its record is not in the store", Unreadable: true}
	}
	if err != nil {
		return &Fault{Text: err.Error(), Unreadable: true}
	}
	values := make([]Value, len(r.Results))
	for i, res := range r.Results {
		if values[i], err = known(e.Store, res); err != nil {
			return &Fault{Text: err.Error(), Unreadable: true}
		}
	}
	c.State, c.Results, c.Log, c.Took, c.When, c.Host = Computed, values, r.Log, r.Took, r.When, r.Host
	return nil
}

// hosts says where elements were computed, when it was at few places.
func hosts(comps []Computation) string {
	const most = 3
	var names []string
	for n := range comps {
		if h := comps[n].Host; h != "" && !slices.Contains(names, h) {
			names = append(names, h)
		}
		if len(names) > most {
			return strings.Join(names[:most], "; ") + " and others"
		}
	}
	return strings.Join(names, "; ")
}

// mendFor reads all that the listed elements are computed with, and mends what
// is damaged.
func (e *Engine) mendFor(ctx context.Context, spec *plan.Step, items []Value, list []int) error {
	if err := e.verifyArguments(ctx, spec); err != nil || items == nil {
		return err
	}
	for _, n := range list {
		if err := e.verify(ctx, spec.Args[spec.Each], func() Value { return items[n] }); err != nil {
			return err
		}
	}
	return nil
}
