package engine

import (
	"context"
	"fmt"
	"io"
	"reflect"

	"rimlight/runner/canon"
	"rimlight/runner/plan"
	"rimlight/runner/worker"
)

// arguments gives what a step is to be called with. The element's place, and
// the seed's, stay empty. Kept values are read, and verified, while they are
// sent to a worker: they are never whole in this process.
func (e *Engine) arguments(ctx context.Context, spec *plan.Step) ([]worker.Arg, error) {
	if e.foreign { // who sent the work is to know at once, and for all of it
		if err := e.verifyArguments(ctx, spec); err != nil {
			return nil, err
		}
	}
	out := make([]worker.Arg, len(spec.Args))
	for i, a := range spec.Args {
		switch a.Source {
		case plan.FromSetting, plan.FromPriors:
			b, err := sealGo(a.Type, a.Value)
			if err != nil {
				return nil, fmt.Errorf("argument %s: %w", a.Name, err)
			}
			out[i] = worker.Bytes(b)
		case plan.FromInput, plan.FromResult:
			out[i] = e.kept(func() Value { return e.argument(a) })
		}
		out[i].Common = true
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

// kept makes an argument of a kept value, which is asked for each time.
func (e *Engine) kept(get func() Value) worker.Arg {
	return worker.Arg{Size: get().sealedSize(), Write: func(w io.Writer) error { return get().write(w, e.Store) }}
}

// argument is the kept value that a parameter is filled with.
func (e *Engine) argument(a plan.Arg) Value {
	if a.Source == plan.FromInput {
		return e.outcome.Inputs[a.Input].Results[0]
	}
	return e.result(a.Step, a.Result)
}

// verifyArguments reads what a step is called with, and mends what is damaged.
func (e *Engine) verifyArguments(ctx context.Context, spec *plan.Step) error {
	for _, a := range spec.Args {
		if a.Source != plan.FromInput && a.Source != plan.FromResult {
			continue
		}
		if err := e.verify(ctx, a, func() Value { return e.argument(a) }); err != nil {
			return fmt.Errorf("argument %s: %w", a.Name, err)
		}
	}
	return nil
}

// verify reads a kept value, and mends it when it is damaged.
func (e *Engine) verify(ctx context.Context, a plan.Arg, get func() Value) error {
	err := get().write(io.Discard, e.Store)
	if damaged(err) {
		if err = e.mendArgument(ctx, a, err); err == nil {
			err = get().write(io.Discard, e.Store)
		}
	}
	return err
}

// mendArgument computes again, or reads again, what a parameter is filled with.
func (e *Engine) mendArgument(ctx context.Context, a plan.Arg, cause error) error {
	switch {
	case e.foreign:
		return cause
	case a.Source == plan.FromInput:
		again := Input{Name: e.Plan.Inputs[a.Input].Name}
		e.note("input %s: %v; it was read again", again.Name, cause)
		return e.readInput(ctx, &again, &e.Plan.Inputs[a.Input])
	}
	return e.mend(ctx, a.Step, cause)
}

// A hold is what a computation that is under way takes up: a slot for its
// worker and, if it handles mass data, the turn of those that do.
type hold struct {
	e    *Engine
	mass bool
}

// massData is how many bytes of arguments are mass data. Of workers that take
// in so much, one is at work at a time, so that a cube is not in the memory of
// several.
const massData = 256 << 20

// massive reports whether arguments are mass data together.
func massive(args []worker.Arg) bool {
	size := int64(0)
	for _, a := range args {
		size += a.Size
	}
	return size > massData
}

// take waits for what h stands for; false when ctx ended first.
func (h hold) take(ctx context.Context) bool {
	if h.mass {
		select {
		case h.e.turn <- struct{}{}:
		case <-ctx.Done():
			return false
		}
	}
	if !h.e.acquire(ctx) {
		if h.mass {
			<-h.e.turn
		}
		return false
	}
	return true
}

func (h hold) give() {
	h.e.release()
	if h.mass {
		<-h.e.turn
	}
}

// lend gives back what h stands for while do is at work, which may need it.
func (h hold) lend(do func() error) error {
	h.give()
	err := do()
	if h.mass {
		h.e.turn <- struct{}{}
	}
	h.e.slots <- struct{}{}
	return err
}
