package canon

import (
	"encoding/binary"
	"math"
	"reflect"
)

// A numberKind is a kind of number with its typed array of RFC 8746.
type numberKind struct {
	kind  reflect.Kind
	tag   uint64
	width int // bytes of one number
}

// numberKinds are the kinds of number that can be encoded. The tags are those
// of RFC 8746, table 1.
var numberKinds = []numberKind{
	{reflect.Uint8, 64, 1},
	{reflect.Uint16, 69, 2},
	{reflect.Uint32, 70, 4},
	{reflect.Uint64, 71, 8},
	{reflect.Uint, 71, 8},
	{reflect.Int8, 72, 1},
	{reflect.Int16, 77, 2},
	{reflect.Int32, 78, 4},
	{reflect.Int64, 79, 8},
	{reflect.Int, 79, 8},
	{reflect.Float32, 85, 4},
	{reflect.Float64, 86, 8},
}

func numberOf(kind reflect.Kind) (numberKind, bool) {
	for _, k := range numberKinds {
		if k.kind == kind {
			return k, true
		}
	}
	return numberKind{}, false
}

// numberTagged gives the first kind of number of a typed array's tag.
func numberTagged(tag uint64) (numberKind, bool) {
	for _, k := range numberKinds {
		if k.tag == tag {
			return k, true
		}
	}
	return numberKind{}, false
}

// The one bit pattern of NaN in each width.
const (
	nan16 uint16 = 0x7e00
	nan32 uint32 = 0x7fc00000
	nan64 uint64 = 0x7ff8000000000000
)

type integer interface {
	uint8 | uint16 | uint32 | uint64 | uint | int8 | int16 | int32 | int64 | int
}

// appendNumbers appends the numbers of a slice or array, without its heads.
func appendNumbers(dst []byte, k numberKind, v reflect.Value) []byte {
	switch k.kind {
	case reflect.Float64:
		return appendFloat64s(dst, sliceOf[float64](v))
	case reflect.Float32:
		return appendFloat32s(dst, sliceOf[float32](v))
	case reflect.Uint8:
		return append(dst, sliceOf[uint8](v)...)
	case reflect.Uint16:
		return appendIntegers(dst, sliceOf[uint16](v), k.width)
	case reflect.Uint32:
		return appendIntegers(dst, sliceOf[uint32](v), k.width)
	case reflect.Uint64:
		return appendIntegers(dst, sliceOf[uint64](v), k.width)
	case reflect.Uint:
		return appendIntegers(dst, sliceOf[uint](v), k.width)
	case reflect.Int8:
		return appendIntegers(dst, sliceOf[int8](v), k.width)
	case reflect.Int16:
		return appendIntegers(dst, sliceOf[int16](v), k.width)
	case reflect.Int32:
		return appendIntegers(dst, sliceOf[int32](v), k.width)
	case reflect.Int64:
		return appendIntegers(dst, sliceOf[int64](v), k.width)
	case reflect.Int:
		return appendIntegers(dst, sliceOf[int](v), k.width)
	}
	panic("canon: no such kind of number: " + k.kind.String())
}

// numbers decodes the bytes of a checked typed array to a slice of k's own
// type.
func numbers(k numberKind, raw []byte) any {
	switch k.kind {
	case reflect.Float64:
		return float64s(raw)
	case reflect.Float32:
		return float32s(raw)
	case reflect.Uint8:
		return append(make([]uint8, 0, len(raw)), raw...)
	case reflect.Uint16:
		return integers[uint16](raw, k.width)
	case reflect.Uint32:
		return integers[uint32](raw, k.width)
	case reflect.Uint64:
		return integers[uint64](raw, k.width)
	case reflect.Uint:
		return integers[uint](raw, k.width)
	case reflect.Int8:
		return integers[int8](raw, k.width)
	case reflect.Int16:
		return integers[int16](raw, k.width)
	case reflect.Int32:
		return integers[int32](raw, k.width)
	case reflect.Int64:
		return integers[int64](raw, k.width)
	case reflect.Int:
		return integers[int](raw, k.width)
	}
	panic("canon: no such kind of number: " + k.kind.String())
}

// sliceOf gives the numbers of a slice or array, sharing them where the type
// allows it: not for arrays, nor for elements of a named type.
func sliceOf[T integer | float32 | float64](v reflect.Value) []T {
	elem := reflect.TypeFor[T]()
	n := v.Len()
	switch {
	case v.Type().Elem() != elem:
		out := make([]T, n)
		for i := range out {
			out[i] = v.Index(i).Convert(elem).Interface().(T)
		}
		return out
	case v.Kind() == reflect.Array:
		s := make([]T, n)
		reflect.Copy(reflect.ValueOf(s), v)
		return s
	}
	return v.Convert(reflect.TypeFor[[]T]()).Interface().([]T)
}

