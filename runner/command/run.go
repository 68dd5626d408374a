package command

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"rimlight/reports"
	"rimlight/runner/diag"
	"rimlight/runner/engine"
	"rimlight/runner/plan"
)

func (a *app) runCommand() *cobra.Command {
	var o options
	c := &cobra.Command{
		Use:   "run RECIPE",
		Short: "Run a recipe; reuse every result whose key is known",
		Long: `Run carries out a recipe and writes report.html, spectrum.csv, spectrum.ecsv
and run.json. Every finished result is kept in the store under a key made of
all that can change it, and is used again as long as the key is the same.

With --on slurm, long steps are computed by a Slurm cluster whose nodes see the
folders of store and report under the same paths. The elements of a fan-out are
submitted as job arrays, when all that the step needs is there; Ctrl-C cancels
them, and a run takes over what an earlier one left in the queue. Computed here
are steps of less computing time than --slurm-over, as far as that is known from
the run before; plain steps of which it is not known; the first four elements of
such a fan-out; and what --again asks for.

A recipe is a program. Read a stranger's recipe before you run it.` + exitHelp,
		Example: "  rimlight run visit.md --in raw=visit2.fits --set clipSigma=4\n  rimlight run visit.md --on slurm --slurm-partition long --slurm-account transits",
		Args:    cobra.ExactArgs(1),
		RunE:    func(c *cobra.Command, args []string) error { return a.run(c.Context(), args[0], &o) },
	}
	o.flags(c)
	c.Flags().StringVar(&o.why, "why", "", "show the key of `STEP`, and what changed in it (STEP:N for element N)")
	c.Flags().StringArrayVar(&o.again, "again", nil, "compute the results of `STEP` although they are known, and compare")
	return c
}

// run carries out a recipe from start to report.
func (a *app) run(ctx context.Context, file string, o *options) error {
	started := time.Now()
	go a.library()
	go a.executable()
	p, code, err := prepare(ctx, file, o)
	if err != nil {
		return a.wrong(err, o)
	}
	e, before, err := a.newEngine(p, code, o)
	if err != nil {
		return err
	}
	if err := prepareFolder(o.out); err != nil {
		return err
	}
	if err := o.askAgain(p, e); err != nil {
		return err
	}
	release, notes, err := e.Store.Use(ctx)
	if err != nil {
		return err
	}
	defer release()
	end, err := o.place(ctx, e)
	if err != nil {
		return err
	}
	a.showConfinement(o)
	show := a.display(p, o)
	e.Observe = show.event
	outcome := e.Run(ctx)
	notes = append(notes, end()...)
	show.close()

	// What follows is done even after an interruption: what was finished is
	// kept, and the report says what is missing.
	doc := document(context.WithoutCancel(ctx), a, e, outcome, started)
	outcome.Notes = append(notes, e.Notes()...)
	doc.Notes = outcome.Notes
	written, err := writeOutputs(o.out, doc, e, outcome, before)
	if err != nil {
		return &exit{status: ExitFailed, cause: err}
	}
	show.finish(doc, written)
	show.again(o.again, outcome)
	if o.why != "" {
		if err := a.showWhy(o.why, e, outcome); err != nil {
			return err
		}
	}
	switch doc.Outcome {
	case reports.Interrupted:
		return &exit{status: ExitInterrupted}
	case reports.StepFailed:
		return &exit{status: ExitFailed}
	case reports.CheckFailed:
		return &exit{status: ExitCheckFailed}
	}
	if len(outcome.Differs) > 0 {
		return &exit{status: ExitCheckFailed}
	}
	return nil
}

// noSuch is the error for a flag that names what the recipe does not have.
func noSuch(flag, name, what string, known []string) error {
	text := fmt.Sprintf("%s %s: the recipe has no %s of this name; it has %s", flag, name, what, strings.Join(known, ", "))
	if near := diag.Nearest(name, known); near != "" {
		text += "; nearest: " + near
	}
	return &plan.OptionError{Text: text}
}

// askAgain passes --again on to the engine.
func (o *options) askAgain(p *plan.Plan, e *engine.Engine) error {
	var known []string
	for _, s := range p.Steps {
		known = append(known, s.Name)
	}
	for _, name := range o.again {
		if !slices.Contains(known, name) {
			return noSuch("--again", name, "step", known)
		}
	}
	if len(o.again) > 0 {
		e.Again = func(step string) bool { return slices.Contains(o.again, step) }
	}
	return nil
}

// wrong tells what is wrong with a recipe, fault by fault.
func (a *app) wrong(err error, o *options) error {
	var list diag.List
	if !errors.As(err, &list) {
		return err
	}
	for _, d := range list {
		if o.json {
			writeJSON(a.stdout, map[string]any{"event": "fault", "file": d.Pos.File, "line": d.Pos.Line, "col": d.Pos.Col,
				"message": d.Message, "expected": d.Expected, "nearest": d.Nearest})
			continue
		}
		fmt.Fprintln(a.stderr, d)
	}
	return &exit{status: ExitWrong, cause: err, told: true}
}

// shortPath gives path as seen from the current folder when that is shorter.
func shortPath(path string) string {
	wd, err := os.Getwd()
	if err != nil {
		return path
	}
	abs, err := filepath.Abs(path)
	if err != nil {
		return path
	}
	if rel, err := filepath.Rel(wd, abs); err == nil && len(rel) < len(path) {
		return rel
	}
	return path
}
