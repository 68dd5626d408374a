package worker

import (
	"bytes"
	"errors"
	"io"
	"math"
	"reflect"
	"strings"
	"testing"
)

// TestParts sends values of many sizes and holds that each comes back whole,
// also when the one before it was not read to its end.
func TestParts(t *testing.T) {
	var pipe bytes.Buffer
	w := partWriter{w: &pipe, left: math.MaxInt64}
	r := partReader{r: &pipe}
	for _, n := range []int{0, 1, partSize - 1, partSize, partSize + 1, 3*partSize + 5} {
		want := bytes.Repeat([]byte("x1234567"), n/8+1)[:n]
		for _, read := range []int{n, n / 2} {
			for rest := want; len(rest) > 0; {
				k := min(len(rest), 100_001)
				if _, err := w.Write(rest[:k]); err != nil {
					t.Fatal(err)
				}
				rest = rest[k:]
			}
			if err := w.end(); err != nil {
				t.Fatal(err)
			}
			got := make([]byte, read)
			if _, err := io.ReadFull(&r, got); err != nil || !bytes.Equal(got, want[:read]) {
				t.Errorf("%d of %d bytes: %v", read, n, err)
			}
			if err := r.next(); err != nil {
				t.Errorf("%d bytes: %v", n, err)
			}
		}
	}
	if pipe.Len() > 0 {
		t.Errorf("%d bytes are left", pipe.Len())
	}
	full := partWriter{w: &pipe, left: 10}
	if _, err := full.Write(make([]byte, 11)); err != errTooMuch {
		t.Errorf("11 of 10 bytes: %v", err)
	}
}

func TestPartsCutShort(t *testing.T) {
	var pipe bytes.Buffer
	Message{Kind: more, Body: []byte("beginning")}.Write(&pipe)
	r := partReader{r: &pipe}
	if b, err := io.ReadAll(&r); err != io.ErrUnexpectedEOF || string(b) != "beginning" {
		t.Errorf("%q, %v", b, err)
	}
	Message{Kind: answer}.Write(&pipe)
	r = partReader{r: &pipe}
	if _, err := io.ReadAll(&r); err == nil || !strings.Contains(err.Error(), `"answer" where a part`) {
		t.Error(err)
	}
}

const lists = `
func Lines(count float64) (lines []string, total float64) {
	for i := 0; i < int(count); i++ {
		lines = append(lines, "line")
	}
	total = float64(len(lines))
	return
}

func Add(common []float64, x float64) (sum float64) {
	sum = x
	for i := range common {
		sum += common[i]
		common[i] = 0
	}
	return
}

func Broken(x float64) (text string, err error) {
	text = "\xff"
	return
}
`

func lister(t *testing.T) *Worker {
	w := begin(t, Options{})
	if err := w.Load(code(lists)); err != nil {
		t.Fatal(err)
	}
	return w
}

// TestLists holds that a list comes in an object for each element.
func TestLists(t *testing.T) {
	w := lister(t)
	got, v, err := call(w, "Lines", Bytes(sealed(t, "float64", 3.0)))
	if err != nil {
		t.Fatal(err)
	}
	line, total := sealed(t, "string", "line"), sealed(t, "float64", 3.0)
	if want := [][]byte{line, line, line, total}; !reflect.DeepEqual(got, want) {
		t.Errorf("got %q", got)
	}
	if want := []Result{{"[]string", "[]string", 3}, {"float64", "float64", 1}}; !reflect.DeepEqual(v.Results, want) {
		t.Errorf("got %+v", v.Results)
	}
	if _, v, err := call(w, "Lines", Bytes(sealed(t, "float64", 0.0))); err != nil || v.Results[0] != (Result{"[]string", "[]string", 0}) {
		t.Errorf("none: %+v, %v", v.Results, err)
	}
	var failed *Failure
	if _, _, err := call(w, "Lines", Bytes(sealed(t, "float64", MaxElements+1.0))); !errors.As(err, &failed) || !strings.Contains(err.Error(), "a slice of 100001 elements") {
		t.Errorf("too many: %v", err)
	}
	if _, _, err := call(w, "Broken", Bytes(sealed(t, "float64", 0.0))); !errors.As(err, &failed) || !strings.Contains(err.Error(), "not valid UTF-8") {
		t.Errorf("no text: %v", err)
	}
	if _, _, err := call(w, "Lines", Bytes(sealed(t, "float64", 1.0))); err != nil {
		t.Errorf("after failures: %v", err)
	}
}

// TestCommon holds that a common argument is written once and decoded afresh
// for each call, and that a large one is written each time.
func TestCommon(t *testing.T) {
	w := lister(t)
	for _, size := range []int{10, maxKept / 8} {
		list := make([]float64, size)
		list[0] = 5
		b := sealed(t, "[]float64", list)
		written := 0
		common := Arg{Size: int64(len(b)), Common: true, Write: func(w io.Writer) error {
			written++
			_, err := w.Write(b)
			return err
		}}
		for x := range 3 {
			got, _, err := call(w, "Add", common, Bytes(sealed(t, "float64", float64(x))))
			if err != nil {
				t.Fatal(err)
			}
			if want := sealed(t, "float64", float64(5+x)); !bytes.Equal(got[0], want) {
				t.Errorf("call %d: got %x, want %x", x, got[0], want)
			}
		}
		if want := map[bool]int{true: 1, false: 3}[size == 10]; written != want {
			t.Errorf("%d numbers were written %d times, expected %d", size, written, want)
		}
		w.Close()
		w = lister(t)
	}
}

// TestArgError holds that an argument that turns out to be damaged on the way
// ends the worker, not the step.
func TestArgError(t *testing.T) {
	w := lister(t)
	damage := errors.New("damaged")
	bad := Arg{Size: 1 << 20, Write: func(w io.Writer) error {
		w.Write(make([]byte, 1<<20))
		return damage
	}}
	_, _, err := call(w, "Add", Bytes(sealed(t, "[]float64", []float64{1})), bad)
	var arg *ArgError
	if !errors.As(err, &arg) || arg.Arg != 1 || arg.Err != damage {
		t.Errorf("got %v", err)
	}
	select {
	case <-w.done:
	default:
		t.Error("the worker is still there")
	}
}

// full is a receiver without room.
type full struct{ err error }

func (f full) Part([]byte) error { return f.err }
func (f full) End() error        { return f.err }

func TestReceiverError(t *testing.T) {
	w := lister(t)
	disk := errors.New("the disk is full")
	if _, err := w.Call("Lines", []Arg{Bytes(sealed(t, "float64", 3.0))}, full{disk}); err != disk {
		t.Errorf("got %v", err)
	}
}

// TestRefusedArguments holds that the worker goes on after arguments that do
// not fit.
func TestRefusedArguments(t *testing.T) {
	w := lister(t)
	x := Bytes(sealed(t, "float64", 1.0))
	for _, args := range [][]Arg{{x}, {x, x}, {Bytes([]byte("nonsense")), x}, {x, x, x}} {
		if _, _, err := call(w, "Add", args...); err == nil || !strings.Contains(err.Error(), "step Add") {
			t.Errorf("%d arguments: %v", len(args), err)
		}
	}
	if _, _, err := call(w, "Lines", x); err != nil {
		t.Error(err)
	}
}
