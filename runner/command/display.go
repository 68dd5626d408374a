package command

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"
	"time"

	"github.com/schollz/progressbar/v3"
	"golang.org/x/term"

	"rimlight/reports"
	"rimlight/runner/engine"
	"rimlight/runner/plan"
)

func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

func writeJSON(w io.Writer, v any) {
	b, err := json.Marshal(v)
	if err != nil {
		b = []byte(`{"event":"fault","message":"an event could not be written"}`)
	}
	w.Write(append(b, '\n'))
}

// A display shows a run as it goes: a bar on a terminal, plain lines
// elsewhere, events in JSON for programs.
type display struct {
	app   *app
	opts  *options
	total int // inputs and steps
	done  int
	bar   *progressbar.ProgressBar
	of    string // the step that the bar is of
	tenth map[string]int
	where map[string]string // that a step was last said to be computed
	paces map[string]pace
	now   func() time.Time
}

func (a *app) display(p *plan.Plan, o *options) *display {
	return &display{app: a, opts: o, total: len(p.Inputs) + len(p.Steps), tenth: map[string]int{}, where: map[string]string{}, paces: map[string]pace{}, now: time.Now}
}

// event is called for one event at a time.
func (d *display) event(ev engine.Event) {
	if ev.State != "" {
		d.done++
	}
	if d.opts.json {
		d.json(ev)
		return
	}
	if d.opts.quiet {
		return
	}
	switch {
	case ev.State == "" && ev.Total > 0:
		d.progress(ev)
	case ev.State == "":
		d.elsewhere(ev)
	case ev.State != "":
		d.finished(ev)
	}
}

// elsewhere shows where a plain step is computed.
func (d *display) elsewhere(ev engine.Event) {
	if ev.Where != d.where[ev.Step] {
		d.dropBar()
		d.where[ev.Step] = ev.Where
		fmt.Fprintf(d.app.stderr, "         %-18s %s\n", ev.Step, ev.Where)
	}
}

// progress shows how far a fan-out has come.
func (d *display) progress(ev engine.Event) {
	left := leftText(d.left(ev))
	if d.app.terminal {
		if d.of != ev.Step {
			d.dropBar()
			d.of = ev.Step
			d.bar = progressbar.NewOptions(ev.Total, progressbar.OptionSetWriter(d.app.stderr), progressbar.OptionSetDescription(fmt.Sprintf("%-18s", ev.Step)),
				progressbar.OptionSetWidth(30), progressbar.OptionShowCount(), progressbar.OptionSetPredictTime(false), progressbar.OptionClearOnFinish(),
				progressbar.OptionThrottle(100*time.Millisecond))
		}
		d.bar.Describe(fmt.Sprintf("%-18s %-18s", strings.TrimSpace(ev.Step+" "+ev.Where), left))
		d.bar.Set(ev.Done)
		return
	}
	if ev.Where != d.where[ev.Step] {
		d.where[ev.Step] = ev.Where
		fmt.Fprintf(d.app.stderr, "         %-18s %d of %d  %s\n", ev.Step, ev.Done, ev.Total, ev.Where)
	}
	if t := 10 * ev.Done / ev.Total; t > d.tenth[ev.Step] && ev.Done < ev.Total {
		d.tenth[ev.Step] = t
		fmt.Fprintln(d.app.stderr, strings.TrimRight(fmt.Sprintf("         %-18s %d of %d  %s", ev.Step, ev.Done, ev.Total, left), " "))
	}
}

// finished shows what a step came to, on one line.
func (d *display) finished(ev engine.Event) {
	d.dropBar()
	state := string(ev.State)
	switch {
	case ev.Absent:
		state = "not given"
	case ev.Input && ev.State == engine.Computed:
		state = "read"
	}
	line := fmt.Sprintf("[%2d/%d]  %-18s %-12s", d.done, d.total, ev.Step, state)
	if ev.State == engine.Computed {
		line += fmt.Sprintf("%8s", ev.Took.Round(time.Millisecond))
	}
	if ev.Total > 0 {
		line += fmt.Sprintf("  %d of %d elements", ev.Done, ev.Total)
	}
	if ev.Why != "" {
		line += "  " + ev.Why
	}
	fmt.Fprintln(d.app.stderr, line)
	if ev.Err != "" {
		fmt.Fprintln(d.app.stderr, "         "+ev.Err)
	}
}

func (d *display) dropBar() {
	if d.bar != nil {
		d.bar.Clear()
		d.bar, d.of = nil, ""
	}
}

func (d *display) close() { d.dropBar() }

func (d *display) json(ev engine.Event) {
	kind := "step"
	if ev.Input {
		kind = "input"
	}
	state := string(ev.State)
	if state == "" {
		state = "running"
	}
	m := map[string]any{"event": kind, "name": ev.Step, "state": state, "finished": d.done, "of": d.total}
	if ev.Absent {
		m["absent"] = true
	}
	if ev.State == "" && ev.Total > 0 {
		if left, ok := d.left(ev); ok {
			m["seconds_left"] = left.Seconds()
		}
	}
	if ev.Where != "" {
		m["where"] = ev.Where
	}
	if ev.Why != "" {
		m["why"] = ev.Why
	}
	if ev.Err != "" {
		m["error"] = ev.Err
	}
	if ev.Total > 0 {
		m["elements_done"], m["elements"] = ev.Done, ev.Total
	}
	if ev.Took > 0 {
		m["seconds"] = ev.Took.Seconds()
	}
	writeJSON(d.app.stdout, m)
}

// finish shows how the run ended and where its files are.
func (d *display) finish(doc reports.Document, written outputs) {
	if d.opts.json {
		writeJSON(d.app.stdout, map[string]any{"event": "end", "outcome": doc.Outcome, "report": written.report, "files": written.names(),
			"checks_passed": written.passed, "checks_failed": len(written.failed), "seconds": doc.Ended.Sub(doc.Started).Seconds(), "notes": written.notes})
		return
	}
	for _, n := range written.notes {
		fmt.Fprintln(d.app.stderr, "note: "+n)
	}
	for _, c := range written.failed {
		fmt.Fprintf(d.app.stderr, "check failed: %s\n", c)
	}
	if d.opts.quiet {
		return
	}
	fmt.Fprintln(d.app.stdout)
	for _, h := range reports.Headlines(doc) {
		line := fmt.Sprintf("%-22s %s", h.Label, h.Value)
		if h.Note != "" {
			line += "  (" + h.Note + ")"
		}
		fmt.Fprintln(d.app.stdout, line)
	}
	fmt.Fprintf(d.app.stdout, "%-22s %d passed, %d failed\n", "checks", written.passed, len(written.failed))
	fmt.Fprintf(d.app.stdout, "%-22s %s, in %s\n", "run", doc.Outcome, doc.Ended.Sub(doc.Started).Round(10*time.Millisecond))
	fmt.Fprintf(d.app.stdout, "%-22s %s\n", "report", shortPath(written.report))
}

// again tells how the results came out that were asked for again.
func (d *display) again(names []string, outcome *engine.Outcome) {
	for _, name := range names {
		text := "the same bytes"
		if slices.Contains(outcome.Differs, name) {
			text = "other bytes: not reproducible"
		}
		if d.opts.json {
			writeJSON(d.app.stdout, map[string]any{"event": "again", "name": name, "same": text == "the same bytes"})
		} else if !d.opts.quiet {
			fmt.Fprintf(d.app.stdout, "%-22s %s\n", "again "+name, text)
		}
	}
}
