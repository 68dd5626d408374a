package command

import (
	"context"
	"fmt"
	"os"
	"os/user"
	"path/filepath"
	"strings"
	"sync"

	"rimlight/runner/diag"
	"rimlight/runner/engine"
	"rimlight/runner/plan"
	"rimlight/runner/program"
	"rimlight/runner/recipe"
	"rimlight/runner/record"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// prepare reads, checks and wires a recipe. Everything that is wrong with it
// comes back at once, as a diag.List.
func prepare(ctx context.Context, file string, o *options) (*plan.Plan, worker.Code, error) {
	if err := o.resolve(file); err != nil {
		return nil, worker.Code{}, err
	}
	set, err := named("set", o.set)
	if err != nil {
		return nil, worker.Code{}, err
	}
	in, err := o.inputs()
	if err != nil {
		return nil, worker.Code{}, err
	}
	source, err := readRecipe(file)
	if err != nil {
		return nil, worker.Code{}, err
	}
	r, diags := recipe.Parse(file, source)
	code := worker.Code{File: file, Text: r.Code()}
	for _, b := range r.Blocks {
		code.Fences = append(code.Fences, program.Fence{Start: b.Line, End: b.Line + strings.Count(strings.TrimSuffix(b.Code, "\n"), "\n")})
	}
	w, err := worker.Start(ctx, o.limits.Checking())
	if err != nil {
		return nil, worker.Code{}, err
	}
	defer w.Close()
	o.confined = w.Confinement()
	steps, more, err := w.Check(code)
	if err != nil {
		return nil, worker.Code{}, fmt.Errorf("%s: the code could not be checked: %w", file, err)
	}
	diags = append(diags, more...)
	p, more, err := plan.Wire(r, steps, plan.Options{Dir: filepath.Dir(file), In: in, Set: set})
	if err != nil {
		return nil, worker.Code{}, err
	}
	// A fault of the wiring on a line that is wrong anyway is a consequence.
	wrong := map[int]bool{}
	for _, d := range diags {
		wrong[d.Pos.Line] = true
	}
	for _, d := range more {
		if !wrong[d.Pos.Line] {
			diags = append(diags, d)
		}
	}
	if len(diags) == 0 && len(steps) == 0 {
		diags.Add(diag.Pos{File: file}, "the recipe has no steps", "expected fenced blocks with the info string go, with exported functions", "")
	}
	diags.Sort()
	return p, code, diags.Err()
}

func readRecipe(file string) ([]byte, error) {
	st, err := os.Stat(file)
	if err != nil {
		if os.IsNotExist(err) {
			return nil, fmt.Errorf("there is no recipe %s", file)
		}
		return nil, err
	}
	if st.IsDir() {
		return nil, fmt.Errorf("%s is a folder, expected a Markdown file", file)
	}
	if st.Size() > recipe.MaxSize {
		return nil, fmt.Errorf("%s has %d bytes; a recipe may have at most %d", file, st.Size(), recipe.MaxSize)
	}
	return os.ReadFile(file)
}

// newEngine sets up what carries out a plan. The record is that of the run
// before; nil, if there is none.
func (a *app) newEngine(p *plan.Plan, code worker.Code, o *options) (*engine.Engine, func() *record.Record, error) {
	s, err := store.Open(o.store)
	if err != nil {
		return nil, nil, err
	}
	if err := s.Limit(int64(o.reserve), int64(o.storeSize)); err != nil {
		return nil, nil, err
	}
	lib, err := a.library()
	if err != nil {
		return nil, nil, err
	}
	// It is read when something has to be explained: when all is known, nothing
	// has. An unreadable record explains nothing, but stops nothing.
	before := sync.OnceValue(func() *record.Record {
		r, err := record.Read(filepath.Join(o.out, recordFile))
		if err != nil {
			return nil
		}
		return r
	})
	if o.why != "" {
		before() // this run's own record will take its place
	}
	return &engine.Engine{Plan: p, Store: s, Library: lib, Build: plan.ReadBuild(), Code: code, Jobs: o.jobs, Host: who(), Limits: o.limits, Confinement: o.confined, NoGaps: o.noGaps, Before: func(step string, element int) plan.KeyText { return before().KeyText(step, element) }}, before, nil
}

// who is who computes, for records: user@machine.
func who() string {
	host, _ := os.Hostname()
	if u, err := user.Current(); err == nil && u.Username != "" {
		return u.Username + "@" + host
	}
	return host
}
