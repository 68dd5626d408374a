package canon

import (
	"bytes"
	"encoding/binary"
	"io"
	"reflect"
	"sort"
	"unicode/utf8"
)

// Major types of CBOR (RFC 8949, section 3.1), in place in an initial byte.
const (
	majorNatural  = 0 << 5
	majorNegative = 1 << 5
	majorBytes    = 2 << 5
	majorText     = 3 << 5
	majorArray    = 4 << 5
	majorMap      = 5 << 5
	majorTag      = 6 << 5
	majorSimple   = 7 << 5
)

const (
	simpleFalse = 0xf4
	simpleTrue  = 0xf5
)

// Marshal gives the canonical bytes of v. The error, an [*Error], names the
// part of v that cannot be encoded.
func Marshal(v any) ([]byte, error) { return MarshalValue(reflect.ValueOf(v)) }

// MarshalValue is [Marshal] of the value that v holds.
func MarshalValue(v reflect.Value) ([]byte, error) {
	p, err := planOfValue(v)
	if err != nil {
		return nil, err
	}
	e := encoder{buf: make([]byte, 0, p.size(v))}
	if err := e.value(p, v); err != nil {
		return nil, err
	}
	return e.buf, nil
}

// WriteValue writes what [MarshalValue] gives, piece by piece, so that it takes
// little memory besides the value. After an error some of it may have been
// written.
func WriteValue(w io.Writer, v reflect.Value) error {
	p, err := planOfValue(v)
	if err != nil {
		return err
	}
	e := encoder{w: w}
	if err := e.value(p, v); err != nil {
		return err
	}
	return e.flush()
}

func planOfValue(v reflect.Value) (*plan, error) {
	if !v.IsValid() {
		return nil, errorf("there is no value, and no type")
	}
	return planOf(v.Type())
}

// size is at least the length of v's encoding, but for mappings, which are
// left out.
func (p *plan) size(v reflect.Value) int {
	switch p.form {
	case text:
		return 9 + v.Len()
	case typed:
		return 11 + v.Len()*p.number.width
	case list:
		n := 9
		for i := range v.Len() {
			n += p.elem.size(v.Index(i))
		}
		return n
	case record:
		n := 9
		for i := range p.fields {
			f := &p.fields[i]
			n += len(f.key) + f.plan.size(v.Field(f.index))
		}
		return n
	}
	return 9
}

// An encoder collects encoded bytes. With a writer, it passes them on as soon
// as there are a piece of them.
type encoder struct {
	buf []byte
	w   io.Writer
}

// piece is how many bytes are read or written at a time.
const piece = 256 << 10

// flush passes on what there is, if there is a writer.
func (e *encoder) flush() error {
	if e.w == nil || len(e.buf) == 0 {
		return nil
	}
	_, err := e.w.Write(e.buf)
	e.buf = e.buf[:0]
	return err
}

// room passes on what there is if it is a piece.
func (e *encoder) room() error {
	if len(e.buf) < piece {
		return nil
	}
	return e.flush()
}

func (e *encoder) value(p *plan, v reflect.Value) error {
	switch p.form {
	case truth:
		if v.Bool() {
			e.buf = append(e.buf, simpleTrue)
		} else {
			e.buf = append(e.buf, simpleFalse)
		}
	case signed:
		e.buf = appendSigned(e.buf, v.Int())
	case natural:
		e.buf = appendHead(e.buf, majorNatural, v.Uint())
	case float:
		e.buf = appendFloat(e.buf, v.Float())
	case text:
		return e.text(v.String())
	case typed:
		return e.typed(p, v)
	case list:
		return e.list(p, v)
	case mapping:
		return e.mapping(p, v)
	case record:
		return e.record(p, v)
	}
	return nil
}

