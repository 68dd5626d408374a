package canon

import (
	"bytes"
	"reflect"
	"strconv"
)

// Split gives the canonical bytes of each element of an encoded slice, whose
// elements have the layout elem. Items are parts of data where they can be,
// and must then not be written to; the elements of slices of numbers, which
// are typed arrays, are encoded afresh. The items are checked to be
// canonical, but not to have the layout.
func Split(elem string, data []byte) ([][]byte, error) {
	r := reader{data: data}
	if k, ok := numberNamed(elem); ok {
		return splitTyped(k, &r)
	}
	n, err := r.count(majorArray, "an array", 1)
	if err != nil {
		return nil, err
	}
	items := make([][]byte, n)
	for i := range items {
		start := r.data
		if err := r.skip(1); err != nil {
			return nil, within(index(i), err)
		}
		size := len(start) - len(r.data)
		items[i] = start[:size:size]
	}
	return items, r.done()
}

// Len is the number of elements of an encoded slice, whose elements have the
// layout elem, as far as its head tells: the elements are not looked at. It is
// for deciding whether to call [Split], which takes memory for each element.
func Len(elem string, data []byte) (int, error) {
	r := reader{data: data}
	if _, ok := numberNamed(elem); ok {
		k, raw, err := r.typed()
		if err != nil {
			return 0, err
		}
		return len(raw) / k.width, nil
	}
	return r.count(majorArray, "an array", 1)
}

// Join is the inverse of [Split]: the bytes of the slice of the items, each the
// canonical bytes of a value of the layout elem. For numbers that is checked;
// for the rest, that items are canonical.
func Join(elem string, items [][]byte) ([]byte, error) {
	if k, ok := numberNamed(elem); ok {
		return joinTyped(k, items)
	}
	size := headSize(uint64(len(items)))
	for i, item := range items {
		size += len(item)
		r := reader{data: item}
		err := r.skip(1)
		if err == nil {
			err = r.done()
		}
		if err != nil {
			return nil, within(index(i), err)
		}
	}
	dst := appendHead(make([]byte, 0, size), majorArray, uint64(len(items)))
	for _, item := range items {
		dst = append(dst, item...)
	}
	return dst, nil
}

// ListHead gives the bytes that an encoded slice of n values, which are not
// numbers, begins with. Those of the values follow.
func ListHead(n int) []byte { return appendHead(nil, majorArray, uint64(n)) }

// IsNumber reports whether a layout is that of a number, of which slices are
// typed arrays.
func IsNumber(layout string) bool {
	_, ok := numberNamed(layout)
	return ok
}

// numberNamed gives the kind of number of a layout, if it is one.
func numberNamed(layout string) (numberKind, bool) {
	for _, k := range numberKinds {
		if k.kind.String() == layout {
			return k, true
		}
	}
	return numberKind{}, false
}

// scalarTypes are the types of the kinds of number.
var scalarTypes = map[reflect.Kind]reflect.Type{
	reflect.Uint8: reflect.TypeFor[uint8](), reflect.Uint16: reflect.TypeFor[uint16](), reflect.Uint32: reflect.TypeFor[uint32](),
	reflect.Uint64: reflect.TypeFor[uint64](), reflect.Uint: reflect.TypeFor[uint](),
	reflect.Int8: reflect.TypeFor[int8](), reflect.Int16: reflect.TypeFor[int16](), reflect.Int32: reflect.TypeFor[int32](),
	reflect.Int64: reflect.TypeFor[int64](), reflect.Int: reflect.TypeFor[int](),
	reflect.Float32: reflect.TypeFor[float32](), reflect.Float64: reflect.TypeFor[float64](),
}

