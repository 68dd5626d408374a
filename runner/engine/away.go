package engine

import (
	"context"
	"errors"
	"sync"

	"rimlight/runner/plan"
	"rimlight/runner/program"
)

// Carry does units of work for an engine on another machine, as that one would,
// and keeps what it gives in the store. The engine e has no plan. Carry tells
// of each unit, by its index, how it ended; a unit whose record is in the store
// has ended well and is not computed again. It returns early when ctx ends, and
// with an error, a *Fault, when what all units are computed with is not there.
func (e *Engine) Carry(ctx context.Context, w Work, ended func(unit int, err error)) error {
	spec, err := e.adopt(w)
	if err != nil {
		return faultOf(err, "")
	}
	e.slots, e.turn = make(chan struct{}, max(1, e.Jobs)), make(chan struct{}, 1)
	comps, items := make([]Computation, len(w.Units)), []Value(nil)
	var todo []int
	for n, u := range w.Units {
		comps[n] = Computation{State: NotReached, Text: u.Text}
		if u.Element != nil {
			items = append(items, Value{Type: u.Element.Type, Layout: u.Element.Layout, Hash: u.Element.Hash, Size: u.Element.Size})
		}
		if e.arrived(&comps[n]) == nil {
			ended(n, nil)
			continue
		}
		todo = append(todo, n)
	}
	if len(todo) == 0 {
		return nil
	}
	var mu sync.Mutex
	told := func(n int, err error) {
		mu.Lock()
		defer mu.Unlock()
		if err == nil {
			ended(n, nil)
			return
		}
		ended(n, faultOf(err, comps[n].Log))
	}
	if items == nil {
		err = e.computeHere(ctx, spec, &comps[0])
		if err == nil || ctx.Err() == nil {
			told(0, err)
		}
		return nil
	}
	e.ended = told
	if err := e.missingHere(ctx, spec, items, comps, todo); err != nil {
		return faultOf(err, "")
	}
	for _, n := range todo {
		if comps[n].State == NotReached && ctx.Err() == nil {
			ended(n, ErrUntried)
		}
	}
	return nil
}

// adopt makes of a description of work a step whose arguments are all there.
func (e *Engine) adopt(w Work) (*plan.Step, error) {
	if e.Plan != nil || len(w.Units) == 0 {
		return nil, errors.New("work for another machine needs an engine without a plan, and units")
	}
	e.Plan, e.outcome, e.foreign = &plan.Plan{}, &Outcome{}, true
	spec := &plan.Step{Step: program.Step{Name: w.Step}, Each: -1}
	for _, name := range w.Results {
		spec.Results = append(spec.Results, program.Var{Name: name})
	}
	for i, a := range w.Args {
		arg := plan.Arg{Name: a.Name, Type: a.Type, Source: a.Source}
		switch {
		case a.Source == plan.FromElement:
			spec.Each = i
		case a.Sealed != nil:
			arg.Value = a.Sealed
		case a.Value != nil:
			v, err := known(e.Store, *a.Value)
			if err != nil {
				return nil, &Fault{Text: "argument " + a.Name + ": " + err.Error(), Unreadable: true}
			}
			arg.Source = plan.FromInput
			arg.Input = len(e.outcome.Inputs)
			e.outcome.Inputs = append(e.outcome.Inputs, Input{Name: a.Name, Computation: Computation{State: Reused, Results: []Value{v}}})
		}
		spec.Args = append(spec.Args, arg)
	}
	for _, u := range w.Units {
		if (u.Element != nil) != (spec.Each >= 0) || spec.Each < 0 && len(w.Units) > 1 {
			return nil, errors.New("the units of the work do not go with its step")
		}
	}
	return spec, nil
}
