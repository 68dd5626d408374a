package worker

import (
	"encoding/binary"
	"encoding/json"
	"fmt"
	"io"

	"rimlight/runner/program"
)

// A Message is one frame of the protocol: a kind, a small head in JSON, and
// bytes that travel unchanged.
type Message struct {
	Kind string
	Head []byte
	Body []byte
}

// Limits on what one frame may claim, so that a damaged or hostile peer can't
// make the reader allocate at will.
const (
	maxKind = 32
	maxHead = 64 << 20
	maxBody = 1 << 20
)

// Write sends m: the lengths of its parts, each a big-endian integer, then the
// parts.
func (m Message) Write(w io.Writer) error {
	var n [9 + maxKind]byte
	n[0] = byte(len(m.Kind))
	binary.BigEndian.PutUint32(n[1:], uint32(len(m.Head)))
	binary.BigEndian.PutUint32(n[5:], uint32(len(m.Body)))
	for _, part := range [][]byte{n[:9+copy(n[9:], m.Kind)], m.Head, m.Body} {
		if _, err := w.Write(part); err != nil {
			return err
		}
	}
	return nil
}

// ReadMessage receives a frame. One that claims too much is refused before
// anything is allocated for it. At the end of the stream, between frames, the
// error is io.EOF.
func ReadMessage(r io.Reader) (Message, error) { return readMessage(r, nil) }

// readMessage is ReadMessage into a body of which the memory may be used.
func readMessage(r io.Reader, body []byte) (Message, error) {
	var fixed [9 + maxKind]byte
	if _, err := io.ReadFull(r, fixed[:1]); err != nil {
		return Message{}, err
	}
	if _, err := io.ReadFull(r, fixed[1:9]); err != nil {
		return Message{}, unexpected(err)
	}
	kind, head, size := int(fixed[0]), binary.BigEndian.Uint32(fixed[1:]), binary.BigEndian.Uint32(fixed[5:])
	if kind > maxKind || head > maxHead || size > maxBody {
		return Message{}, fmt.Errorf("malformed frame: kind of %d bytes, head of %d bytes, body of %d bytes", kind, head, size)
	}
	if _, err := io.ReadFull(r, fixed[9:9+kind]); err != nil {
		return Message{}, unexpected(err)
	}
	m := Message{Kind: string(fixed[9 : 9+kind])}
	var err error
	if m.Head, err = readSome(r, int(head)); err != nil {
		return Message{}, err
	}
	if m.Body = body[:0]; cap(body) < int(size) {
		m.Body = make([]byte, 0, size)
	}
	m.Body = m.Body[:size]
	_, err = io.ReadFull(r, m.Body)
	return m, unexpected(err)
}

// readSome reads exactly n bytes, growing as they arrive, so that a length
// alone costs no memory.
func readSome(r io.Reader, n int) ([]byte, error) {
	const step = 1 << 20
	b := make([]byte, 0, min(n, step))
	for len(b) < n {
		at := len(b)
		b = append(b, make([]byte, min(n-at, max(step, at)))...)
		if _, err := io.ReadFull(r, b[at:]); err != nil {
			return nil, unexpected(err)
		}
	}
	return b, nil
}

func unexpected(err error) error {
	if err == io.EOF {
		return io.ErrUnexpectedEOF
	}
	return err
}

// message builds a frame with v, as JSON, for its head.
func message(kind string, v any) (Message, error) {
	head, err := json.Marshal(v)
	if err != nil {
		return Message{}, err
	}
	return Message{Kind: kind, Head: head}, nil
}

// Kinds of question and answer.
const (
	askLimits = "limits" // the first question, and only the first
	askCheck  = "check"
	askLoad   = "load"
	askCall   = "call"
	askRead   = "read"
	answer    = "answer"
	refusal   = "refusal" // the question itself could not be served
	more      = "more"    // a part of an argument or result, of which another follows
	last      = "last"    // the last part
)

// Code is the Go code of a recipe: its text with everything else blanked, as
// [recipe.Recipe.Code] gives it, and the lines that its blocks take up.
type Code struct {
	File   string
	Text   []byte
	Fences []program.Fence
}

// callHead is the question of a call. The arguments follow, each in its parts.
type callHead struct {
	Step string
	Args []argHead
}

type argHead struct {
	Limit int64 // bytes, at most
	Keep  bool  // for the next calls too
	Kept  bool  // from a call before: nothing follows
}

type readHead struct {
	Layout  string
	Names   []string // of the files, for messages
	Sizes   []int64
	Columns []columnHead
}

type columnHead struct {
	Role, HDU, Name, Unit string
	Offset                float64
}

// valuesHead is the answer to a call or a reading. The objects that the results
// consist of came before it, each in its parts.
type valuesHead struct {
	Failure *Failure
	Results []Result
	Log     string
	Nanos   int64
	SHA256  []string // of the files read
	Notes   []string
}
