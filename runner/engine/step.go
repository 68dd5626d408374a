package engine

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"reflect"
	"slices"
	"sync"
	"sync/atomic"

	"rimlight/runner/plan"
	"rimlight/runner/worker"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limbtable"
)

// inputTypes are the Go types that layouts read into.
var inputTypes = map[string]reflect.Type{
	"rimlight/steps/lightcurve.Cube":       reflect.TypeFor[lightcurve.Cube](),
	"rimlight/steps/limbtable.Table":       reflect.TypeFor[limbtable.Table](),
	"rimlight/steps/limbtable.Intensities": reflect.TypeFor[limbtable.Intensities](),
	"rimlight/steps/limbtable.Throughput":  reflect.TypeFor[limbtable.Throughput](),
	"string":                               reflect.TypeFor[string](),
}

// step looks up or computes step i, whose needs are all there.
func (e *Engine) step(ctx context.Context, i int) {
	out, spec := &e.outcome.Steps[i], &e.Plan.Steps[i]
	e.standby.waiting.Add(-1)
	var err error
	if spec.Each >= 0 {
		err = e.fanOut(ctx, i)
	} else {
		err = e.plain(ctx, i)
	}
	if ctx.Err() != nil && !out.Finished() {
		out.State = NotReached
		return
	}
	if err != nil {
		out.fail(err)
	}
	done, total := 0, len(out.Elements)
	for _, el := range out.Elements {
		if el.Finished() {
			done++
		}
	}
	e.observe(Event{Step: out.Name, State: out.State, Why: out.Why, Err: cmp.Or(out.Err, out.GapText()), Took: out.Took, Done: done, Total: total})
}

// hashes are the content hashes of a step's arguments, as its key wants them;
// element is the one of the fan-out that is meant.
func (e *Engine) hashes(spec *plan.Step, element Value) []string {
	out := make([]string, len(spec.Args))
	for i, a := range spec.Args {
		switch a.Source {
		case plan.FromInput:
			out[i] = e.outcome.Inputs[a.Input].Results[0].Hash.String()
		case plan.FromResult:
			out[i] = e.result(a.Step, a.Result).Hash.String()
		case plan.FromElement:
			out[i] = element.Hash.String()
		}
	}
	return out
}

// result is a result of a step that is done.
func (e *Engine) result(step, result int) Value {
	e.state.RLock()
	defer e.state.RUnlock()
	return e.outcome.Steps[step].Results[result]
}

// settle writes down what a step came to.
func (e *Engine) settle(step int, c Computation, elements []Computation) {
	e.state.Lock()
	defer e.state.Unlock()
	e.outcome.Steps[step].Computation, e.outcome.Steps[step].Elements = c, elements
}

// mend computes again whatever of a step's results is missing from the store.
func (e *Engine) mend(ctx context.Context, step int, cause error) error {
	if e.foreign {
		return cause
	}
	e.heal[step].Lock()
	defer e.heal[step].Unlock()
	e.note("step %s: %v; it was computed again", e.Plan.Steps[step].Name, cause)
	if e.Plan.Steps[step].Each >= 0 {
		return e.fanOut(ctx, step)
	}
	return e.plain(ctx, step)
}

// plain looks up or computes a step that is no fan-out.
func (e *Engine) plain(ctx context.Context, i int) error {
	spec := &e.Plan.Steps[i]
	c := Computation{State: NotReached, Text: plan.StepKey(spec, e.hashes(spec, Value{}), e.Library, e.Build)}
	if !e.lookUp(&c, spec.Name, -1) {
		if err := e.compute(ctx, spec, &c); err != nil {
			e.settle(i, c, nil)
			return err
		}
	}
	c.Seed = e.seed(spec, c.Text)
	e.settle(i, c, nil)
	return nil
}

// compute computes a plain step, here or elsewhere.
func (e *Engine) compute(ctx context.Context, spec *plan.Step, c *Computation) error {
	if took := e.tookBefore(spec.Name, -1); e.mayLeave(spec) && e.Elsewhere.Takes(1, took) {
		return e.computeAway(ctx, spec, c, took)
	}
	return e.computeHere(ctx, spec, c)
}

// computeHere computes a plain step in a worker of this machine.
func (e *Engine) computeHere(ctx context.Context, spec *plan.Step, c *Computation) error {
	args, err := e.arguments(ctx, spec)
	if err != nil {
		return err
	}
	h := hold{e, massive(args)}
	if !h.take(ctx) {
		return ctx.Err()
	}
	defer h.give()
	e.observe(Event{Step: spec.Name, Why: c.Why})
	p := pool{e: e, spec: spec, args: args, hold: h}
	defer p.close()
	return p.compute(ctx, c, nil)
}

// seed is what the step's seed parameter is filled with, 0 when it has none.
func (e *Engine) seed(spec *plan.Step, text plan.KeyText) uint64 {
	for _, a := range spec.Args {
		if a.Source == plan.FromSeed {
			return text.Seed()
		}
	}
	return 0
}

