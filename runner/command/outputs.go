package command

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"sync"
	"time"

	"rimlight/reports"
	"rimlight/runner/engine"
	"rimlight/runner/plan"
	"rimlight/runner/record"
	"rimlight/steps/check"
	"rimlight/steps/spectrum"
)

// Names of the files that a run writes.
const (
	reportFile = "report.html"
	csvFile    = "spectrum.csv"
	ecsvFile   = "spectrum.ecsv"
	recordFile = "run.json"
)

// outputs are the files that a run wrote, and what its checks said.
type outputs struct {
	report string
	files  []record.File
	passed int
	failed []string
	notes  []string
}

func (o outputs) names() []string {
	var out []string
	for _, f := range o.files {
		out = append(out, f.Name)
	}
	return out
}

// writeOutputs writes report, tables and record into dir. Each file is
// complete or not there, and files of an earlier run that this one has no
// counterpart of are taken away, so that what lies together belongs together.
func writeOutputs(dir string, doc reports.Document, e *engine.Engine, outcome *engine.Outcome, before func() *record.Record) (outputs, error) {
	var out outputs
	out.notes = outcome.Notes
	passed, failed := checks(doc.Steps)
	out.passed = passed
	for _, c := range failed {
		out.failed = append(out.failed, describe(c))
	}
	var page bytes.Buffer
	var tables spectrumTables
	var pageErr, tablesErr error
	var both sync.WaitGroup
	both.Go(func() { pageErr = reports.Render(&page, doc) })
	both.Go(func() { tables, tablesErr = tablesOf(doc) })
	both.Wait()
	if tablesErr != nil {
		return out, fmt.Errorf("the spectrum could not be written: %w", tablesErr)
	}
	if pageErr != nil {
		return out, fmt.Errorf("the report could not be rendered: %w", pageErr)
	}
	files := []outFile{{csvFile, tables.csv}, {ecsvFile, tables.ecsv}, {reportFile, page.Bytes()}}
	for _, f := range files {
		if f.data != nil {
			out.files = append(out.files, f.identity())
		}
	}
	b, err := recordOf(doc, e, outcome, out.files, before).Bytes()
	if err != nil {
		return out, err
	}
	last := outFile{recordFile, b}
	if err := replaceFiles(dir, append(files, last)); err != nil {
		return out, err
	}
	out.report = filepath.Join(dir, reportFile)
	out.files = append(out.files, last.identity())
	// So that trimming the store spares what this report needs.
	if err := e.Store.Register(filepath.Join(dir, recordFile)); err != nil {
		out.notes = append(out.notes, fmt.Sprintf("the store will not know that this report needs it: %v", err))
	}
	return out, nil
}

func describe(c check.Check) string {
	return fmt.Sprintf("%s is %.4g%s, expected %s", c.Name, c.Value, spaced(c.Unit), c.Limit)
}

func spaced(unit string) string {
	if unit == "" {
		return ""
	}
	return " " + unit
}

// spectrumTables are the files of a spectrum; both nil when there is none.
type spectrumTables struct{ csv, ecsv []byte }

func tablesOf(doc reports.Document) (spectrumTables, error) {
	s, ok := lastSpectrum(doc)
	if !ok {
		return spectrumTables{}, nil
	}
	ecsv, err := spectrum.ECSV(s, []spectrum.Note{{Name: "title", Text: doc.Title}})
	return spectrumTables{spectrum.CSV(s), ecsv}, err
}

// lastSpectrum is the spectrum that the recipe ends in: the last result of
// that type.
func lastSpectrum(doc reports.Document) (spectrum.Spectrum, bool) {
	for i := len(doc.Steps) - 1; i >= 0; i-- {
		for j := len(doc.Steps[i].Results) - 1; j >= 0; j-- {
			if s, ok := doc.Steps[i].Results[j].Value.(spectrum.Spectrum); ok {
				return s, true
			}
		}
	}
	return spectrum.Spectrum{}, false
}

