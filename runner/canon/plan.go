package canon

import (
	"bytes"
	"reflect"
	"sort"
	"strconv"
	"strings"
	"sync"
)

// A plan says how the values of one type are encoded.
type plan struct {
	form   form
	kind   reflect.Kind
	layout string
	min    int // bytes of the shortest encoding of a value

	number numberKind // of floats and typed arrays
	elem   *plan      // of lists and mappings
	key    *plan      // of mappings
	length int        // of fixed arrays; -1 for slices
	fields []field    // of records, in the order of their encoded keys
}

type field struct {
	index int // in the Go type
	name  string
	key   []byte // the name, encoded
	plan  *plan
}

// A form is a way of encoding.
type form int

const (
	truth   form = iota // bool
	signed              // int, int8, ...
	natural             // uint, uint8, ...
	float               // float32, float64
	text                // string
	typed               // slice or array of numbers
	list                // slice or array of anything else
	mapping             // map
	record              // struct
)

// plans holds the plan, or the error, of every type met so far.
var plans sync.Map // reflect.Type -> planned

type planned struct {
	plan *plan
	err  error
}

func planOf(t reflect.Type) (*plan, error) {
	if p, ok := plans.Load(t); ok {
		return copied(p.(planned))
	}
	var c compiler
	p, err := c.compile(t)
	plans.Store(t, planned{p, err})
	return copied(planned{p, err})
}

// copied keeps callers from adding to the path of a remembered error.
func copied(p planned) (*plan, error) {
	if e, ok := p.err.(*Error); ok {
		return nil, &Error{e.Path, e.Text}
	}
	return p.plan, nil
}

// Layout gives the structure of a type: the names of fields and the basic kinds
// of their values, in the order of the type, all named types expanded. For
// example, that of a slice of wavelength channels is
//
//	[]struct{Index int; Lo float64; Hi float64}
//
// Bytes encoded from a type can be decoded into every type of the same layout.
// The error names the part of the type that cannot be encoded.
func Layout(t reflect.Type) (string, error) {
	if t == nil {
		return "", errorf("there is no value, and no type")
	}
	p, err := planOf(t)
	if err != nil {
		return "", err
	}
	return p.layout, nil
}

// maxArray is the largest fixed array, in bytes, so that no size overflows.
const maxArray = 1 << 32

// maxLayout is the length of the longest layout. Each type that holds another
// one twice doubles it, so that a few lines of source could ask for any length.
const maxLayout = 1 << 16

// A compiler makes a plan; open holds the types that it is inside of.
type compiler struct {
	open []reflect.Type
}

func (c *compiler) compile(t reflect.Type) (*plan, error) {
	p, err := c.compileType(t)
	if err == nil && len(p.layout) > maxLayout {
		err = errorf("%.100v has more parts than can be encoded; its layout takes %d bytes, expected at most %d", t, len(p.layout), maxLayout)
	}
	return p, err
}

func (c *compiler) compileType(t reflect.Type) (*plan, error) {
	for _, outer := range c.open {
		if outer == t {
			return nil, errorf("%.100v contains itself; recursive types cannot be encoded", t)
		}
	}
	if len(c.open) >= maxDepth {
		return nil, errorf("types nest more than %d deep", maxDepth)
	}
	c.open = append(c.open, t)
	defer func() { c.open = c.open[:len(c.open)-1] }()

	p := &plan{kind: t.Kind(), layout: t.Kind().String(), min: 1, length: -1}
	switch t.Kind() {
	case reflect.Bool:
		p.form = truth
	case reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64:
		p.form = signed
	case reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64:
		p.form = natural
	case reflect.Float32, reflect.Float64:
		p.form, p.min = float, 3
	case reflect.String:
		p.form = text
	case reflect.Slice, reflect.Array:
		return p, c.sequence(p, t)
	case reflect.Map:
		return p, c.mapping(p, t)
	case reflect.Struct:
		return p, c.record(p, t)
	default:
		return nil, errorf("a value of type %.100v cannot be encoded; expected numbers, text, truth values, and slices, maps and structs of them", t)
	}
	return p, nil
}

func (c *compiler) sequence(p *plan, t reflect.Type) error {
	p.layout = "[]"
	if t.Kind() == reflect.Array {
		p.length = t.Len()
		p.layout = "[" + strconv.Itoa(p.length) + "]"
	}
	elem, err := c.compile(t.Elem())
	if err != nil {
		return within("[]", err)
	}
	if t.Elem().Size() == 0 {
		return within("[]", errorf("a value of type %.100v has no content; slices and arrays of such values cannot be encoded", t.Elem()))
	}
	if p.length >= 0 && t.Size() > maxArray {
		return errorf("an array of %d bytes cannot be encoded; use a slice", t.Size())
	}
	p.layout += elem.layout
	var isNumber bool
	if p.number, isNumber = numberOf(elem.kind); isNumber {
		p.form, p.min = typed, 3
		if p.length > 0 {
			n := p.length * p.number.width
			p.min = 2 + headSize(uint64(n)) + n
		}
		return nil
	}
	p.form, p.elem, p.min = list, elem, 1
	if p.length > 0 {
		p.min = headSize(uint64(p.length)) + p.length*elem.min
	}
	return nil
}

func (c *compiler) mapping(p *plan, t reflect.Type) (err error) {
	p.form = mapping
	if p.key, err = c.compile(t.Key()); err != nil {
		return within("[key]", err)
	}
	if p.key.form != text && p.key.form != signed && p.key.form != natural {
		return errorf("a map with keys of type %v cannot be encoded; expected text or integers", t.Key())
	}
	if p.elem, err = c.compile(t.Elem()); err != nil {
		return within("[]", err)
	}
	p.layout = "map[" + p.key.layout + "]" + p.elem.layout
	return nil
}

func (c *compiler) record(p *plan, t reflect.Type) error {
	p.form = record
	p.min = headSize(uint64(t.NumField()))
	var layouts []string
	for i := range t.NumField() {
		f := t.Field(i)
		step := "." + f.Name
		if !f.IsExported() {
			return within(step, errorf("an unexported field cannot be encoded; start its name with a capital letter"))
		}
		q, err := c.compile(f.Type)
		if err != nil {
			return within(step, err)
		}
		key := appendText(nil, f.Name)
		p.fields = append(p.fields, field{i, f.Name, key, q})
		p.min += len(key) + q.min
		layouts = append(layouts, f.Name+" "+q.layout)
	}
	p.layout = "struct{" + strings.Join(layouts, "; ") + "}"
	sort.Slice(p.fields, func(i, j int) bool { return bytes.Compare(p.fields[i].key, p.fields[j].key) < 0 })
	return nil
}

// index is the step of a path to an element.
func index(i int) string { return "[" + strconv.Itoa(i) + "]" }
