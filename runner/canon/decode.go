package canon

import (
	"bytes"
	"fmt"
	"io"
	"reflect"
	"strconv"
)

// Unmarshal decodes canonical bytes into the value that v points to. It
// refuses everything that [Marshal] of the same type would not have written:
// other kinds of value, unknown, missing or repeated fields, numbers out of
// range or not in their shortest form, unsorted keys, and bytes after the end.
// The error, an [*Error], says where, and leaves the value as it was.
//
// The memory taken is that of an empty value and a multiple of len(data),
// whatever lengths the bytes announce: at most 25 bytes for each byte, 150 in
// values with many small maps.
func Unmarshal(data []byte, v any) error {
	p := reflect.ValueOf(v)
	if p.Kind() != reflect.Pointer || p.IsNil() {
		return errorf("cannot decode into %T, expected a pointer", v)
	}
	return UnmarshalValue(data, p.Elem())
}

// UnmarshalValue is [Unmarshal] into v, which must be settable.
func UnmarshalValue(data []byte, v reflect.Value) error {
	if !v.CanSet() {
		return errorf("cannot decode into a value that cannot be set")
	}
	p, err := planOf(v.Type())
	if err != nil {
		return err
	}
	return p.readInto(&reader{data: data}, v)
}

// ReadSealed reads a value in its envelope (see [Seal]) from src, up to its
// end, into v, which must be settable. It is [Open] and [UnmarshalValue], piece
// by piece, so that it takes little memory besides the value. At most limit
// bytes are read, and lengths that the bytes announce are held against it.
//
// Of a struct, fields whose names are given are passed over, almost unchecked,
// and stay zero.
func ReadSealed(src io.Reader, limit int64, v reflect.Value, but ...string) error {
	if !v.CanSet() {
		return errorf("cannot decode into a value that cannot be set")
	}
	p, err := planOf(v.Type())
	if err != nil {
		return err
	}
	r := readerOf(src, limit)
	if len(but) > 0 && p.form == record {
		r.top, r.but = p, but
	}
	err = p.readSealed(r, v)
	if r.err != nil {
		return r.err
	}
	return err
}

func (p *plan) readSealed(r *reader, v reflect.Value) error {
	_, layout, err := r.envelope()
	if err != nil {
		return err
	}
	if layout != p.layout {
		return errorf("the value has the layout %s, expected %s", layout, p.layout)
	}
	return p.readInto(r, v)
}

// readInto decodes all that there is to read.
func (p *plan) readInto(r *reader, v reflect.Value) error {
	fresh := reflect.New(v.Type()).Elem()
	if err := p.read(r, fresh); err != nil {
		return err
	}
	if err := r.done(); err != nil {
		return err
	}
	v.Set(fresh)
	return nil
}

// read decodes the next item into v, which is zero.
func (p *plan) read(r *reader, v reflect.Value) error {
	r.fill()
	switch p.form {
	case truth:
		b, err := r.truth()
		if err == nil {
			v.SetBool(b)
		}
		return err
	case signed:
		return p.readSigned(r, v)
	case natural:
		x, err := r.expect(majorNatural, p.what())
		if err != nil {
			return err
		}
		if v.OverflowUint(x) {
			return errorf("%d is out of range for %s", x, p.kind)
		}
		v.SetUint(x)
	case float:
		x, err := r.float(p.what())
		if err != nil {
			return err
		}
		if p.kind == reflect.Float32 && x == x && float64(float32(x)) != x {
			return errorf("%v is no float32", x)
		}
		v.SetFloat(x)
	case text:
		b, err := r.text(p.what())
		if err != nil {
			return err
		}
		v.SetString(string(b))
	case typed:
		return p.readTyped(r, v)
	case list:
		return p.readList(r, v)
	case mapping:
		return p.readMapping(r, v)
	case record:
		return p.readRecord(r, v)
	}
	return nil
}

// what names the values of a plan in errors.
func (p *plan) what() string {
	switch p.form {
	case text:
		return "text"
	case typed:
		return "an array of " + p.number.kind.String()
	case list:
		return "an array"
	case mapping:
		return "a map"
	case record:
		return "a map of the fields of a struct"
	}
	return p.kind.String()
}

func (p *plan) readSigned(r *reader, v reflect.Value) error {
	if len(r.data) > 0 && r.data[0]&0xe0 > majorNegative {
		return errorf("expected %s, found %s", p.what(), r.found())
	}
	major, arg, err := r.head()
	if err != nil {
		return err
	}
	x := int64(arg)
	if major == majorNegative {
		x = ^x
	}
	if arg>>63 != 0 || v.OverflowInt(x) {
		return errorf("an integer is out of range for %s", p.kind)
	}
	v.SetInt(x)
	return nil
}

