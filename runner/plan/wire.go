package plan

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"strconv"
	"strings"

	"rimlight/runner/diag"
	"rimlight/runner/program"
	"rimlight/runner/recipe"
)

// Options are what the command line adds to a recipe.
type Options struct {
	Dir string              // folder that the recipe's paths are relative to
	In  map[string][]string // files of inputs, replacing the recipe's
	Set map[string]string   // values of settings, replacing the recipe's
}

// An OptionError is a fault of the command line, not of the recipe.
type OptionError struct{ Text string }

// Error gives the text.
func (e *OptionError) Error() string { return e.Text }

// Wire connects a recipe's names with the steps' parameters. Faults of the
// recipe come back as diagnostics, faults of the options as an [OptionError].
func Wire(r *recipe.Recipe, steps []program.Step, o Options) (*Plan, diag.List, error) {
	w := wiring{plan: &Plan{Recipe: r}, names: map[string]source{}, options: o, later: map[string]source{}, reported: map[string]bool{}}
	if err := w.settings(); err != nil {
		return nil, nil, err
	}
	if err := w.inputs(); err != nil {
		return nil, nil, err
	}
	w.steps(steps)
	w.diags.Sort()
	return w.plan, w.diags, nil
}

// A source is where a name is made.
type source struct {
	kind   Source
	pos    diag.Pos
	index  int // of the input, setting or step
	result int
}

func (s source) describe() string {
	switch s.kind {
	case FromInput:
		return "an input"
	case FromSetting:
		return "a setting"
	}
	return "a result"
}

type wiring struct {
	plan    *Plan
	options Options
	names   map[string]source // made so far
	later   map[string]source // results of steps not reached yet
	diags   diag.List

	reported map[string]bool // settings already complained about
}

func (w *wiring) settings() error {
	known := make([]string, 0, len(w.plan.Recipe.Settings))
	for i, s := range w.plan.Recipe.Settings {
		p := Setting{Setting: s, InForce: s.Value}
		if text, ok := w.options.Set[s.Name]; ok {
			p.InForce, p.Given = recipe.Value{Text: strings.TrimSpace(text)}, true
		}
		w.plan.Settings = append(w.plan.Settings, p)
		if _, taken := w.names[s.Name]; !taken {
			w.names[s.Name] = source{kind: FromSetting, pos: s.Pos, index: i}
		}
		known = append(known, s.Name)
	}
	return unknownOption("--set", "setting", w.options.Set, known)
}

func (w *wiring) inputs() error {
	known := make([]string, 0, len(w.plan.Recipe.Inputs))
	given := map[string]string{}
	for n := range w.options.In {
		given[n] = ""
	}
	for i, in := range w.plan.Recipe.Inputs {
		p := Input{Input: in, Type: recipe.TypeOf(in.Layout)}
		for _, c := range w.plan.Recipe.Columns {
			if c.Input == "" || c.Input == in.Name {
				p.Columns = append(p.Columns, c)
			}
		}
		files, ok := w.options.In[in.Name]
		p.Given = ok
		if !ok {
			files = in.Files
		}
		for _, f := range files {
			if !ok && !filepath.IsAbs(f) {
				f = filepath.Join(w.options.Dir, filepath.FromSlash(f))
			}
			p.Paths = append(p.Paths, f)
		}
		if ok && len(files) == 1 && files[0] == "" {
			p.Paths = nil // "--in comparison=" takes an optional input away
		}
		p.Paths = withChannels(in.Layout, p.Paths)
		for _, f := range p.Paths {
			if err := readable(f); err != nil {
				if p.Given {
					return &OptionError{fmt.Sprintf("--in %s: %v", in.Name, err)}
				}
				w.diags.Add(in.FilePos, fmt.Sprintf("input %s: %v", in.Name, relative(err, w.options.Dir)),
					fmt.Sprintf("expected a file beside the recipe, or --in %s=PATH", in.Name), "")
			}
		}
		w.plan.Inputs = append(w.plan.Inputs, p)
		if _, taken := w.names[in.Name]; !taken {
			w.names[in.Name] = source{kind: FromInput, pos: in.Pos, index: i}
		}
		known = append(known, in.Name)
	}
	return unknownOption("--in", "input", given, known)
}

// withChannels adds the second file of a light-curve table in CSV, where only
// the first was named: visit.csv has its channel edges in visit.channels.csv.
func withChannels(layout string, paths []string) []string {
	if len(paths) != 1 || recipe.FilesOf(layout) < 2 {
		return paths
	}
	if ext := filepath.Ext(paths[0]); strings.EqualFold(ext, ".csv") {
		return append(paths, strings.TrimSuffix(paths[0], ext)+".channels"+ext)
	}
	return paths
}

func readable(path string) error {
	f, err := os.Open(path)
	if err != nil {
		if os.IsNotExist(err) {
			return fmt.Errorf("there is no file %s", path)
		}
		return err
	}
	defer f.Close()
	st, err := f.Stat()
	if err != nil {
		return err
	}
	if !st.Mode().IsRegular() {
		return fmt.Errorf("%s is not a regular file", path)
	}
	return nil
}

