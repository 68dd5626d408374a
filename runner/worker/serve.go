package worker

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"reflect"
	"runtime/debug"
	"time"

	"rimlight/runner/canon"
	"rimlight/runner/confine"
	"rimlight/runner/program"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limbtable"
)

// Requested reports whether this process was started as a worker.
func Requested() bool { return len(os.Args) == 1 && os.Args[0] == Name }

// Main serves questions until the parent closes the pipe, and returns the exit
// status of the process.
func Main() int {
	debug.SetTraceback("none")
	os.Clearenv()
	// Nothing that runs here may write into the stream of answers by chance.
	out := os.Stdout
	os.Stdout = os.Stderr
	if err := serve(os.Stdin, out); err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	return 0
}

// maxQuestion is how many bytes of arguments one question may hold.
const maxQuestion = 8 << 30

func serve(r io.Reader, w io.Writer) error {
	var s server
	for {
		q, err := ReadMessage(r, maxQuestion)
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return err
		}
		a, err := s.serve(q)
		if err != nil {
			if a, err = message(refusal, err.Error()); err != nil {
				return err
			}
		}
		if err := a.Write(w); err != nil {
			return err
		}
	}
}

type server struct {
	confined bool
	results  int64 // bytes that the results of a step may have together
	program  *program.Program
	machine  *program.Machine
}

func (s *server) serve(q Message) (Message, error) {
	if s.confined == (q.Kind == askLimits) {
		return Message{}, fmt.Errorf("question %q out of turn: limits come first, once", q.Kind)
	}
	switch q.Kind {
	case askLimits:
		var h limitsHead
		if err := json.Unmarshal(q.Head, &h); err != nil {
			return Message{}, err
		}
		report, err := confine.Enter(h.Limits)
		if err != nil {
			return Message{}, err
		}
		s.confined, s.results = true, h.Results
		return message(answer, report)
	case askCheck:
		var h Code
		if err := json.Unmarshal(q.Head, &h); err != nil {
			return Message{}, err
		}
		p, diags := program.Check(h.File, h.Text, h.Fences...)
		return message(answer, map[string]any{"Steps": p.Steps, "Diags": diags})
	case askLoad:
		var h Code
		if err := json.Unmarshal(q.Head, &h); err != nil {
			return Message{}, err
		}
		p, diags := program.Check(h.File, h.Text, h.Fences...)
		if err := diags.Err(); err != nil {
			return Message{}, err
		}
		m, err := p.Compile()
		if err != nil {
			return Message{}, err
		}
		s.program, s.machine = p, m
		return message(answer, nil)
	case askCall:
		var h callHead
		if err := json.Unmarshal(q.Head, &h); err != nil {
			return Message{}, err
		}
		return s.call(h.Step, q.Blobs)
	case askRead:
		var h readHead
		if err := json.Unmarshal(q.Head, &h); err != nil {
			return Message{}, err
		}
		return read(h)
	}
	return Message{}, fmt.Errorf("unknown question %q", q.Kind)
}

// call decodes the arguments afresh, runs the step and encodes its results.
func (s *server) call(name string, sealed [][]byte) (Message, error) {
	if s.machine == nil {
		return Message{}, errors.New("no recipe is loaded")
	}
	var step *program.Step
	for i := range s.program.Steps {
		if s.program.Steps[i].Name == name {
			step = &s.program.Steps[i]
		}
	}
	if step == nil {
		return Message{}, fmt.Errorf("the recipe has no step %s", name)
	}
	sig, err := s.machine.Signature(name)
	if err != nil {
		return Message{}, err
	}
	if len(sealed) != sig.NumIn() {
		return Message{}, fmt.Errorf("step %s takes %d arguments, got %d", name, sig.NumIn(), len(sealed))
	}
	args := make([]reflect.Value, len(sealed))
	for i, b := range sealed {
		if args[i], err = unseal(sig.In(i), b); err != nil {
			return Message{}, fmt.Errorf("step %s, argument %s: %w", name, step.Params[i].Name, err)
		}
	}
	began := time.Now()
	results, err := s.machine.Call(name, args)
	h := valuesHead{Nanos: int64(time.Since(began))}
	if err != nil {
		h.Failure = failure(err)
		return message(answer, h)
	}
	out := make([][]byte, len(results))
	size := int64(0)
	for i, v := range results {
		if out[i], err = seal(step.Results[i].Type, v); err != nil {
			h.Failure = &Failure{Text: fmt.Sprintf("result %s cannot be kept: %v", step.Results[i].Name, err), Pos: step.Results[i].Pos}
			return message(answer, h)
		}
		if size += int64(len(out[i])); size > s.results {
			h.Failure = &Failure{Text: fmt.Sprintf("the results take more than %s, a quarter of --%s; return less, or raise it", Size(s.results), MemoryFlag), Pos: step.Results[i].Pos}
			return message(answer, h)
		}
	}
	return message(answer, h, out...)
}

