package worker

import (
	"errors"
	"fmt"
	"io"
	"strings"
)

// An Arg is an argument of a call: a value in its envelope.
type Arg struct {
	Size   int64 // bytes, at most
	Common bool  // the same at every call of the worker; a small one is sent but once
	Write  func(w io.Writer) error
}

// Bytes is the argument that consists of the given bytes.
func Bytes(sealed []byte) Arg {
	return Arg{Size: int64(len(sealed)), Write: func(w io.Writer) error {
		_, err := w.Write(sealed)
		return err
	}}
}

// An ArgError says that an argument could not be written. The worker is of no
// use any more.
type ArgError struct {
	Arg int // number of the argument, from 0
	Err error
}

func (e *ArgError) Error() string { return e.Err.Error() }
func (e *ArgError) Unwrap() error { return e.Err }

// A Receiver takes the objects that results consist of, one after another. An
// error makes the call fail with it.
type Receiver interface {
	Part(b []byte) error // the next bytes of an object; they are not to be held on to
	End() error          // that was all of it
}

// A Result is a result of a step, or an input as read: what it is, and how many
// objects it consists of. Each is a value in its envelope.
//
// A slice of structures or texts, a list, comes in as many objects as it has
// elements; everything else in one.
type Result struct {
	Type    string
	Layout  string
	Objects int
}

// MaxElements is how many elements a list may have: each of them is an object.
const MaxElements = 100000

// IsList reports whether values of the layout come in an object for each
// element.
func IsList(layout string) bool {
	elem, ok := strings.CutPrefix(layout, "[]")
	return ok && (strings.HasPrefix(elem, "struct") || elem == "string")
}

// A partWriter sends values in parts.
type partWriter struct {
	w    io.Writer
	left int64 // bytes that may yet be sent
	buf  []byte
	err  error // of w
}

const partSize = 256 << 10

var errTooMuch = errors.New("too many bytes")

func (p *partWriter) Write(b []byte) (int, error) {
	n := len(b)
	if p.left -= int64(n); p.left < 0 {
		return 0, errTooMuch
	}
	for len(b) > 0 {
		if len(p.buf) == partSize {
			if err := p.send(more, p.buf); err != nil {
				return 0, err
			}
			p.buf = p.buf[:0]
		}
		k := min(len(b), partSize-len(p.buf))
		p.buf = append(p.buf, b[:k]...)
		b = b[k:]
	}
	return n, nil
}

// end sends what is left as the last part.
func (p *partWriter) end() error {
	err := p.send(last, p.buf)
	p.buf = p.buf[:0]
	return err
}

func (p *partWriter) send(kind string, body []byte) error {
	if p.err == nil {
		p.err = Message{Kind: kind, Body: body}.Write(p.w)
	}
	return p.err
}

// A partReader reads bytes that come in parts, up to the end of the last one.
type partReader struct {
	r    io.Reader
	body []byte // memory for parts
	part []byte // what has not been read of the part that came
	done bool   // it was the last
	err  error
}

func (p *partReader) Read(b []byte) (int, error) {
	for len(p.part) == 0 {
		if p.err != nil {
			return 0, p.err
		}
		if p.done {
			return 0, io.EOF
		}
		m, err := readMessage(p.r, p.body)
		switch {
		case err != nil:
			p.err = unexpected(err)
		case m.Kind != more && m.Kind != last:
			p.err = fmt.Errorf("%q where a part of a value was expected", m.Kind)
		}
		p.part, p.body, p.done = m.Body, m.Body, m.Kind == last
	}
	n := copy(b, p.part)
	p.part = p.part[n:]
	return n, nil
}

// next makes p ready for the next value. What was not read of this one is
// skipped.
func (p *partReader) next() error {
	_, err := io.Copy(io.Discard, p)
	p.done = false
	return err
}