// fanOut looks up all elements of a fan-out and computes those that are not
// known, several at a time.
func (e *Engine) fanOut(ctx context.Context, i int) error {
	spec := &e.Plan.Steps[i]
	each := spec.Args[spec.Each]
	items, err := e.items(ctx, each)
	if err != nil {
		return err
	}
	comps, todo := e.lookUpElements(spec, items)
	if before := &e.outcome.Steps[i]; before.Finished() { // it is being mended
		todo = carry(before.Elements, comps, todo)
	}
	why := reasons(comps, todo)
	var results []Value
	// Twice, because a damaged result of an element may be noticed only when
	// it is read.
	for attempt := 0; ; attempt++ {
		if len(todo) > 0 {
			if err := e.missing(ctx, spec, items, comps, todo); err != nil {
				return err
			}
		}
		if ctx.Err() != nil {
			break
		}
		if err = e.fillGaps(spec, items, comps); err == nil {
			results, err = e.gather(spec, comps)
		}
		if !damaged(err) || attempt > 0 {
			break
		}
		e.note("step %s: %v; it was computed again", spec.Name, err)
		before := comps
		comps, todo = e.lookUpElements(spec, items)
		todo = carry(before, comps, todo)
		why = reasons(comps, todo)
	}
	c := Computation{State: Reused, Results: results}
	if why != "" {
		c.State, c.Why = Computed, why
	}
	for n := range comps {
		c.Took += comps[n].Took
		if comps[n].When.After(c.When) {
			c.When = comps[n].When
		}
	}
	c.Host = hosts(comps)
	if ctx.Err() != nil {
		c.State, err = NotReached, ctx.Err()
	}
	e.settle(i, c, comps)
	return err
}

// lookUpElements looks up every element of a fan-out; todo lists those that
// are not known.
func (e *Engine) lookUpElements(spec *plan.Step, items []Value) (comps []Computation, todo []int) {
	comps = make([]Computation, len(items))
	known := make([]bool, len(items))
	atOnce(len(items), func(n int) {
		comps[n] = Computation{State: NotReached, Text: plan.StepKey(spec, e.hashes(spec, items[n]), e.Library, e.Build)}
		known[n] = e.lookUp(&comps[n], spec.Name, n)
		comps[n].Seed = e.seed(spec, comps[n].Text)
	})
	for n := range comps {
		if !known[n] {
			todo = append(todo, n)
		}
	}
	return comps, todo
}

// atOnce calls do with all numbers below n, several at a time: most of their
// time, lookups wait for the disk.
func atOnce(n int, do func(n int)) {
	const most = 8
	var next atomic.Int64
	var all sync.WaitGroup
	for range min(n, most) {
		all.Go(func() {
			for k := int(next.Add(1)) - 1; k < n; k = int(next.Add(1)) - 1 {
				do(k)
			}
		})
	}
	all.Wait()
}