// setNumbers sets a slice or array to decoded numbers, of which it has the
// kind and, for an array, the length.
func setNumbers(v reflect.Value, decoded any) {
	s := reflect.ValueOf(decoded)
	n := s.Len()
	switch {
	case v.Type().Elem() != s.Type().Elem():
		if v.Kind() == reflect.Slice {
			v.Set(reflect.MakeSlice(v.Type(), n, n))
		}
		for i := range n {
			v.Index(i).Set(s.Index(i).Convert(v.Type().Elem()))
		}
	case v.Kind() == reflect.Array:
		reflect.Copy(v, s)
	default:
		v.Set(s)
	}
}

// grow lengthens dst by n bytes and gives also the part that was added.
func grow(dst []byte, n int) (whole, added []byte) {
	if cap(dst)-len(dst) < n {
		dst = append(make([]byte, 0, len(dst)+n), dst...)
	}
	whole = dst[:len(dst)+n]
	return whole, whole[len(dst):]
}

func appendFloat64s(dst []byte, s []float64) []byte {
	dst, b := grow(dst, 8*len(s))
	for _, x := range s {
		bits := math.Float64bits(x)
		if x != x {
			bits = nan64
		}
		binary.LittleEndian.PutUint64(b, bits)
		b = b[8:]
	}
	return dst
}

func appendFloat32s(dst []byte, s []float32) []byte {
	dst, b := grow(dst, 4*len(s))
	for _, x := range s {
		bits := math.Float32bits(x)
		if x != x {
			bits = nan32
		}
		binary.LittleEndian.PutUint32(b, bits)
		b = b[4:]
	}
	return dst
}

func appendIntegers[T integer](dst []byte, s []T, width int) []byte {
	dst, b := grow(dst, width*len(s))
	for _, x := range s {
		for k, u := 0, uint64(x); k < width; k, u = k+1, u>>8 {
			b[k] = byte(u)
		}
		b = b[width:]
	}
	return dst
}

// float64s decodes floats that [checkNumbers] has found right.
func float64s(raw []byte) []float64 {
	out := make([]float64, len(raw)/8)
	for i := range out {
		out[i] = math.Float64frombits(binary.LittleEndian.Uint64(raw[8*i:]))
	}
	return out
}

func float32s(raw []byte) []float32 {
	out := make([]float32, len(raw)/4)
	for i := range out {
		out[i] = math.Float32frombits(binary.LittleEndian.Uint32(raw[4*i:]))
	}
	return out
}

// checkNumbers looks for numbers that are never encoded: NaNs other than the
// one. The first number is the one at index first.
func checkNumbers(k numberKind, raw []byte, first int) error {
	switch k.kind {
	case reflect.Float64:
		for i := 0; i < len(raw); i += 8 {
			bits := binary.LittleEndian.Uint64(raw[i:])
			if x := math.Float64frombits(bits); x != x && bits != nan64 {
				return within(index(first+i/8), errorf("NaN with the bits %#x, expected %#x", bits, nan64))
			}
		}
	case reflect.Float32:
		for i := 0; i < len(raw); i += 4 {
			bits := binary.LittleEndian.Uint32(raw[i:])
			if x := math.Float32frombits(bits); x != x && bits != nan32 {
				return within(index(first+i/4), errorf("NaN with the bits %#x, expected %#x", bits, nan32))
			}
		}
	}
	return nil
}

func integers[T integer](raw []byte, width int) []T {
	out := make([]T, len(raw)/width)
	for i := range out {
		var u uint64
		for k := width - 1; k >= 0; k-- {
			u = u<<8 | uint64(raw[i*width+k])
		}
		out[i] = T(u)
	}
	return out
}

// fillNumbers sets the elements of a slice to the numbers of a part of a
// checked typed array.
func fillNumbers(v reflect.Value, k numberKind, raw []byte) {
	if k.kind == reflect.Float64 && v.Type().Elem() == scalarTypes[reflect.Float64] {
		out := v.Convert(reflect.TypeFor[[]float64]()).Interface().([]float64)
		for i := range out {
			out[i] = math.Float64frombits(binary.LittleEndian.Uint64(raw[8*i:]))
		}
		return
	}
	from := reflect.ValueOf(numbers(k, raw))
	if from.Type().Elem() == v.Type().Elem() {
		reflect.Copy(v, from)
		return
	}
	for i := range from.Len() {
		v.Index(i).Set(from.Index(i).Convert(v.Type().Elem()))
	}
}
