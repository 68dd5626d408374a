package fits

import (
	"encoding/binary"
	"fmt"
	"math"
	"strings"
)

// Values are the elements of one column or image, one row after another. Kind
// says which of the slices holds them; the others are nil.
type Values struct {
	Kind    Kind  // String to Bits
	Offsets []int // row i holds elements Offsets[i] up to Offsets[i+1]; length rows + 1
	Dim     []int // shape of a row, first index fastest; nil when a row has no shape of its own

	Strings   []string
	Bools     []bool // for Logical and Bits
	Ints      []int64
	Uints     []uint64
	Floats    []float64
	Complexes []complex128

	// Null marks undefined elements; nil when there is none. A NaN of a real
	// or complex column counts as a value.
	Null []bool
}

// Len is the number of elements.
func (v *Values) Len() int {
	switch v.Kind {
	case String:
		return len(v.Strings)
	case Logical, Bits:
		return len(v.Bools)
	case Integer:
		return len(v.Ints)
	case Unsigned:
		return len(v.Uints)
	case Complex:
		return len(v.Complexes)
	}
	return len(v.Floats)
}

// IsNull reports whether element i is undefined.
func (v *Values) IsNull(i int) bool { return v.Null != nil && v.Null[i] }

// Float64s converts numbers to float64: undefined ones become NaN, and
// integers beyond 2^53 are rounded. Values of another kind are an error.
func (v *Values) Float64s() ([]float64, error) {
	var out []float64
	switch v.Kind {
	case Real:
		return v.Floats, nil // undefined ones are NaN already
	case Integer:
		out = make([]float64, len(v.Ints))
		for i, x := range v.Ints {
			out[i] = float64(x)
		}
	case Unsigned:
		out = make([]float64, len(v.Uints))
		for i, x := range v.Uints {
			out[i] = float64(x)
		}
	default:
		return nil, fmt.Errorf("holds %s values, expected numbers", v.Kind)
	}
	for i, null := range v.Null {
		if null {
			out[i] = math.NaN()
		}
	}
	return out, nil
}

// newValues makes room for total elements.
func newValues(kind Kind, total int64) Values {
	v := Values{Kind: kind}
	switch kind {
	case String:
		v.Strings = make([]string, total)
	case Logical, Bits:
		v.Bools = make([]bool, total)
	case Integer:
		v.Ints = make([]int64, total)
	case Unsigned:
		v.Uints = make([]uint64, total)
	case Real:
		v.Floats = make([]float64, total)
	case Complex:
		v.Complexes = make([]complex128, total)
	}
	return v
}

// setEqualRows gives all rows the same width.
func (v *Values) setEqualRows(rows, width int64) {
	v.Offsets = make([]int, rows+1)
	for i := range v.Offsets {
		v.Offsets[i] = i * int(width)
	}
}

func (v *Values) setNull(i int) {
	if v.Null == nil {
		v.Null = make([]bool, v.Len())
	}
	v.Null[i] = true
}

// elementSize is the number of bytes of one element of a type code; for X it
// is 1, and the count of bytes is bitBytes.
func elementSize(code byte) int64 {
	switch code {
	case 'I':
		return 2
	case 'J', 'E':
		return 4
	case 'K', 'D', 'C', 'P':
		return 8
	case 'M', 'Q':
		return 16
	}
	return 1 // L, X, B, A
}

// storedSize is the number of bytes that n elements take.
func storedSize(code byte, n int64) (int64, bool) {
	if code == 'X' {
		return n/8 + (n%8+7)/8, n >= 0
	}
	return mul(n, elementSize(code))
}

// decode converts n stored elements into elements at, at+1, ... of v.
func (v *Values) decode(at int, code byte, s *scaling, raw []byte, n int) error {
	switch code {
	case 'L':
		for i, b := range raw[:n] {
			switch b {
			case 'T':
				v.Bools[at+i] = true
			case 'F':
			case 0:
				v.setNull(at + i)
			default:
				return fmt.Errorf("a logical value is byte 0x%02x, expected T, F or 0", b)
			}
		}
	case 'X':
		for i := range n {
			v.Bools[at+i] = raw[i/8]&(0x80>>(i%8)) != 0
		}
	case 'B':
		for i, b := range raw[:n] {
			v.putInt(at+i, int64(b), s)
		}
	case 'I':
		for i := range n {
			v.putInt(at+i, int64(int16(binary.BigEndian.Uint16(raw[2*i:]))), s)
		}
	case 'J':
		for i := range n {
			v.putInt(at+i, int64(int32(binary.BigEndian.Uint32(raw[4*i:]))), s)
		}
	case 'K':
		for i := range n {
			v.putInt(at+i, int64(binary.BigEndian.Uint64(raw[8*i:])), s)
		}
	case 'E':
		for i := range n {
			v.Floats[at+i] = s.float(single(raw[4*i:]))
		}
	case 'D':
		for i := range n {
			v.Floats[at+i] = s.float(double(raw[8*i:]))
		}
	case 'C':
		for i := range n {
			v.Complexes[at+i] = s.complex(single(raw[8*i:]), single(raw[8*i+4:]))
		}
	case 'M':
		for i := range n {
			v.Complexes[at+i] = s.complex(double(raw[16*i:]), double(raw[16*i+8:]))
		}
	}
	return nil
}

func single(raw []byte) float64 {
	return float64(math.Float32frombits(binary.BigEndian.Uint32(raw)))
}

func double(raw []byte) float64 {
	return math.Float64frombits(binary.BigEndian.Uint64(raw))
}

// float scales a stored real; without scaling even -0 stays what it is.
func (s *scaling) float(x float64) float64 {
	if s.scale == 1 && s.zero == 0 {
		return x
	}
	return s.apply(x)
}

// complex scales both parts by TSCALn; TZEROn, being real, moves the real
// part only.
func (s *scaling) complex(re, im float64) complex128 {
	if s.scale == 1 && s.zero == 0 {
		return complex(re, im)
	}
	return complex(s.apply(re), s.scale*im)
}

// putInt stores one scaled integer.
func (v *Values) putInt(i int, stored int64, s *scaling) {
	null := s.hasNull && stored == s.null
	if null {
		v.setNull(i)
	}
	switch v.Kind {
	case Integer:
		v.Ints[i] = stored + s.offset
	case Unsigned:
		v.Uints[i] = uint64(stored) ^ unsignedOffset
	default:
		v.Floats[i] = s.apply(float64(stored))
		if null {
			v.Floats[i] = math.NaN()
		}
	}
}

// cutText takes the string out of a field of characters: a NUL ends it. Bytes
// that are not ASCII become question marks.
func cutText(raw []byte) string {
	clean := true
	for i, c := range raw {
		if c == 0 {
			raw = raw[:i]
			break
		}
		clean = clean && c < 0x80
	}
	if clean {
		return string(raw)
	}
	return strings.Map(func(r rune) rune {
		if r >= 0x80 {
			return '?'
		}
		return r
	}, string(raw))
}
