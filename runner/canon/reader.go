package canon

import (
	"encoding/binary"
	"io"
	"math"
	"unicode/utf8"
)

// A reader takes canonical items off the front of encoded bytes. These lie in
// data, all of them or, with a source, the next few.
type reader struct {
	data []byte
	src  io.Reader
	left int    // bytes that may yet come from the source
	buf  []byte // what data is a part of, with a source
	err  error  // of the source

	top *plan    // of the value, with fields to be passed over
	but []string // their names
}

// lookAhead is more than the longest head or name of a field takes.
const lookAhead = 2 * maxLayout

// readerOf gives a reader of at most limit bytes from a source.
func readerOf(src io.Reader, limit int64) *reader {
	limit = min(limit, math.MaxInt)
	return &reader{src: src, left: int(limit), buf: make([]byte, min(limit, piece))}
}

// fill sees to it that lookAhead bytes lie ready, or all that there are.
func (r *reader) fill() {
	if r.left > 0 && len(r.data) < lookAhead {
		r.refill()
	}
}

func (r *reader) refill() {
	n := copy(r.buf, r.data)
	for r.left > 0 && n < min(lookAhead, len(r.buf)) {
		m, err := r.src.Read(r.buf[n:min(len(r.buf), n+r.left)])
		n += m
		r.left -= m
		if err != nil {
			r.end(err)
		}
	}
	r.data = r.buf[:n]
}

// end notes that the source has no more to give.
func (r *reader) end(err error) {
	r.left = 0
	if err != io.EOF && err != io.ErrUnexpectedEOF {
		r.err = err
	}
}

// rest is how many bytes follow, at most.
func (r *reader) rest() int { return len(r.data) + r.left }

// done is an error if anything is left.
func (r *reader) done() error {
	r.fill()
	if len(r.data) > 0 {
		return errorf("%d bytes follow the end of the value", len(r.data))
	}
	return nil
}

// head reads the head of the next item, which must have a major type other
// than that of simple values and floats.
func (r *reader) head() (major byte, arg uint64, err error) {
	if len(r.data) == 0 {
		return 0, 0, errorf("the bytes end in the middle of the value")
	}
	major, info := r.data[0]&0xe0, r.data[0]&0x1f
	size := 0
	switch {
	case info < 24:
		r.data = r.data[1:]
		return major, uint64(info), nil
	case info < 28:
		size = 1 << (info - 24)
	case info == 31:
		return 0, 0, errorf("an item of indefinite length, expected the length at its head")
	default:
		return 0, 0, errorf("the initial byte %#x has no meaning", r.data[0])
	}
	if len(r.data) < 1+size {
		return 0, 0, errorf("the bytes end in the middle of the value")
	}
	for _, b := range r.data[1 : 1+size] {
		arg = arg<<8 | uint64(b)
	}
	if headSize(arg) != 1+size {
		return 0, 0, errorf("the number %d is in %d bytes, not in its shortest form", arg, size)
	}
	r.data = r.data[1+size:]
	return major, arg, nil
}

// expect reads the head of an item that must be of the given major type.
func (r *reader) expect(major byte, what string) (uint64, error) {
	if len(r.data) > 0 && r.data[0]&0xe0 != major {
		return 0, errorf("expected %s, found %s", what, r.found())
	}
	_, arg, err := r.head()
	return arg, err
}

// count reads the head of an array or map, whose every element takes at least
// min bytes.
func (r *reader) count(major byte, what string, min int) (int, error) {
	n, err := r.expect(major, what)
	if err != nil {
		return 0, err
	}
	if n > uint64(r.rest()/max(1, min)) {
		return 0, errorf("%s of %d elements, but only %d bytes follow", what, n, r.rest())
	}
	return int(n), nil
}

// take takes off n bytes, which stay as they are until the next fill.
func (r *reader) take(n uint64) ([]byte, error) {
	if n > uint64(r.rest()) {
		return nil, errorf("an item of %d bytes, but only %d follow", n, r.rest())
	}
	if n > uint64(len(r.data)) {
		return r.gather(int(n))
	}
	b := r.data[:n]
	r.data = r.data[n:]
	return b, nil
}

// passes reports whether the field of a name is to be passed over.
func (r *reader) passes(name string) bool {
	for _, n := range r.but {
		if n == name {
			return true
		}
	}
	return false
}

// discard takes off n bytes.
func (r *reader) discard(n int) error {
	for n > 0 {
		if len(r.data) == 0 {
			if r.refill(); len(r.data) == 0 {
				return errorf("the bytes end in the middle of the value")
			}
		}
		m := min(n, len(r.data))
		r.data = r.data[m:]
		n -= m
	}
	return nil
}

