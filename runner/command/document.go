package command

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"
	"time"

	"rimlight/reports"
	"rimlight/runner/engine"
	"rimlight/runner/plan"
)

// document gathers what the report shows.
func document(ctx context.Context, a *app, e *engine.Engine, outcome *engine.Outcome, started time.Time) reports.Document {
	p := e.Plan
	d := reports.Document{Title: p.Recipe.Title, Source: p.Recipe.Source, File: filepath.Base(p.Recipe.File), Started: started.UTC(),
		Command: "rimlight " + strings.Join(a.args, " ")}
	d.Inputs, d.Steps = make([]reports.Input, len(outcome.Inputs)), make([]reports.Step, len(p.Steps))
	parallel(len(d.Inputs)+len(d.Steps), func(i int) {
		if k := i - len(d.Inputs); k >= 0 {
			d.Steps[k] = stepOf(ctx, e, k, outcome)
		} else {
			d.Inputs[i] = inputOf(ctx, e, i, outcome)
		}
	})
	used := map[string]bool{}
	for i := range p.Steps {
		for _, pkg := range e.Library.Reached(p.Steps[i].Packages) {
			if !used[pkg] {
				used[pkg] = true
				d.Library = append(d.Library, reports.Package{Path: pkg, Hash: e.Library.Hash(pkg)})
			}
		}
	}
	for _, s := range p.Settings {
		out := reports.Setting{Name: s.Name, Value: s.InForce.Text, Unit: s.Unit, About: s.About, Changed: s.Given, Recipe: s.Value.Text, Line: s.Pos.Line}
		for _, v := range s.AlsoTry {
			out.AlsoTry = append(out.AlsoTry, v.Text)
		}
		d.Settings = append(d.Settings, out)
	}
	for _, m := range e.Build.Modules {
		d.Modules = append(d.Modules, reports.Module(m))
	}
	d.Host = host(e.Build, a.executable())
	d.Host.Confinement = confinement(e.Confinement)
	d.Outcome = verdict(outcome, d.Steps)
	d.Ended = d.Started.Add(time.Since(started)) // also when the clock was set meanwhile
	return d
}

// parallel calls do with all numbers below n, as many at a time as there are
// processors.
func parallel(n int, do func(i int)) {
	var next atomic.Int64
	var all sync.WaitGroup
	for range min(n, runtime.GOMAXPROCS(0)) {
		all.Go(func() {
			for i := int(next.Add(1)) - 1; i < n; i = int(next.Add(1)) - 1 {
				do(i)
			}
		})
	}
	all.Wait()
}

// verdict is how a run ended as a whole.
func verdict(outcome *engine.Outcome, steps []reports.Step) reports.Outcome {
	for _, in := range outcome.Inputs {
		if in.State == engine.Failed {
			return reports.StepFailed
		}
	}
	for _, s := range outcome.Steps {
		if s.State == engine.Failed {
			return reports.StepFailed
		}
	}
	if outcome.Interrupted {
		return reports.Interrupted
	}
	if _, failed := checks(steps); len(failed) > 0 {
		return reports.CheckFailed
	}
	return reports.Done
}

func inputOf(ctx context.Context, e *engine.Engine, i int, outcome *engine.Outcome) reports.Input {
	in := outcome.Inputs[i]
	spec := e.Plan.Inputs[i]
	out := reports.Input{Name: in.Name, Layout: spec.Layout, About: spec.About, Type: spec.Type, State: reports.State(in.State), Why: in.Why, Took: in.Took}
	for _, f := range in.Files {
		out.Files = append(out.Files, reports.InputFile{Name: filepath.Base(f.Path), Size: f.Size, SHA256: f.SHA256})
	}
	if in.Text != "" {
		out.Key = in.Text.Key().String()
	}
	if len(in.Results) == 1 {
		out.Hash = in.Results[0].Hash.String()
		if len(in.Files) > 0 {
			var err error
			out.Value, err = shownValue(in.Results[0].Type, -1, func(each eachPart) error { return e.InputParts(ctx, i, each) })
			if err != nil {
				in := &outcome.Inputs[i]
				in.State, in.Err = engine.Failed, fmt.Sprintf("it cannot be read from the store: %v", err)
				out.State = reports.State(in.State)
			}
		}
	}
	return out
}