func (p *plan) readTyped(r *reader, v reflect.Value) error {
	if len(r.data) > 0 && r.data[0]&0xe0 != majorTag {
		return errorf("expected %s, found %s", p.what(), r.found())
	}
	k, n, err := r.typedHeads()
	if err != nil {
		return err
	}
	if k.tag != p.number.tag {
		return errorf("expected %s, found an array of %s", p.what(), k.kind)
	}
	if p.length >= 0 && n != p.length {
		return errorf("expected %d numbers, found %d", p.length, n)
	}
	if n == 0 {
		return nil
	}
	if n*k.width <= len(r.data) || p.length >= 0 {
		raw, err := r.take(uint64(n * k.width))
		if err == nil {
			err = checkNumbers(k, raw, 0)
		}
		if err == nil {
			setNumbers(v, numbers(p.number, raw))
		}
		return err
	}
	v.Set(reflect.MakeSlice(v.Type(), n, n))
	for i := 0; i < n; {
		if r.fill(); len(r.data) < k.width {
			return errorf("the bytes end in the middle of the value")
		}
		m := min(n-i, len(r.data)/k.width)
		raw := r.data[:m*k.width]
		if err := checkNumbers(k, raw, i); err != nil {
			return err
		}
		fillNumbers(v.Slice(i, i+m), p.number, raw)
		r.data = r.data[len(raw):]
		i += m
	}
	return nil
}

func (p *plan) readList(r *reader, v reflect.Value) error {
	n, err := r.count(majorArray, p.what(), p.elem.min)
	if err != nil {
		return err
	}
	switch {
	case p.length >= 0 && n != p.length:
		return errorf("expected %d elements, found %d", p.length, n)
	case p.length < 0 && n > 0:
		v.Set(reflect.MakeSlice(v.Type(), n, n))
	}
	for i := range n {
		if err := p.elem.read(r, v.Index(i)); err != nil {
			return within(index(i), err)
		}
	}
	return nil
}

func (p *plan) readMapping(r *reader, v reflect.Value) error {
	n, err := r.count(majorMap, p.what(), p.key.min+p.elem.min)
	if err != nil {
		return err
	}
	t := v.Type()
	v.Set(reflect.MakeMap(t))
	var last, now encoder // the bytes of the key before, and of this one
	for i := range n {
		key := reflect.New(t.Key()).Elem()
		if err := p.key.read(r, key); err != nil {
			return within("[key]", err)
		}
		last, now = now, encoder{buf: last.buf[:0]}
		if err := now.value(p.key, key); err != nil {
			return within(keyStep(key), err)
		}
		if i > 0 && bytes.Compare(last.buf, now.buf) >= 0 {
			return within(keyStep(key), errorf("the key is repeated or not in sorted order"))
		}
		value := reflect.New(t.Elem()).Elem()
		if err := p.elem.read(r, value); err != nil {
			return within(keyStep(key), err)
		}
		v.SetMapIndex(key, value)
	}
	return nil
}

func (p *plan) readRecord(r *reader, v reflect.Value) error {
	n, err := r.count(majorMap, p.what(), 2)
	if err != nil {
		return err
	}
	for i := range p.fields {
		f := &p.fields[i]
		if i >= n {
			return within("."+f.name, errorf("the field is missing"))
		}
		if r.fill(); !bytes.HasPrefix(r.data, f.key) {
			return p.strange(r, i)
		}
		r.data = r.data[len(f.key):]
		to := v.Field(f.index)
		if r.top == p && r.passes(f.name) {
			err = f.plan.pass(r, to.Type())
		} else {
			err = f.plan.read(r, to)
		}
		if err != nil {
			return within("."+f.name, err)
		}
	}
	if n > len(p.fields) {
		return p.strange(r, len(p.fields))
	}
	return nil
}

// pass takes off the next item, of a type that has this plan.
func (p *plan) pass(r *reader, t reflect.Type) error {
	r.fill()
	switch p.form {
	case typed:
		k, n, err := r.typedHeads()
		if err != nil {
			return err
		}
		return r.discard(n * k.width)
	case list:
		n, err := r.count(majorArray, p.what(), p.elem.min)
		for i := 0; i < n && err == nil; i++ {
			if err = p.elem.pass(r, t.Elem()); err != nil {
				err = within(index(i), err)
			}
		}
		return err
	}
	return p.read(r, reflect.New(t).Elem())
}

// strange says why the next key of a record is not that of field i.
func (p *plan) strange(r *reader, i int) error {
	b, err := r.text("the name of a field")
	if err != nil {
		return err
	}
	name := string(b)
	for k := range p.fields {
		switch {
		case p.fields[k].name != name:
		case k < i:
			return within("."+name, errorf("the field is repeated or not in sorted order"))
		default:
			return within("."+p.fields[i].name, errorf("the field is missing"))
		}
	}
	return errorf("there is no field %.60q", name)
}

// keyStep is the step of a path to the value of a key, of which it shows the
// beginning.
func keyStep(key reflect.Value) string {
	switch {
	case key.CanInt():
		return "[" + strconv.FormatInt(key.Int(), 10) + "]"
	case key.CanUint():
		return "[" + strconv.FormatUint(key.Uint(), 10) + "]"
	}
	return fmt.Sprintf("[%.60q]", key.String())
}
