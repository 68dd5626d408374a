package program

import (
	"bytes"
	"fmt"
	"reflect"
	"regexp"
	"strconv"
	"strings"
	"testing/fstest"

	"github.com/traefik/yaegi/interp"

	"rimlight/runner/diag"
	"rimlight/runner/program/symbols"
)

// maxSaid bounds what is kept of the interpreter's own messages.
const maxSaid = 4096

// A Machine is a compiled recipe with an interpreter of its own. It is not safe
// for concurrent use. Steps keep no state in it.
type Machine struct {
	program *Program
	file    string
	funcs   map[string]reflect.Value
	at      map[string]diag.Pos // of each step
	said    *head
}

// A StepError is an error that a step returned.
type StepError struct {
	Step string
	Pos  diag.Pos // of the step
	Text string
}

func (e *StepError) Error() string { return fmt.Sprintf("%s: step %s: %s", e.Pos, e.Step, e.Text) }

// A PanicError is a panic in a step. Pos is the statement of the recipe in which
// it arose, or the beginning of the function when that cannot be found out, or
// the file as a whole.
type PanicError struct {
	Step string
	Pos  diag.Pos
	Text string
}

func (e *PanicError) Error() string {
	return fmt.Sprintf("%s: step %s panicked: %s", e.Pos, e.Step, e.Text)
}

// Compile makes a new interpreter and gives it the checked tree. The
// interpreter sees no environment, no files and no standard streams.
func (p *Program) Compile() (*Machine, error) { return p.compile(nil) }

// compile is Compile with further symbols.
func (p *Program) compile(more map[string]map[string]reflect.Value) (m *Machine, err error) {
	defer func() {
		if r := recover(); r != nil {
			m, err = nil, fmt.Errorf("%s: the interpreter cannot compile the recipe: %v", p.file, r)
		}
	}()
	if p.tree == nil {
		return nil, fmt.Errorf("%s: the recipe has faults and cannot be compiled", p.file)
	}
	said := &head{}
	i := interp.New(interp.Options{
		Stdin:                strings.NewReader(""),
		Stdout:               said,
		Stderr:               said,
		Args:                 []string{},
		Env:                  []string{},
		SourcecodeFilesystem: fstest.MapFS{},
	})
	if err := i.Use(symbols.Table); err != nil {
		return nil, err
	}
	if err := i.Use(more); err != nil {
		return nil, err
	}
	// The tree's positions hold in the interpreter's file set too when the file
	// is entered there at the same place.
	i.FileSet().AddFile(p.file, int(p.tree.FileStart), len(p.src)).SetLinesForContent(p.src)
	compiled, err := i.CompileAST(p.tree)
	if err != nil {
		return nil, fmt.Errorf("the interpreter cannot compile the recipe: %w", err)
	}
	if _, err := i.Execute(compiled); err != nil {
		return nil, fmt.Errorf("%s: the interpreter cannot load the recipe: %w", p.file, err)
	}
	m = &Machine{program: p, file: p.file, funcs: map[string]reflect.Value{}, at: map[string]diag.Pos{}, said: said}
	exported := i.Symbols("main")["main"]
	for _, s := range p.Steps {
		fn, ok := exported[s.Name]
		if !ok || fn.Kind() != reflect.Func {
			return nil, fmt.Errorf("%s: step %s is lost in the interpreter", s.Pos, s.Name)
		}
		m.funcs[s.Name] = fn
		m.at[s.Name] = s.Pos
	}
	return m, nil
}

// Signature gives the type of a step's function: parameters and results, with
// the error last where the step has one. A struct type that the recipe declares
// appears without its name.
func (m *Machine) Signature(step string) (reflect.Type, error) {
	fn, ok := m.funcs[step]
	if !ok {
		return nil, m.noStep(step)
	}
	return fn.Type(), nil
}

func (m *Machine) noStep(step string) error {
	var names []string
	for n := range m.funcs {
		names = append(names, n)
	}
	text := fmt.Sprintf("%s: there is no step %s", m.file, step)
	if near := diag.Nearest(step, names); near != "" {
		text += "; nearest known name: " + near
	}
	return fmt.Errorf("%s", text)
}

// Call runs a step. Arguments must have the types of its [Machine.Signature];
// the step may change what they point to. An error that the step returns is a
// [*StepError], a panic in it a [*PanicError]; the step is then run a second
// time, to find the place.
func (m *Machine) Call(step string, args []reflect.Value) ([]reflect.Value, error) {
	results, err := m.call(step, args)
	if p, ok := err.(*PanicError); ok {
		p.Pos = m.locate(step, args, p.Text, p.Pos)
	}
	return results, err
}

func (m *Machine) call(step string, args []reflect.Value) (results []reflect.Value, err error) {
	fn, ok := m.funcs[step]
	if !ok {
		return nil, m.noStep(step)
	}
	t := fn.Type()
	if len(args) != t.NumIn() {
		return nil, fmt.Errorf("step %s takes %d arguments, not %d", step, t.NumIn(), len(args))
	}
	for i, a := range args {
		if !a.IsValid() {
			return nil, fmt.Errorf("argument %d of step %s is missing", i+1, step)
		}
		if !a.Type().AssignableTo(t.In(i)) {
			return nil, fmt.Errorf("argument %d of step %s is a %v, not a %v", i+1, step, a.Type(), t.In(i))
		}
	}
	m.said.reset()
	defer func() {
		if r := recover(); r != nil {
			results = nil
			err = &PanicError{step, m.place(), panicText(r)}
		}
	}()
	results = fn.Call(args)
	if n := t.NumOut(); n > 0 && t.Out(n-1) == reflect.TypeFor[error]() {
		failed := results[n-1]
		results = results[:n-1]
		if !failed.IsNil() {
			return nil, &StepError{Step: step, Pos: m.at[step], Text: failed.Interface().(error).Error()}
		}
	}
	return results, nil
}

// panicText describes a panic value without calling methods that the recipe
// could have given it.
func panicText(r any) string {
	if v, ok := r.(reflect.Value); ok {
		if !v.IsValid() {
			return "nil"
		}
		if v.CanInterface() {
			r = v.Interface()
		}
	}
	switch r := r.(type) {
	case string:
		return r
	case error:
		return r.Error()
	}
	return fmt.Sprint(r)
}

var placeText = regexp.MustCompile(`(?m)^(?:.*:)?(\d+):(\d+): panic`)

// place finds the innermost position in what the interpreter said while it
// unwound.
func (m *Machine) place() diag.Pos {
	pos := diag.Pos{File: m.file}
	if found := placeText.FindSubmatch(m.said.Bytes()); found != nil {
		line, err1 := strconv.Atoi(string(found[1]))
		col, err2 := strconv.Atoi(string(found[2]))
		if err1 == nil && err2 == nil && line > 1 {
			pos.Line, pos.Col = line, col
		}
	}
	return pos
}

// A head keeps the first bytes written to it.
type head struct{ bytes.Buffer }

func (h *head) Write(p []byte) (int, error) {
	if room := maxSaid - h.Len(); room > 0 {
		h.Buffer.Write(p[:min(room, len(p))])
	}
	return len(p), nil
}

func (h *head) reset() { h.Buffer.Reset() }