func stepOf(ctx context.Context, e *engine.Engine, i int, outcome *engine.Outcome) reports.Step {
	spec, s := &e.Plan.Steps[i], &outcome.Steps[i]
	out := reports.Step{Name: spec.Name, Fence: spec.Fence, Section: e.Plan.Recipe.Sections[spec.Section].Heading, Line: spec.Pos.Line,
		Signature: spec.Signature, Doc: spec.Doc, State: reports.State(s.State), Why: s.Why, Err: s.Err, Log: s.Log, Seed: s.Seed, Took: s.Took, When: s.When}
	if spec.Step.Each != nil {
		out.Each = spec.Step.Each.Element + " in " + spec.Step.Each.Collection
	}
	if s.Host != e.Host {
		out.Host = s.Host
	}
	if s.Text != "" {
		out.Key = s.Text.Key().String()
	}
	for _, a := range spec.Args {
		arg := reports.Argument{Name: a.Name, Type: a.Type, Source: string(a.Source), From: a.From}
		switch a.Source {
		case plan.FromSetting:
			for _, set := range e.Plan.Settings {
				if set.Name == a.Name {
					arg.Text = strings.TrimSpace(set.InForce.Text + " " + set.Unit)
				}
			}
		case plan.FromPriors:
			arg.Value = a.Value
		case plan.FromInput:
			if r := outcome.Inputs[a.Input].Results; len(r) == 1 {
				arg.Hash = r[0].Hash.String()
			}
		case plan.FromResult, plan.FromElement:
			if r := outcome.Steps[a.Step].Results; a.Result < len(r) {
				arg.Hash = r[a.Result].Hash.String()
			}
		}
		out.Args = append(out.Args, arg)
	}
	for n, v := range s.Results {
		r := reports.Result{Name: spec.Results[n].Name, Type: v.Type, Hash: v.Hash.String(), Size: v.Size}
		var err error
		r.Value, err = shownValue(v.Type, v.Len(), func(each eachPart) error { return e.Parts(ctx, i, n, each) })
		if err != nil { // the report cannot be what it should be
			s.State, s.Err = engine.Failed, fmt.Sprintf("its result %s cannot be read: %v", r.Name, err)
			out.State, out.Err = reports.State(s.State), s.Err
		}
		out.Results = append(out.Results, r)
	}
	out.Checks = gapChecks(s)
	for n, el := range s.Elements {
		out.Elements = append(out.Elements, elementOf(n, el))
	}
	return out
}

func elementOf(n int, c engine.Computation) reports.Element {
	el := reports.Element{Label: fmt.Sprint(n + 1), State: reports.State(c.State), Why: c.Why, Err: c.Err, Took: c.Took}
	if c.Text != "" {
		el.Key = c.Text.Key().String()
	}
	if len(c.Results) > 0 {
		el.Hash = c.Results[0].Hash.String()
	}
	return el
}

// host is the machine and program that this is.
func host(b plan.Build, executable string) reports.Host {
	return reports.Host{OS: runtime.GOOS, Arch: b.Arch, CPUs: runtime.NumCPU(), GoVersion: b.Go, Version: b.Version, Revision: b.Revision,
		Executable: executable, Settings: b.Settings}
}

// executableHash is the SHA-256 of the running program, in hex, "" when it
// can't be read.
func executableHash() string {
	exe, err := os.Executable()
	if err != nil {
		return ""
	}
	f, err := os.Open(exe)
	if err != nil {
		return ""
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return ""
	}
	return hex.EncodeToString(h.Sum(nil))
}
