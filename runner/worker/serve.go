package worker

import (
	"bufio"
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
	"strings"
	"time"
	"unicode/utf8"

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

func serve(r io.Reader, w io.Writer) error {
	s := server{in: bufio.NewReaderSize(r, 64<<10), out: bufio.NewWriterSize(w, 64<<10)}
	for {
		q, err := ReadMessage(s.in)
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
		if err := a.Write(s.out); err != nil {
			return err
		}
		if err := s.out.Flush(); err != nil {
			return err
		}
	}
}

type server struct {
	in       *bufio.Reader
	out      *bufio.Writer
	confined bool
	results  int64          // bytes that the results of a step may have together
	kept     map[int][]byte // arguments that later calls get too, by their number
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
		TuneCollector(h.Memory)
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
		return s.call(h)
	case askRead:
		var h readHead
		if err := json.Unmarshal(q.Head, &h); err != nil {
			return Message{}, err
		}
		return s.read(h)
	}
	return Message{}, fmt.Errorf("unknown question %q", q.Kind)
}

// call decodes the arguments afresh, runs the step and encodes its results.
func (s *server) call(h callHead) (Message, error) {
	step, args, err := s.arguments(h)
	if err != nil {
		return Message{}, err
	}
	began := time.Now()
	results, err := s.machine.Call(h.Step, args)
	clear(args) // what is not needed any more is not to lie about while results are sent
	out := valuesHead{Nanos: int64(time.Since(began))}
	if err != nil {
		out.Failure = failure(err)
		return message(answer, out)
	}
	p := partWriter{w: s.out, left: s.results}
	for i, v := range results {
		results[i] = reflect.Value{}
		r, err := p.result(step.Results[i].Type, v)
		switch {
		case p.err != nil:
			return Message{}, p.err
		case errors.Is(err, errTooMuch):
			out.Failure = &Failure{Text: s.tooMuch("the results take"), Pos: step.Results[i].Pos}
			return message(answer, out)
		case err != nil:
			out.Failure = &Failure{Text: fmt.Sprintf("result %s cannot be kept: %v", step.Results[i].Name, err), Pos: step.Results[i].Pos}
			return message(answer, out)
		}
		out.Results = append(out.Results, r)
	}
	return message(answer, out)
}

// tooMuch says that results are too large.
func (s *server) tooMuch(what string) string {
	return fmt.Sprintf("%s more than %s, a quarter of --%s and four times what the step was given; return less, or raise it", what, Size(s.results), MemoryFlag)
}

// arguments finds a step and takes in what it is called with, all of it, also
// when something is wrong.
func (s *server) arguments(h callHead) (*program.Step, []reflect.Value, error) {
	var step *program.Step
	var sig reflect.Type
	err := errors.New("no recipe is loaded")
	if s.machine != nil {
		err = fmt.Errorf("the recipe has no step %s", h.Step)
		for i := range s.program.Steps {
			if s.program.Steps[i].Name == h.Step {
				step = &s.program.Steps[i]
				sig, err = s.machine.Signature(h.Step)
			}
		}
	}
	if err == nil && len(h.Args) != sig.NumIn() {
		err = fmt.Errorf("step %s takes %d arguments, got %d", h.Step, sig.NumIn(), len(h.Args))
	}
	args := make([]reflect.Value, len(h.Args))
	p := partReader{r: s.in}
	for i, a := range h.Args {
		if err == nil {
			args[i] = reflect.New(sig.In(i)).Elem()
			if err = s.argument(i, a, &p, args[i]); err != nil {
				err = fmt.Errorf("step %s, argument %s: %w", h.Step, step.Params[i].Name, err)
			}
		}
		if !a.Kept {
			if lost := p.next(); lost != nil {
				return nil, nil, lost
			}
		}
	}
	return step, args, err
}

// argument decodes an argument into v.
func (s *server) argument(i int, a argHead, p *partReader, v reflect.Value) error {
	if !a.Keep && !a.Kept {
		return canon.ReadSealed(p, a.Limit, v)
	}
	if a.Keep {
		b, err := io.ReadAll(io.LimitReader(p, a.Limit))
		if err != nil {
			return err
		}
		if s.kept == nil {
			s.kept = map[int][]byte{}
		}
		s.kept[i] = b
	}
	return canon.ReadSealed(bytes.NewReader(s.kept[i]), int64(len(s.kept[i])), v)
}

