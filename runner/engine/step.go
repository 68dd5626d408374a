package engine

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"reflect"
	"sync"
	"sync/atomic"

	"rimlight/runner/canon"
	"rimlight/runner/plan"
	"rimlight/runner/worker"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limbtable"
)

// inputTypes are the Go types that layouts read into.
var inputTypes = map[string]reflect.Type{
	"rimlight/steps/lightcurve.Cube": reflect.TypeFor[lightcurve.Cube](),
	"rimlight/steps/limbtable.Table": reflect.TypeFor[limbtable.Table](),
	"string":                         reflect.TypeFor[string](),
}

// step looks up or computes step i, whose needs are all there.
func (e *Engine) step(ctx context.Context, i int) {
	out, spec := &e.outcome.Steps[i], &e.Plan.Steps[i]
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

// arguments reads what a step is to be called with. The element's place, and
// the seed's, stay empty.
func (e *Engine) arguments(ctx context.Context, spec *plan.Step) ([][]byte, error) {
	out := make([][]byte, len(spec.Args))
	for i, a := range spec.Args {
		var err error
		switch a.Source {
		case plan.FromSetting, plan.FromPriors:
			out[i], err = sealGo(a.Type, a.Value)
		case plan.FromInput:
			out[i], err = e.inputBytes(ctx, a.Input)
		case plan.FromResult:
			out[i], err = e.resultBytes(ctx, a.Step, a.Result)
		}
		if err != nil {
			return nil, fmt.Errorf("argument %s: %w", a.Name, err)
		}
	}
	return out, nil
}

func sealGo(typ string, v any) ([]byte, error) {
	if b, ok := v.(ready); ok {
		return b, nil
	}
	layout, err := canon.Layout(reflect.TypeOf(v))
	if err != nil {
		return nil, err
	}
	b, err := canon.Marshal(v)
	if err != nil {
		return nil, err
	}
	return canon.Seal(typ, layout, b), nil
}

// inputBytes reads an input as kept, and reads the raw file again when the
// kept form turns out to be damaged.
func (e *Engine) inputBytes(ctx context.Context, i int) ([]byte, error) {
	in := &e.outcome.Inputs[i]
	b, err := sealed(e.Store, in.Results[0])
	if !damaged(err) || e.foreign {
		return b, err
	}
	e.note("input %s: %v; it was read again", in.Name, err)
	again := Input{Name: in.Name}
	if err := e.readInput(ctx, &again, &e.Plan.Inputs[i]); err != nil {
		return nil, err
	}
	return sealed(e.Store, again.Results[0])
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

// resultBytes reads a kept result, and computes it again when it turns out to
// be damaged.
func (e *Engine) resultBytes(ctx context.Context, step, result int) ([]byte, error) {
	b, err := sealed(e.Store, e.result(step, result))
	if !damaged(err) {
		return b, err
	}
	if err := e.mend(ctx, step, err); err != nil {
		return nil, err
	}
	return sealed(e.Store, e.result(step, result))
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

// Bytes reads result number result of a step, in its envelope, mending the
// store when it is damaged. It may be called after Run.
func (e *Engine) Bytes(ctx context.Context, step, result int) ([]byte, error) {
	return e.resultBytes(ctx, step, result)
}

// InputBytes reads an input as read, in its envelope, likewise.
func (e *Engine) InputBytes(ctx context.Context, input int) ([]byte, error) {
	return e.inputBytes(ctx, input)
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
	args, err := e.arguments(ctx, spec)
	if err != nil {
		return err
	}
	if !e.acquire(ctx) {
		return ctx.Err()
	}
	defer e.release()
	e.observe(Event{Step: spec.Name, Why: c.Why})
	p := pool{e: e, spec: spec, args: args}
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
	arriving := make(chan keeping, maxTogether)
	var kept, all sync.WaitGroup
	kept.Go(func() { e.keeper(arriving) })
	for range min(cap(e.slots), len(todo)) {
		all.Go(func() {
			if !e.acquire(ctx) {
				return
			}
			defer e.release()
			p := pool{e: e, spec: spec, args: args}
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
					k.done = finish
					arriving <- k
				}
				item, err := e.itemBytes(ctx, spec.Args[spec.Each], items, n)
				if err == nil {
					err = p.compute(ctx, &comps[n], item)
				}
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

// itemBytes reads one element of a collection. The caller holds a worker slot,
// which is lent to the step that has to be computed again, if any.
func (e *Engine) itemBytes(ctx context.Context, each plan.Arg, items []Value, n int) ([]byte, error) {
	b, err := sealed(e.Store, items[n])
	if damaged(err) {
		e.release()
		mended := e.mend(ctx, each.Step, err)
		e.slots <- struct{}{}
		if mended != nil {
			return nil, mended
		}
		b, err = sealed(e.Store, items[n])
	}
	return b, err
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
	args [][]byte
	w    *worker.Worker

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
// step's doing, another one gets a second try.
func (p *pool) compute(ctx context.Context, c *Computation, element []byte) error {
	args := make([][]byte, len(p.args))
	copy(args, p.args)
	for i, a := range p.spec.Args {
		switch a.Source {
		case plan.FromElement:
			args[i] = element
		case plan.FromSeed:
			var err error
			if args[i], err = sealGo("uint64", c.Text.Seed()); err != nil {
				return err
			}
		}
	}
	var v worker.Values
	var err error
	for range 2 {
		if v, err = p.call(ctx, args); err == nil {
			break
		}
		var lost *worker.LostError
		if fatal(err) {
			p.close()
		}
		if !errors.As(err, &lost) || !lost.Outside() || ctx.Err() != nil {
			break
		}
	}
	c.Log = v.Log
	if err != nil {
		return err
	}
	names := make([]string, len(p.spec.Results))
	for i, r := range p.spec.Results {
		names[i] = r.Name
	}
	k := keeping{c: c, name: p.spec.Name, results: names, values: v}
	if p.later == nil {
		return p.e.keepOne(k)
	}
	p.later(k)
	return nil
}

func (p *pool) call(ctx context.Context, args [][]byte) (worker.Values, error) {
	if p.w != nil && p.w.Spent() {
		p.close()
	}
	if p.w == nil {
		w, err := worker.Start(ctx, p.e.Limits)
		if err != nil {
			return worker.Values{}, err
		}
		p.w = w
		if err := w.Load(p.e.Code); err != nil {
			return worker.Values{}, err
		}
	}
	return p.w.Call(p.spec.Name, args)
}