func (e *encoder) text(s string) error {
	if !utf8.ValidString(s) {
		return errorf("text that is not valid UTF-8 cannot be encoded: %.60q", s)
	}
	e.buf = appendHead(e.buf, majorText, uint64(len(s)))
	for e.w != nil && len(s) > piece {
		e.buf = append(e.buf, s[:piece]...)
		s = s[piece:]
		if err := e.flush(); err != nil {
			return err
		}
	}
	e.buf = append(e.buf, s...)
	return nil
}

func (e *encoder) typed(p *plan, v reflect.Value) error {
	n := v.Len()
	e.buf = appendTyped(e.buf, p.number, n)
	if e.w == nil || n <= piece/8 || v.Kind() == reflect.Array {
		e.buf = appendNumbers(e.buf, p.number, v)
		return e.room()
	}
	for i := 0; i < n; i += piece / 8 {
		e.buf = appendNumbers(e.buf, p.number, v.Slice(i, min(n, i+piece/8)))
		if err := e.room(); err != nil {
			return err
		}
	}
	return nil
}

func (e *encoder) list(p *plan, v reflect.Value) error {
	e.buf = appendHead(e.buf, majorArray, uint64(v.Len()))
	for i := range v.Len() {
		if err := e.value(p.elem, v.Index(i)); err != nil {
			return within(index(i), err)
		}
		if err := e.room(); err != nil {
			return err
		}
	}
	return nil
}

func (e *encoder) record(p *plan, v reflect.Value) error {
	e.buf = appendHead(e.buf, majorMap, uint64(len(p.fields)))
	for i := range p.fields {
		f := &p.fields[i]
		e.buf = append(e.buf, f.key...)
		if err := e.value(f.plan, v.Field(f.index)); err != nil {
			return within("."+f.name, err)
		}
	}
	return nil
}

func (e *encoder) mapping(p *plan, v reflect.Value) error {
	type entry struct {
		key   []byte
		value reflect.Value
		name  reflect.Value
	}
	entries := make([]entry, 0, v.Len())
	for it := v.MapRange(); it.Next(); {
		var key encoder
		if err := key.value(p.key, it.Key()); err != nil {
			return within("[key]", err)
		}
		entries = append(entries, entry{key.buf, it.Value(), it.Key()})
	}
	sort.Slice(entries, func(i, j int) bool { return bytes.Compare(entries[i].key, entries[j].key) < 0 })
	e.buf = appendHead(e.buf, majorMap, uint64(len(entries)))
	for _, en := range entries {
		e.buf = append(e.buf, en.key...)
		if err := e.value(p.elem, en.value); err != nil {
			return within(keyStep(en.name), err)
		}
		if err := e.room(); err != nil {
			return err
		}
	}
	return nil
}

func appendSigned(dst []byte, x int64) []byte {
	if x < 0 {
		return appendHead(dst, majorNegative, uint64(^x))
	}
	return appendHead(dst, majorNatural, uint64(x))
}

func appendText(dst []byte, s string) []byte {
	return append(appendHead(dst, majorText, uint64(len(s))), s...)
}

// appendTyped appends the heads of a typed array of n numbers.
func appendTyped(dst []byte, k numberKind, n int) []byte {
	dst = appendHead(dst, majorTag, k.tag)
	return appendHead(dst, majorBytes, uint64(n*k.width))
}

// appendHead appends the head of an item in its shortest form.
func appendHead(dst []byte, major byte, arg uint64) []byte {
	switch headSize(arg) {
	case 1:
		return append(dst, major|byte(arg))
	case 2:
		return append(dst, major|24, byte(arg))
	case 3:
		return binary.BigEndian.AppendUint16(append(dst, major|25), uint16(arg))
	case 5:
		return binary.BigEndian.AppendUint32(append(dst, major|26), uint32(arg))
	}
	return binary.BigEndian.AppendUint64(append(dst, major|27), arg)
}

// headSize is the number of bytes of the shortest head with an argument.
func headSize(arg uint64) int {
	switch {
	case arg < 24:
		return 1
	case arg < 1<<8:
		return 2
	case arg < 1<<16:
		return 3
	case arg < 1<<32:
		return 5
	}
	return 9
}