// relative takes the recipe's folder out of a message, so that it reads as the
// recipe does.
func relative(err error, dir string) string {
	if dir == "" {
		return err.Error()
	}
	return strings.ReplaceAll(err.Error(), filepath.Clean(dir)+string(filepath.Separator), "")
}

func unknownOption(flag, what string, given map[string]string, known []string) error {
	names := make([]string, 0, len(given))
	for n := range given {
		names = append(names, n)
	}
	sort.Strings(names)
	for _, n := range names {
		if !slices.Contains(known, n) {
			text := fmt.Sprintf("%s %s: the recipe has no %s of this name", flag, n, what)
			if len(known) > 0 {
				text += "; it has " + strings.Join(known, ", ")
			}
			if near := diag.Nearest(n, known); near != "" {
				text += "; nearest: " + near
			}
			return &OptionError{text}
		}
	}
	return nil
}

// block looks up which fence and section a line of code stands in.
func (w *wiring) block(line int) recipe.Block {
	for _, b := range w.plan.Recipe.Blocks {
		if line >= b.Line && line < b.Line+strings.Count(b.Code, "\n")+1 {
			return b
		}
	}
	return recipe.Block{}
}

func (w *wiring) steps(steps []program.Step) {
	for i, s := range steps {
		for j, r := range s.Results {
			if _, ok := w.later[r.Name]; !ok {
				w.later[r.Name] = source{FromResult, r.Pos, i, j}
			}
		}
	}
	for i, s := range steps {
		b := w.block(s.Pos.Line)
		p := Step{Step: s, Section: b.Section, Fence: b.Fence, Each: -1}
		w.plan.Steps = append(w.plan.Steps, p)
		step := &w.plan.Steps[i]
		needs := map[int]bool{}
		for _, param := range s.Params {
			arg, ok := w.arg(steps, i, step, param)
			if !ok {
				arg = Arg{Name: param.Name, Type: param.Type}
			}
			if arg.Source == FromResult || arg.Source == FromElement {
				needs[arg.Step] = true
			}
			if s.Each != nil && s.Each.Element == param.Name {
				step.Each = len(step.Args)
			}
			step.Args = append(step.Args, arg)
		}
		for n := range needs {
			step.Needs = append(step.Needs, n)
		}
		sort.Ints(step.Needs)
		for j, r := range s.Results {
			if first, taken := w.names[r.Name]; taken {
				w.diags.Add(r.Pos, fmt.Sprintf("the name %s is already taken by %s at line %d", r.Name, first.describe(), first.pos.Line),
					"expected a name of its own for each result: a name has one source", "")
				continue
			}
			w.names[r.Name] = source{FromResult, r.Pos, i, j}
		}
	}
}

// arg finds what fills a parameter.
func (w *wiring) arg(steps []program.Step, index int, step *Step, param program.Var) (Arg, bool) {
	arg := Arg{Name: param.Name, Type: param.Type}
	if strings.Contains(param.Type, "invalid type") {
		return arg, false // the type checker has said so
	}
	if e := step.Step.Each; e != nil && e.Element == param.Name {
		return w.element(steps, index, step, param)
	}
	switch param.Name {
	case "priors":
		return w.priors(step, param)
	case "seed":
		if param.Type != "uint64" {
			w.diags.Add(param.Pos, fmt.Sprintf("seed has type %s", param.Type), "expected uint64: the seed is derived from the step's key", "")
			return arg, false
		}
		arg.Source, arg.From = FromSeed, "the step's key"
		return arg, true
	}
	src, ok := w.names[param.Name]
	if !ok {
		w.unknown(steps, index, step.Name, param.Name, param.Pos)
		return arg, false
	}
	if src.pos.Line > step.Pos.Line {
		w.diags.Add(param.Pos, fmt.Sprintf("step %s uses %s, which stands below it, at line %d", step.Name, param.Name, src.pos.Line),
			"expected it above: a step uses only what stands above it", "")
		return arg, false
	}
	arg.Source = src.kind
	switch src.kind {
	case FromSetting:
		s := w.plan.Settings[src.index]
		arg.From = s.Name
		v, err := s.InForce.As(param.Type)
		if err != nil {
			pos := s.ValuePos
			if s.Given {
				w.diags.Add(param.Pos, fmt.Sprintf("--set %s=%s: %v", s.Name, s.InForce.Text, err),
					fmt.Sprintf("parameter %s of step %s has type %s", param.Name, step.Name, param.Type), "")
				return arg, false
			}
			if w.reported[s.Name] {
				return arg, false
			}
			w.reported[s.Name] = true
			w.diags.Add(pos, fmt.Sprintf("setting %s: %v", s.Name, err),
				fmt.Sprintf("parameter %s of step %s, at line %d, has type %s", param.Name, step.Name, param.Pos.Line, short(param.Type)), "")
			return arg, false
		}
		arg.Value = v
		return arg, true
	case FromInput:
		in := w.plan.Inputs[src.index]
		arg.Input, arg.From = src.index, in.Name
		if in.Type != "" && in.Type != param.Type {
			w.mismatch(param, step.Name, "input "+in.Name+" ("+in.Layout+")", in.Type)
			return arg, false
		}
		return arg, true
	}
	arg.Step, arg.Result, arg.From = src.index, src.result, w.plan.Steps[src.index].Name
	if typ := w.plan.Steps[src.index].ResultType(src.result); typ != param.Type {
		w.mismatch(param, step.Name, "the result of step "+arg.From, typ)
		return arg, false
	}
	return arg, true
}