// result sends the objects that a value consists of.
func (p *partWriter) result(typ string, v reflect.Value) (Result, error) {
	layout, err := canon.Layout(v.Type())
	if err != nil {
		return Result{}, err
	}
	if !IsList(layout) {
		return Result{typ, layout, 1}, p.object(canon.Seal(typ, layout, nil), v)
	}
	elem := layout[len("[]"):]
	if v.Len() > MaxElements {
		return Result{}, fmt.Errorf("a slice of %d elements of type %s: a step runs over at most %d, and no longer slice of structures or texts is kept; use slices of numbers for mass data",
			v.Len(), elem, MaxElements)
	}
	head := canon.Seal(strings.TrimPrefix(typ, "[]"), elem, nil)
	for i := range v.Len() {
		if err := p.object(head, v.Index(i)); err != nil {
			return Result{}, fmt.Errorf("[%d]: %w", i, err)
		}
	}
	return Result{typ, layout, v.Len()}, nil
}

// object sends one object: the head of an envelope and what belongs in it.
func (p *partWriter) object(head []byte, v reflect.Value) error {
	if _, err := p.Write(head); err != nil {
		return err
	}
	if err := canon.WriteValue(p, v); err != nil {
		return err
	}
	return p.end()
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

// read reads the files at descriptors 3 and up.
func (s *server) read(h readHead) (Message, error) {
	began := time.Now()
	var out valuesHead
	files := make([]file, len(h.Sizes))
	for i, size := range h.Sizes {
		f := os.NewFile(uintptr(3+i), h.Names[i])
		if f == nil {
			return Message{}, fmt.Errorf("%s: the file was not handed over", h.Names[i])
		}
		defer f.Close()
		files[i] = file{f, size}
	}
	var columns lightcurve.Columns
	for _, c := range h.Columns {
		columns = append(columns, lightcurve.Column(c))
	}
	typ, value, notes, err := readLayout(h.Layout, columns, files)
	out.Notes = notes
	// The parent knows what the files held before; this is what they hold after.
	for i := 0; err == nil && i < len(files); i++ {
		sum := sha256.New()
		if _, err = io.Copy(sum, files[i].reader()); err != nil {
			err = fmt.Errorf("%s: %w", h.Names[i], err)
		}
		out.SHA256 = append(out.SHA256, hex.EncodeToString(sum.Sum(nil)))
	}
	out.Nanos = int64(time.Since(began))
	if err != nil {
		out.Failure = &Failure{Text: err.Error()}
		return message(answer, out)
	}
	p := partWriter{w: s.out, left: s.results}
	r, err := p.result(typ, reflect.ValueOf(value))
	switch {
	case p.err != nil:
		return Message{}, p.err
	case errors.Is(err, errTooMuch):
		out.Failure = &Failure{Text: s.tooMuch("what the files hold takes")}
	case err != nil:
		return Message{}, err
	}
	out.Results = []Result{r}
	return message(answer, out)
}

// A file is one to be read.
type file struct {
	io.ReaderAt
	size int64
}

func (f file) reader() io.Reader { return io.NewSectionReader(f, 0, f.size) }

func (f file) bytes() ([]byte, error) {
	b := make([]byte, f.size)
	_, err := io.ReadFull(f.reader(), b)
	return b, err
}

func readLayout(layout string, columns lightcurve.Columns, files []file) (typ string, value any, notes []string, err error) {
	if len(files) == 0 {
		return "", nil, nil, errors.New("no file to read")
	}
	first := files[0]
	one := func() error {
		if len(files) > 1 {
			return fmt.Errorf("%d files were given, expected one", len(files))
		}
		return nil
	}
	table := func(fromFITS func(io.ReaderAt, int64, lightcurve.Columns) (lightcurve.Cube, []string, error)) {
		typ = "rimlight/steps/lightcurve.Cube"
		if len(files) == 2 {
			value, notes, err = lightcurve.OpenCSV(first.reader(), files[1].reader(), columns)
		} else if err = one(); err == nil {
			value, notes, err = fromFITS(first, first.size, columns)
		}
	}
	switch layout {
	case "light-curve table":
		table(lightcurve.OpenFITS)
	case "comparison table":
		table(lightcurve.OpenFITSComparison)
	case "limb-darkening table", "intensity table", "throughput curve", "text":
		if err = one(); err != nil {
			return
		}
		var b []byte
		if b, err = first.bytes(); err != nil {
			return
		}
		switch layout {
		case "limb-darkening table":
			typ = "rimlight/steps/limbtable.Table"
			value, err = limbtable.Read(b)
		case "intensity table":
			typ = "rimlight/steps/limbtable.Intensities"
			value, err = limbtable.ReadIntensities(b)
		case "throughput curve":
			typ = "rimlight/steps/limbtable.Throughput"
			value, err = limbtable.ReadThroughput(b)
		case "text":
			typ = "string"
			if !utf8.Valid(b) {
				err = errors.New("the file is not text in UTF-8")
			}
			value = string(b)
		}
	default:
		err = fmt.Errorf("layout %q is not known", layout)
	}
	return
}
