package canon

import (
	"bytes"
	"encoding/binary"
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
	if !v.IsValid() {
		return nil, errorf("there is no value, and no type")
	}
	p, err := planOf(v.Type())
	if err != nil {
		return nil, err
	}
	return p.append(make([]byte, 0, p.size(v)), v)
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

func (p *plan) append(dst []byte, v reflect.Value) ([]byte, error) {
	switch p.form {
	case truth:
		if v.Bool() {
			return append(dst, simpleTrue), nil
		}
		return append(dst, simpleFalse), nil
	case signed:
		return appendSigned(dst, v.Int()), nil
	case natural:
		return appendHead(dst, majorNatural, v.Uint()), nil
	case float:
		return appendFloat(dst, v.Float()), nil
	case text:
		s := v.String()
		if !utf8.ValidString(s) {
			return nil, errorf("text that is not valid UTF-8 cannot be encoded: %.60q", s)
		}
		return appendText(dst, s), nil
	case typed:
		dst = appendTyped(dst, p.number, v.Len())
		return appendNumbers(dst, p.number, v), nil
	case list:
		return p.appendList(dst, v)
	case mapping:
		return p.appendMapping(dst, v)
	}
	return p.appendRecord(dst, v)
}

func (p *plan) appendList(dst []byte, v reflect.Value) (_ []byte, err error) {
	dst = appendHead(dst, majorArray, uint64(v.Len()))
	for i := range v.Len() {
		if dst, err = p.elem.append(dst, v.Index(i)); err != nil {
			return nil, within(index(i), err)
		}
	}
	return dst, nil
}

func (p *plan) appendRecord(dst []byte, v reflect.Value) (_ []byte, err error) {
	dst = appendHead(dst, majorMap, uint64(len(p.fields)))
	for i := range p.fields {
		f := &p.fields[i]
		dst = append(dst, f.key...)
		if dst, err = f.plan.append(dst, v.Field(f.index)); err != nil {
			return nil, within("."+f.name, err)
		}
	}
	return dst, nil
}

func (p *plan) appendMapping(dst []byte, v reflect.Value) ([]byte, error) {
	type entry struct{ key, value []byte }
	entries := make([]entry, 0, v.Len())
	for it := v.MapRange(); it.Next(); {
		key, err := p.key.append(nil, it.Key())
		if err != nil {
			return nil, within("[key]", err)
		}
		value, err := p.elem.append(nil, it.Value())
		if err != nil {
			return nil, within(keyStep(it.Key()), err)
		}
		entries = append(entries, entry{key, value})
	}
	sort.Slice(entries, func(i, j int) bool { return bytes.Compare(entries[i].key, entries[j].key) < 0 })
	dst = appendHead(dst, majorMap, uint64(len(entries)))
	for _, e := range entries {
		dst = append(append(dst, e.key...), e.value...)
	}
	return dst, nil
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