func splitTyped(k numberKind, r *reader) ([][]byte, error) {
	slice := reflect.New(reflect.SliceOf(scalarTypes[k.kind])).Elem()
	if err := UnmarshalValue(r.data, slice); err != nil {
		return nil, err
	}
	p, err := planOf(scalarTypes[k.kind])
	if err != nil {
		return nil, err
	}
	n := slice.Len()
	items := make([][]byte, n)
	buf := make([]byte, 0, n*(1+k.width)) // no number takes more; items must not move
	for i := range items {
		start := len(buf)
		e := encoder{buf: buf}
		if err := e.value(p, slice.Index(i)); err != nil {
			return nil, within(index(i), err)
		}
		buf = e.buf
		items[i] = buf[start:len(buf):len(buf)]
	}
	return items, nil
}

func joinTyped(k numberKind, items [][]byte) ([]byte, error) {
	t := scalarTypes[k.kind]
	slice := reflect.MakeSlice(reflect.SliceOf(t), len(items), len(items))
	for i, item := range items {
		if err := UnmarshalValue(item, slice.Index(i)); err != nil {
			return nil, within(index(i), err)
		}
	}
	return MarshalValue(slice)
}

// skip takes off the next item, of whatever kind, and checks that it is
// canonical. The item is at the given depth, from 1.
func (r *reader) skip(depth int) error {
	if depth > maxDepth {
		return errorf("values nest more than %d deep", maxDepth)
	}
	if len(r.data) == 0 {
		return errorf("the bytes end in the middle of the value")
	}
	switch b := r.data[0]; b & 0xe0 {
	case majorNatural:
		_, _, err := r.head()
		return err
	case majorNegative:
		_, _, err := r.integer()
		return err
	case majorText:
		_, err := r.text("text")
		return err
	case majorTag:
		_, _, err := r.typed()
		return err
	case majorArray:
		n, err := r.count(majorArray, "an array", 1)
		for i := 0; i < n && err == nil; i++ {
			if err = r.skip(depth + 1); err != nil {
				return within(index(i), err)
			}
		}
		return err
	case majorMap:
		return r.eachEntry(func(key any) error { return r.skip(depth + 1) })
	case majorSimple:
		if b >= 0xf9 && b <= 0xfb {
			_, err := r.float("a float")
			return err
		}
		_, err := r.truth()
		return err
	}
	return errorf("%s is no part of a value", r.found())
}

// integer takes off an integer that fits an int64 or, with big, a uint64.
func (r *reader) integer() (small int64, big uint64, err error) {
	major, arg, err := r.head()
	switch {
	case err != nil:
		return 0, 0, err
	case major == majorNegative && arg>>63 != 0:
		return 0, 0, errorf("an integer is out of range for int64")
	case major == majorNegative:
		return ^int64(arg), 0, nil
	case arg>>63 != 0:
		return 0, arg, nil
	}
	return int64(arg), 0, nil
}

// eachEntry takes off a map. It calls value at each value, which must take it
// off, with the key: a string, int64 or uint64.
func (r *reader) eachEntry(value func(key any) error) error {
	n, err := r.count(majorMap, "a map", 2)
	if err != nil {
		return err
	}
	var last []byte
	for i := range n {
		start := r.data
		key, err := r.anyKey()
		if err != nil {
			return within("[key]", err)
		}
		step := func(err error) error { return within(keyStep(reflect.ValueOf(key)), err) }
		encoded := start[:len(start)-len(r.data)]
		switch {
		case i > 0 && bytes.Compare(last, encoded) >= 0:
			return step(errorf("the key is repeated or not in sorted order"))
		case i > 0 && (last[0]&0xe0 == majorText) != (encoded[0]&0xe0 == majorText):
			return step(errorf("a map has both text and integers as keys"))
		}
		last = encoded
		if err := value(key); err != nil {
			return step(err)
		}
	}
	return nil
}

func (r *reader) anyKey() (any, error) {
	if len(r.data) > 0 && r.data[0]&0xe0 <= majorNegative {
		small, big, err := r.integer()
		if big != 0 {
			return big, err
		}
		return small, err
	}
	b, err := r.text("text or an integer as a key")
	return string(b), err
}

// keyText writes a key in text.
func keyText(key any) string {
	switch key := key.(type) {
	case int64:
		return strconv.FormatInt(key, 10)
	case uint64:
		return strconv.FormatUint(key, 10)
	}
	return key.(string)
}