func (w *wiring) element(steps []program.Step, index int, step *Step, param program.Var) (Arg, bool) {
	arg := Arg{Name: param.Name, Type: param.Type, Source: FromElement}
	e := step.Step.Each
	src, ok := w.names[e.Collection]
	if !ok {
		w.unknown(steps, index, step.Name, e.Collection, e.Pos)
		return arg, false
	}
	if src.kind != FromResult {
		w.diags.Add(e.Pos, fmt.Sprintf("%s is %s", e.Collection, src.describe()), "expected the result of an earlier step, a slice", "")
		return arg, false
	}
	arg.Step, arg.Result, arg.From = src.index, src.result, w.plan.Steps[src.index].Name
	typ := w.plan.Steps[src.index].ResultType(src.result)
	elem, isSlice := strings.CutPrefix(typ, "[]")
	if !isSlice {
		w.diags.Add(e.Pos, fmt.Sprintf("%s is a %s", e.Collection, short(typ)), "expected a slice to run the step over", "")
		return arg, false
	}
	if elem != param.Type {
		w.mismatch(param, step.Name, "an element of "+e.Collection, elem)
		return arg, false
	}
	return arg, true
}

func (w *wiring) priors(step *Step, param program.Var) (Arg, bool) {
	arg := Arg{Name: param.Name, Type: param.Type, Source: FromPriors}
	if param.Type != "rimlight/steps/fit.Priors" {
		w.diags.Add(param.Pos, fmt.Sprintf("priors has type %s", short(param.Type)), "expected fit.Priors", "")
		return arg, false
	}
	sec := w.plan.Recipe.Sections[step.Section]
	arg.From = sec.Heading
	if sec.Priors == nil {
		w.diags.Add(param.Pos, fmt.Sprintf("step %s takes priors, but its section %s has no parameter table", step.Name, strconv.Quote(sec.Heading)),
			"expected a table with the columns parameter, prior, unit, about in the same section", "")
		return arg, false
	}
	priors, diags := recipe.Resolve(sec.Priors, func(name string) (float64, bool) {
		for _, s := range w.plan.Settings {
			if s.Name == name {
				v, err := s.InForce.As("float64")
				if err != nil {
					return 0, false
				}
				return v.(float64), true
			}
		}
		return 0, false
	})
	if len(diags) > 0 {
		w.diags = append(w.diags, diags...)
		return arg, false
	}
	arg.Value = priors
	return arg, true
}

// unknown reports a name without a source above the step.
func (w *wiring) unknown(steps []program.Step, index int, step, name string, pos diag.Pos) {
	if src, ok := w.later[name]; ok {
		maker := steps[src.index].Name
		if src.index == index {
			w.diags.Add(pos, fmt.Sprintf("step %s uses its own result %s: a cycle", step, name), "expected an input, a setting or an earlier result", "")
			return
		}
		if reaches(steps, src.index, index) {
			w.diags.Add(pos, fmt.Sprintf("steps %s and %s use each other's results: a cycle, through %s", step, maker, name),
				"expected each step to use only what stands above it", "")
			return
		}
		w.diags.Add(pos, fmt.Sprintf("step %s uses %s, which step %s makes below it, at line %d", step, name, maker, src.pos.Line),
			"expected it above: a step uses only what stands above it", "")
		return
	}
	known := make([]string, 0, len(w.names)+1)
	for n := range w.names {
		known = append(known, n)
	}
	sort.Strings(known)
	w.diags.Add(pos, fmt.Sprintf("nothing is called %s", name), "expected the name of an input, a setting or an earlier result", diag.Nearest(name, known))
}

// reaches reports whether step from uses, directly or not, a result of step to.
func reaches(steps []program.Step, from, to int) bool {
	maker := map[string]int{}
	for i, s := range steps {
		for _, r := range s.Results {
			maker[r.Name] = i
		}
	}
	seen := make([]bool, len(steps))
	var visit func(i int) bool
	visit = func(i int) bool {
		if i == to {
			return true
		}
		if seen[i] {
			return false
		}
		seen[i] = true
		for _, p := range steps[i].Params {
			name := p.Name
			if e := steps[i].Each; e != nil && e.Element == name {
				name = e.Collection
			}
			if m, ok := maker[name]; ok && visit(m) {
				return true
			}
		}
		return false
	}
	return visit(from)
}

func (w *wiring) mismatch(param program.Var, step, what, typ string) {
	w.diags.Add(param.Pos, fmt.Sprintf("parameter %s of step %s has type %s, but %s is a %s", param.Name, step, short(param.Type), what, short(typ)),
		"expected the same type on both sides", "")
}

// short drops the folders of import paths from a type, as code writes it.
func short(typ string) string {
	return strings.ReplaceAll(typ, "rimlight/steps/", "")
}
