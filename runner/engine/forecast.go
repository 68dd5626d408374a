package engine

import (
	"context"
	"fmt"
	"os"
	"strings"

	"rimlight/runner/plan"
	"rimlight/runner/store"
)

// A Forecast says what a run would do about one input or step.
type Forecast struct {
	Name  string
	Input bool
	Known int      // computations whose results are in the store
	Total int      // computations in all: 1, or the elements of a fan-out
	Why   string   // why the rest would be computed
	Waits string   // what has to be computed before more can be said; empty when nothing
	Takes []string // where each argument comes from
}

// Forecast looks at inputs and store and says what Run would do. It computes
// nothing.
func (e *Engine) Forecast() []Forecast {
	e.outcome = &Outcome{Inputs: make([]Input, len(e.Plan.Inputs)), Steps: make([]Step, len(e.Plan.Steps))}
	var out []Forecast
	for i := range e.Plan.Inputs {
		spec, in := &e.Plan.Inputs[i], &e.outcome.Inputs[i]
		in.Name = spec.Name
		f := Forecast{Name: spec.Name, Input: true, Total: 1}
		if e.forecastInput(spec, in) {
			f.Known = 1
		}
		f.Why = in.Why
		if in.Err != "" {
			f.Why = in.Err
		}
		out = append(out, f)
	}
	for i := range e.Plan.Steps {
		out = append(out, e.forecastStep(i))
	}
	return out
}

// Looked gives the keys that Forecast looked up, as the outcome of a run that
// computed nothing.
func (e *Engine) Looked() *Outcome { return e.outcome }

func (e *Engine) forecastInput(spec *plan.Input, in *Input) bool {
	if len(spec.Paths) == 0 {
		b, err := zero(spec.Type)
		if err != nil {
			in.fail(err)
			return false
		}
		in.State, in.Results = Reused, []Value{{Type: spec.Type, Hash: store.HashOf(b)}}
		return true
	}
	var sums []string
	for _, p := range spec.Paths {
		f, err := os.Open(p)
		if err != nil {
			in.fail(err)
			return false
		}
		_, sum, err := digest(context.Background(), f)
		f.Close()
		if err != nil {
			in.fail(fmt.Errorf("%s: %w", p, err))
			return false
		}
		sums = append(sums, sum)
	}
	in.Text = plan.ReadKey(spec, sums, e.Library, e.Build)
	return e.lookUp(&in.Computation, spec.Name, -1)
}

func (e *Engine) forecastStep(i int) Forecast {
	spec, out := &e.Plan.Steps[i], &e.outcome.Steps[i]
	out.Name = spec.Name
	f := Forecast{Name: spec.Name, Total: 1}
	var waits []string
	for _, a := range spec.Args {
		f.Takes = append(f.Takes, takes(a))
		switch a.Source {
		case plan.FromInput:
			if !e.outcome.Inputs[a.Input].Finished() {
				waits = append(waits, e.Plan.Inputs[a.Input].Name)
			}
		case plan.FromResult, plan.FromElement:
			if !e.outcome.Steps[a.Step].Finished() {
				waits = append(waits, e.Plan.Steps[a.Step].Name)
			}
		}
	}
	out.State = NotReached
	if len(waits) > 0 {
		f.Waits = strings.Join(unique(waits), ", ")
		return f
	}
	if spec.Each < 0 {
		c := Computation{Text: plan.StepKey(spec, e.hashes(spec, Value{}), e.Library, e.Build)}
		if e.lookUp(&c, spec.Name, -1) {
			f.Known = 1
		}
		f.Why, out.Computation = c.Why, c
		return f
	}
	each := spec.Args[spec.Each]
	items, err := elements(e.Store, e.result(each.Step, each.Result))
	if err != nil {
		f.Why = err.Error()
		return f
	}
	f.Total = len(items)
	comps, todo := e.lookUpElements(spec, items)
	out.Elements = comps
	f.Known, f.Why = len(items)-len(todo), reasons(comps, todo)
	if len(todo) > 0 {
		return f
	}
	c := Computation{State: Reused}
	if c.Results, err = e.gather(spec, comps); err != nil {
		f.Why, f.Known = err.Error(), 0
		return f
	}
	out.Computation = c
	return f
}

func takes(a plan.Arg) string {
	switch a.Source {
	case plan.FromResult:
		return a.Name + " from " + a.From
	case plan.FromElement:
		return a.Name + ", one by one, from " + a.From
	case plan.FromPriors:
		return "the priors of its section"
	case plan.FromSeed:
		return "a seed from its key"
	}
	return string(a.Source) + " " + a.Name
}

func unique(list []string) []string {
	var out []string
	for _, s := range list {
		if len(out) == 0 || out[len(out)-1] != s {
			out = append(out, s)
		}
	}
	return out
}