// recordOf is the content of run.json.
func recordOf(doc reports.Document, e *engine.Engine, outcome *engine.Outcome, files []record.File, before func() *record.Record) *record.Record {
	sum := sha256.Sum256(doc.Source)
	r := &record.Record{Format: record.Format, Title: doc.Title, Recipe: record.File{Name: doc.File, Size: int64(len(doc.Source)), SHA256: hex.EncodeToString(sum[:])},
		Outcome: string(doc.Outcome), Started: doc.Started, Ended: doc.Ended, Command: []string{doc.Command}, Outputs: files, Notes: outcome.Notes,
		Host:    record.Host{Name: machine(e.Host), OS: doc.Host.OS, Arch: doc.Host.Arch, CPUs: doc.Host.CPUs},
		Program: record.Program{Version: doc.Host.Version, Revision: doc.Host.Revision, SHA256: doc.Host.Executable, Go: doc.Host.GoVersion, Settings: doc.Host.Settings}}
	for _, l := range e.Confinement {
		r.Host.Confinement = append(r.Host.Confinement, record.Layer(l))
	}
	r.Limits = record.Limits{StepSeconds: e.Limits.StepTime.Seconds(), StepMemory: e.Limits.Memory}
	for _, m := range doc.Modules {
		r.Program.Modules = append(r.Program.Modules, record.Module(m))
	}
	for _, p := range doc.Library {
		r.Library = append(r.Library, record.Package(p))
	}
	for _, s := range doc.Settings {
		r.Settings = append(r.Settings, record.Setting{Name: s.Name, Value: s.Value, Unit: s.Unit, Changed: s.Changed})
	}
	for i, in := range outcome.Inputs {
		ri := record.Input{Name: in.Name, Layout: e.Plan.Inputs[i].Layout, Computation: computation(in.Computation, []string{in.Name})}
		for _, f := range doc.Inputs[i].Files {
			ri.Files = append(ri.Files, record.File(f))
		}
		if ri.KeyText == "" {
			ri.KeyText = before().KeyText(in.Name, -1)
		}
		r.Inputs = append(r.Inputs, ri)
	}
	for i, s := range outcome.Steps {
		var names []string
		for _, v := range e.Plan.Steps[i].Results {
			names = append(names, v.Name)
		}
		rs := record.Step{Name: s.Name, Computation: computation(s.Computation, names)}
		for n, el := range s.Elements {
			c := computation(el, names)
			if !el.Finished() {
				c = withEarlier(c, before().KeyText(s.Name, n))
			}
			rs.Elements = append(rs.Elements, c)
		}
		// What was not reached keeps the key of the run before, so that the
		// next run can still say what changed.
		if !s.Finished() {
			rs.Computation = withEarlier(rs.Computation, before().KeyText(s.Name, -1))
			if len(rs.Elements) == 0 {
				for n := 0; before().KeyText(s.Name, n) != ""; n++ {
					rs.Elements = append(rs.Elements, record.Computation{State: string(engine.NotReached), KeyText: before().KeyText(s.Name, n)})
				}
			}
		}
		r.Steps = append(r.Steps, rs)
	}
	for _, s := range doc.Steps {
		for _, c := range checksOf(s) {
			rc := record.Check{Step: s.Name, Name: c.Name, Unit: c.Unit, Limit: c.Limit, Passed: c.Passed}
			if !math.IsNaN(c.Value) && !math.IsInf(c.Value, 0) {
				rc.Value = &c.Value
			}
			r.Checks = append(r.Checks, rc)
		}
	}
	return r
}

// withEarlier puts the text of the key of the run before in the place of that of
// a computation which gave no result. A key that goes with the other text goes
// with it: nothing is kept under it.
func withEarlier(c record.Computation, text plan.KeyText) record.Computation {
	if c.KeyText = text; text != "" && text.Key().String() != c.Key {
		c.Key = ""
	}
	return c
}

// machine is where somebody computed: run.json goes out with the report, which
// need not tell who that was.
func machine(who string) string {
	_, host, ok := strings.Cut(who, "@")
	if !ok {
		return who
	}
	return host
}

func computation(c engine.Computation, names []string) record.Computation {
	out := record.Computation{State: string(c.State), Why: c.Why, Error: c.Err, KeyText: c.Text, Seed: c.Seed, Seconds: c.Took.Round(time.Microsecond).Seconds(), Host: machine(c.Host)}
	if c.Text != "" {
		out.Key = c.Text.Key().String()
	}
	if !c.When.IsZero() {
		out.When = &c.When
	}
	for i, v := range c.Results {
		out.Results = append(out.Results, record.Result{Name: names[i], Type: v.Type, Hash: v.Hash.String(), Size: v.Size})
	}
	return out
}