// gather takes off n bytes that do not lie ready.
func (r *reader) gather(n int) ([]byte, error) {
	b := make([]byte, 0, min(n, piece))
	for len(b) < n {
		if len(r.data) == 0 {
			if r.refill(); len(r.data) == 0 {
				return nil, errorf("the bytes end in the middle of the value")
			}
		}
		m := min(n-len(b), len(r.data))
		b = append(b, r.data[:m]...)
		r.data = r.data[m:]
	}
	return b, nil
}

// text takes off a text, as a part of the data.
func (r *reader) text(what string) ([]byte, error) {
	n, err := r.expect(majorText, what)
	if err != nil {
		return nil, err
	}
	b, err := r.take(n)
	if err == nil && !utf8.Valid(b) {
		err = errorf("the text %.60q is not valid UTF-8", b)
	}
	return b, err
}

func (r *reader) truth() (bool, error) {
	if len(r.data) > 0 && (r.data[0] == simpleFalse || r.data[0] == simpleTrue) {
		v := r.data[0] == simpleTrue
		r.data = r.data[1:]
		return v, nil
	}
	return false, errorf("expected a truth value, found %s", r.found())
}

func (r *reader) float(what string) (float64, error) {
	if len(r.data) == 0 || r.data[0] < 0xf9 || r.data[0] > 0xfb {
		return 0, errorf("expected %s, found %s", what, r.found())
	}
	size := 1 << (r.data[0] & 3) // 2, 4, 8
	if len(r.data) < 1+size {
		return 0, errorf("the bytes end in the middle of the value")
	}
	var x float64
	whole, b := r.data[:1+size], r.data[1:1+size]
	switch size {
	case 2:
		x = fromHalf(binary.BigEndian.Uint16(b))
	case 4:
		x = float64(math.Float32frombits(binary.BigEndian.Uint32(b)))
	case 8:
		x = math.Float64frombits(binary.BigEndian.Uint64(b))
	}
	var shortest [9]byte
	if string(appendFloat(shortest[:0], x)) != string(whole) {
		return 0, errorf("the float %v is not in its shortest form", x)
	}
	r.data = r.data[1+size:]
	return x, nil
}

// typed takes off a typed array and gives its numbers, checked but not decoded.
func (r *reader) typed() (numberKind, []byte, error) {
	k, n, err := r.typedHeads()
	if err != nil {
		return numberKind{}, nil, err
	}
	raw, err := r.take(uint64(n * k.width))
	if err == nil {
		err = checkNumbers(k, raw, 0)
	}
	return k, raw, err
}

// typedHeads takes off the heads of a typed array and gives how many numbers
// follow.
func (r *reader) typedHeads() (numberKind, int, error) {
	tag, err := r.expect(majorTag, "an array of numbers")
	if err != nil {
		return numberKind{}, 0, err
	}
	k, ok := numberTagged(tag)
	if !ok {
		return numberKind{}, 0, errorf("the tag %d has no meaning here", tag)
	}
	n, err := r.expect(majorBytes, "the bytes of an array of "+k.kind.String())
	switch {
	case err != nil:
		return numberKind{}, 0, err
	case n%uint64(k.width) != 0:
		return numberKind{}, 0, errorf("an array of %s of %d bytes, expected a multiple of %d", k.kind, n, k.width)
	case n > uint64(r.rest()):
		return numberKind{}, 0, errorf("an item of %d bytes, but only %d follow", n, r.rest())
	}
	return k, int(n) / k.width, nil
}

// found says in words what the next item is.
func (r *reader) found() string {
	if len(r.data) == 0 {
		return "the end of the bytes"
	}
	switch b := r.data[0]; b & 0xe0 {
	case majorNatural, majorNegative:
		return "an integer"
	case majorBytes:
		return "a byte string"
	case majorText:
		return "text"
	case majorArray:
		return "an array"
	case majorMap:
		return "a map"
	case majorTag:
		rest := reader{data: r.data}
		if _, tag, err := rest.head(); err == nil {
			if k, ok := numberTagged(tag); ok {
				return "an array of " + k.kind.String()
			}
		}
		return "an unknown tag"
	default:
		switch {
		case b == simpleFalse || b == simpleTrue:
			return "a truth value"
		case b >= 0xf9 && b <= 0xfb:
			return "a float"
		case b == 0xf6:
			return "null"
		}
		return "an unknown simple value"
	}
}
