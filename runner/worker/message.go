package worker

import (
	"encoding/binary"
	"encoding/json"
	"fmt"
	"io"

	"rimlight/runner/program"
)

// A Message is one frame of the protocol: a kind, a small head in JSON, and
// any number of large byte strings that travel unchanged.
type Message struct {
	Kind  string
	Head  []byte
	Blobs [][]byte
}

// Limits on what one frame may claim, so that a damaged or hostile peer can't
// make the reader allocate at will.
const (
	maxKind  = 32
	maxHead  = 64 << 20
	maxBlobs = 1 << 20
)

// Write sends m: the lengths of its parts, each a big-endian integer, then the
// parts.
func (m Message) Write(w io.Writer) error {
	n := make([]byte, 0, 16+8*len(m.Blobs))
	n = append(n, byte(len(m.Kind)))
	n = binary.BigEndian.AppendUint32(n, uint32(len(m.Head)))
	n = binary.BigEndian.AppendUint32(n, uint32(len(m.Blobs)))
	for _, b := range m.Blobs {
		n = binary.BigEndian.AppendUint64(n, uint64(len(b)))
	}
	n = append(n, m.Kind...)
	for _, part := range append([][]byte{n, m.Head}, m.Blobs...) {
		if _, err := w.Write(part); err != nil {
			return err
		}
	}
	return nil
}

// ReadMessage receives a frame. The blobs together may hold at most limit
// bytes; a frame that claims more is refused before anything is allocated for
// it. At the end of the stream, between frames, the error is io.EOF.
func ReadMessage(r io.Reader, limit int64) (Message, error) {
	var fixed [9]byte
	if _, err := io.ReadFull(r, fixed[:1]); err != nil {
		return Message{}, err
	}
	if _, err := io.ReadFull(r, fixed[1:]); err != nil {
		return Message{}, unexpected(err)
	}
	kind, head, blobs := int(fixed[0]), binary.BigEndian.Uint32(fixed[1:]), binary.BigEndian.Uint32(fixed[5:])
	if kind > maxKind || head > maxHead || blobs > maxBlobs {
		return Message{}, fmt.Errorf("malformed frame: kind of %d bytes, head of %d bytes, %d blobs", kind, head, blobs)
	}
	lengths, err := readSome(r, 8*int64(blobs))
	if err != nil {
		return Message{}, err
	}
	var m Message
	k, err := readSome(r, int64(kind))
	if err != nil {
		return Message{}, err
	}
	m.Kind = string(k)
	if m.Head, err = readSome(r, int64(head)); err != nil {
		return Message{}, err
	}
	left := limit
	for i := range int(blobs) {
		n := binary.BigEndian.Uint64(lengths[8*i:])
		if n > uint64(left) {
			return Message{}, fmt.Errorf("frame %q is too large: more than the limit of %d bytes", m.Kind, limit)
		}
		left -= int64(n)
		b, err := readSome(r, int64(n))
		if err != nil {
			return Message{}, err
		}
		m.Blobs = append(m.Blobs, b)
	}
	return m, nil
}

// readSome reads exactly n bytes, growing as they arrive, so that a length
// alone costs no memory.
func readSome(r io.Reader, n int64) ([]byte, error) {
	const step = 8 << 20
	if n <= step {
		b := make([]byte, n)
		_, err := io.ReadFull(r, b)
		return b, unexpected(err)
	}
	b := make([]byte, 0, step)
	for int64(len(b)) < n {
		more := min(n-int64(len(b)), max(step, int64(len(b))))
		at := len(b)
		b = append(b, make([]byte, more)...)
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
func message(kind string, v any, blobs ...[]byte) (Message, error) {
	head, err := json.Marshal(v)
	if err != nil {
		return Message{}, err
	}
	return Message{kind, head, blobs}, nil
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
)

// Code is the Go code of a recipe: its text with everything else blanked, as
// [recipe.Recipe.Code] gives it, and the lines that its blocks take up.
type Code struct {
	File   string
	Text   []byte
	Fences []program.Fence
}

type callHead struct {
	Step string
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

type valuesHead struct {
	Failure *Failure
	Log     string
	Nanos   int64
	SHA256  []string // of the files read
	Notes   []string
}