// gather puts together, result by result, what the elements gave.
func (e *Engine) gather(spec *plan.Step, comps []Computation) ([]Value, error) {
	if len(comps) == 0 {
		return nil, fmt.Errorf("the collection %s is empty: there is nothing to run the step over", spec.Step.Each.Collection)
	}
	out := make([]Value, len(spec.Results))
	for r := range spec.Results {
		values := make([]Value, len(comps))
		for n := range comps {
			values[n] = comps[n].Results[r]
		}
		var err error
		if out[r], err = collect(e.Store, spec.Results[r].Type, values[0].Layout, values); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// items are the elements that a fan-out runs over.
func (e *Engine) items(ctx context.Context, each plan.Arg) ([]Value, error) {
	get := func() ([]Value, error) { return elements(e.Store, e.result(each.Step, each.Result)) }
	items, err := get()
	if damaged(err) {
		if err := e.mend(ctx, each.Step, err); err != nil {
			return nil, err
		}
		items, err = get()
	}
	return items, err
}

// missingHere computes the elements listed in todo with a pool of workers.
func (e *Engine) missingHere(ctx context.Context, spec *plan.Step, items []Value, comps []Computation, todo []int) error {
	args, err := e.arguments(ctx, spec)
	if err != nil {
		return err
	}
	var next, done atomic.Int64
	var mu sync.Mutex // guards patient
	patient := patience{total: len(comps)}
	for n := range comps {
		if comps[n].State != NotReached {
			done.Add(1)
		}
		if comps[n].Finished() {
			patient.good++
		}
	}
	e.observe(Event{Step: spec.Name, Why: comps[todo[0]].Why, Done: int(done.Load()), Total: len(comps)})
	arriving, room := make(chan keeping, maxTogether), newWaiting()
	var kept, all sync.WaitGroup
	kept.Go(func() { e.keeper(arriving) })
	workers, h := min(cap(e.slots), len(todo)), hold{e, massive(args)}
	if h.mass {
		workers = 1
	}
	for range workers {
		all.Go(func() {
			if !h.take(ctx) {
				return
			}
			defer h.give()
			p := pool{e: e, spec: spec, args: args, hold: h}
			defer p.close()
			for {
				k := int(next.Add(1)) - 1
				if k >= len(todo) || ctx.Err() != nil {
					return
				}
				n := todo[k]
				finish := func(err error) {
					if err != nil {
						comps[n].fail(err)
						if !own(err) { // a full disk, say: the step fails
							next.Store(int64(len(todo)))
						}
					}
					if e.ended != nil {
						e.ended(n, err)
					}
					e.observe(Event{Step: spec.Name, Done: int(done.Add(1)), Total: len(comps), Took: comps[n].Took})
				}
				p.later = func(k keeping) {
					size := k.tray.size
					room.add(size)
					k.done = func(err error) {
						room.done(size)
						finish(err)
					}
					arriving <- k
				}
				err := p.compute(ctx, &comps[n], &items[n])
				if err != nil {
					if ctx.Err() != nil {
						return
					}
					finish(err)
				}
				mu.Lock()
				switch {
				case err == nil:
					patient.good++
				case fatal(err):
					patient.deaths++
				}
				if patient.out() {
					next.Store(int64(len(todo)))
				}
				mu.Unlock()
			}
		})
	}
	all.Wait()
	close(arriving)
	kept.Wait()
	return nil
}

// reasons says why elements were computed, in the order of first appearance.
func reasons(comps []Computation, todo []int) string {
	var order []string
	count := map[string]int{}
	for _, n := range todo {
		w := comps[n].Why
		if count[w]++; count[w] == 1 {
			order = append(order, w)
		}
	}
	text := ""
	for _, w := range order {
		if text != "" {
			text += "; "
		}
		text += w
		if len(order) > 1 || count[w] < len(comps) {
			text += fmt.Sprintf(" (%d of %d elements)", count[w], len(comps))
		}
	}
	return text
}

// A pool is one worker that serves the elements of one fan-out, or a single
// step, started when it is first needed and again when it died.
type pool struct {
	e    *Engine
	spec *plan.Step
	args []worker.Arg
	hold hold
	w    *worker.Worker
	size int64 // bytes of arguments that the limits of w are meant for

	// later, when set, takes what a computation gave to be kept, so that the
	// next one need not wait for the disk.
	later func(keeping)
}

func (p *pool) close() {
	if p.w != nil {
		p.w.Close()
		p.w = nil
	}
}

// compute runs the step once, on the given element for a fan-out, and keeps
// what it gives. When the worker dies of something that may not have been the
// step's doing, another one gets a second try; so it does when an argument was
// damaged, which is mended first.
func (p *pool) compute(ctx context.Context, c *Computation, element *Value) error {
	args := slices.Clone(p.args)
	for i, a := range p.spec.Args {
		switch a.Source {
		case plan.FromElement:
			args[i] = p.e.kept(func() Value { return *element })
		case plan.FromSeed:
			b, err := sealGo("uint64", c.Text.Seed())
			if err != nil {
				return err
			}
			args[i] = worker.Bytes(b)
		}
	}
	t := &tray{store: p.e.Store}
	var v worker.Values
	var err error
	mended := map[int]bool{} // arguments, by their number
	for tries := 0; ; {
		v, err = p.call(ctx, args, t)
		if err == nil {
			break
		}
		t.clear()
		var failure *worker.Failure
		var lost *worker.LostError
		var arg *worker.ArgError
		if !errors.As(err, &failure) {
			p.close()
		}
		if errors.As(err, &lost) && lost.Outside() && ctx.Err() == nil && tries == 0 {
			tries++
			continue
		}
		if errors.As(err, &arg) {
			a := p.spec.Args[arg.Arg]
			if damaged(err) && ctx.Err() == nil && !mended[arg.Arg] {
				mended[arg.Arg] = true
				if err = p.hold.lend(func() error { return p.e.mendArgument(ctx, a, arg.Err) }); err == nil {
					continue
				}
			}
			err = fmt.Errorf("argument %s: %w", a.Name, err)
		}
		break
	}
	c.Log = v.Log
	if err != nil {
		return err
	}
	names := make([]string, len(p.spec.Results))
	for i, r := range p.spec.Results {
		names[i] = r.Name
	}
	k := keeping{c: c, name: p.spec.Name, results: names, values: v, tray: t}
	if p.later == nil {
		return p.e.keepOne(k)
	}
	p.later(k)
	return nil
}

func (p *pool) call(ctx context.Context, args []worker.Arg, t *tray) (worker.Values, error) {
	size := int64(0)
	for _, a := range args {
		size += a.Size
	}
	if p.w != nil && (p.w.Spent() || size > 2*p.size) {
		p.close()
	}
	if p.w == nil {
		p.size = max(size, small/2)
		var err error
		if p.w, err = p.e.worker(ctx, size); err != nil {
			return worker.Values{}, err
		}
	}
	return p.w.Call(p.spec.Name, args, t)
}