func failure(err error) *Failure {
	var stepErr *program.StepError
	var panicked *program.PanicError
	switch {
	case errors.As(err, &stepErr):
		return &Failure{Text: plain(stepErr.Text, maxText), Pos: stepErr.Pos}
	case errors.As(err, &panicked):
		return &Failure{Text: plain("step "+panicked.Step+" panicked: "+panicked.Text, maxText), Pos: panicked.Pos, Panic: true}
	}
	return &Failure{Text: plain(err.Error(), maxText)}
}

func seal(typ string, v reflect.Value) ([]byte, error) {
	layout, err := canon.Layout(v.Type())
	if err != nil {
		return nil, err
	}
	b, err := canon.MarshalValue(v)
	if err != nil {
		return nil, err
	}
	return canon.Seal(typ, layout, b), nil
}

func unseal(t reflect.Type, sealed []byte) (reflect.Value, error) {
	_, layout, b, err := canon.Open(sealed)
	if err != nil {
		return reflect.Value{}, err
	}
	want, err := canon.Layout(t)
	if err != nil {
		return reflect.Value{}, err
	}
	if layout != want {
		return reflect.Value{}, fmt.Errorf("the value has the layout %s, the parameter %s", layout, want)
	}
	v := reflect.New(t).Elem()
	return v, canon.UnmarshalValue(b, v)
}

// read reads the files at descriptors 3 and up.
func read(h readHead) (Message, error) {
	began := time.Now()
	var out valuesHead
	files := make([][]byte, len(h.Sizes))
	for i, size := range h.Sizes {
		f := os.NewFile(uintptr(3+i), h.Names[i])
		if f == nil {
			return Message{}, fmt.Errorf("%s: the file was not handed over", h.Names[i])
		}
		b := make([]byte, size)
		_, err := io.ReadFull(io.NewSectionReader(f, 0, size), b)
		f.Close()
		if err != nil {
			out.Failure = &Failure{Text: fmt.Sprintf("%s: %v", h.Names[i], err)}
			return message(answer, out)
		}
		sum := sha256.Sum256(b)
		out.SHA256 = append(out.SHA256, hex.EncodeToString(sum[:]))
		files[i] = b
	}
	var columns lightcurve.Columns
	for _, c := range h.Columns {
		columns = append(columns, lightcurve.Column(c))
	}
	typ, value, notes, err := readLayout(h.Layout, columns, files)
	out.Nanos = int64(time.Since(began))
	out.Notes = notes
	if err != nil {
		out.Failure = &Failure{Text: err.Error()}
		return message(answer, out)
	}
	b, err := seal(typ, reflect.ValueOf(value))
	if err != nil {
		return Message{}, err
	}
	return message(answer, out, b)
}

func readLayout(layout string, columns lightcurve.Columns, files [][]byte) (typ string, value any, notes []string, err error) {
	if len(files) == 0 {
		return "", nil, nil, errors.New("no file to read")
	}
	one := func() error {
		if len(files) > 1 {
			return fmt.Errorf("%d files were given, expected one", len(files))
		}
		return nil
	}
	switch layout {
	case "light-curve table":
		typ = "rimlight/steps/lightcurve.Cube"
		if len(files) == 2 {
			value, notes, err = lightcurve.ReadCSV(files[0], files[1], columns)
			return
		}
		if err = one(); err == nil {
			value, notes, err = lightcurve.ReadFITS(files[0], columns)
		}
	case "comparison table":
		typ = "rimlight/steps/lightcurve.Cube"
		if len(files) == 2 {
			value, notes, err = lightcurve.ReadCSV(files[0], files[1], columns)
			return
		}
		if err = one(); err == nil {
			value, notes, err = lightcurve.ReadFITSComparison(files[0], columns)
		}
	case "limb-darkening table":
		typ = "rimlight/steps/limbtable.Table"
		if err = one(); err == nil {
			value, err = limbtable.Read(files[0])
		}
	case "text":
		typ = "string"
		if err = one(); err == nil {
			if !bytes.Equal(files[0], bytes.ToValidUTF8(files[0], nil)) {
				err = errors.New("the file is not text in UTF-8")
			}
			value = string(files[0])
		}
	default:
		err = fmt.Errorf("layout %q is not known", layout)
	}
	return
}
