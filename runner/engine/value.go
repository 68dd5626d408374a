package engine

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"strconv"
	"strings"

	"rimlight/runner/canon"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// A Value is a result in the store: its Go type, the layout of its bytes, and
// the hash of the object that holds it.
//
// A slice of structures or texts is kept as a list: an object that names the
// objects of its elements. Equal elements are then kept once, a
// fan-out takes its elements one by one without reading the rest, and what it
// gives is put together by naming.
type Value struct {
	Type   string
	Layout string
	Hash   store.Hash
	Size   int64 // bytes of the content, elements included
	parts  []part
}

type part struct {
	hash store.Hash
	size int64
}

// Len is the number of elements of a list, -1 for a value that is none.
func (v Value) Len() int {
	if !worker.IsList(v.Layout) {
		return -1
	}
	return len(v.parts)
}

// split takes a slice apart into the bytes of its elements.
func split(elem string, data []byte) ([][]byte, error) {
	n, err := canon.Len(elem, data)
	if err != nil {
		return nil, err
	}
	if n > worker.MaxElements {
		return nil, fmt.Errorf("a slice of %d elements of type %s: a step runs over at most %d, and no longer slice of structures or texts is kept; use slices of numbers for mass data",
			n, elem, worker.MaxElements)
	}
	return canon.Split(elem, data)
}

const listMark = "rimlight list 1\n"

// arrange gives the value that came from a worker in its envelope, and the
// objects that hold it, which have yet to be put into the store.
func arrange(sealed []byte) (Value, [][]byte, error) {
	typ, layout, data, err := canon.Open(sealed)
	if err != nil {
		return Value{}, nil, err
	}
	if !worker.IsList(layout) {
		return Value{Type: typ, Layout: layout, Hash: store.HashOf(sealed), Size: int64(len(sealed))}, [][]byte{sealed}, nil
	}
	elem := layout[len("[]"):]
	items, err := split(elem, data)
	if err != nil {
		return Value{}, nil, err
	}
	objects := make([][]byte, 0, len(items)+1)
	parts := make([]part, len(items))
	for i, item := range items {
		b := canon.Seal(strings.TrimPrefix(typ, "[]"), elem, item)
		objects = append(objects, b)
		parts[i] = part{store.HashOf(b), int64(len(b))}
	}
	v, list := listOf(typ, layout, parts)
	return v, append(objects, list), nil
}

// putSealed keeps a value that came from a worker.
func putSealed(s *store.Store, sealed []byte) (Value, error) {
	v, objects, err := arrange(sealed)
	if err != nil {
		return Value{}, err
	}
	_, err = s.PutBatch(objects)
	return v, err
}

// listOf gives the value that a list of parts is, and the object that names
// them.
func listOf(typ, layout string, parts []part) (Value, []byte) {
	var b bytes.Buffer
	fmt.Fprintf(&b, "%stype %s\nlayout %s\n", listMark, typ, layout)
	size := int64(0)
	for _, p := range parts {
		fmt.Fprintf(&b, "%s %d\n", p.hash, p.size)
		size += p.size
	}
	return Value{Type: typ, Layout: layout, Hash: store.HashOf(b.Bytes()), Size: size, parts: parts}, b.Bytes()
}

// known takes up a value that a record names. Of a list, the object that names
// the elements is read; elements are read when they are needed.
func known(s *store.Store, r store.Result) (Value, error) {
	v := Value{Type: r.Type, Layout: r.Layout, Hash: r.Hash, Size: r.Size}
	if !worker.IsList(r.Layout) {
		if !s.Has(r.Hash) {
			return Value{}, fmt.Errorf("object %s is missing", r.Hash.Short())
		}
		return v, nil
	}
	b, err := s.Get(r.Hash)
	if err != nil {
		return Value{}, err
	}
	if v.parts, err = parseList(b); err != nil {
		return Value{}, fmt.Errorf("object %s: %w", r.Hash.Short(), err)
	}
	for _, p := range v.parts {
		if !s.Has(p.hash) {
			return Value{}, fmt.Errorf("object %s is missing", p.hash.Short())
		}
	}
	return v, nil
}

func parseList(b []byte) ([]part, error) {
	if !bytes.HasPrefix(b, []byte(listMark)) {
		return nil, fmt.Errorf("not a list of results")
	}
	var parts []part
	sc := bufio.NewScanner(bytes.NewReader(b[len(listMark):]))
	sc.Buffer(nil, 16<<20)
	for n := 0; sc.Scan(); n++ {
		if n < 2 {
			continue // type and layout, which the record has too
		}
		hash, size, ok := strings.Cut(sc.Text(), " ")
		h, err := store.ParseHash(hash)
		if err != nil || !ok {
			return nil, fmt.Errorf("malformed list entry %q", sc.Text())
		}
		n, err := strconv.ParseInt(size, 10, 64)
		if err != nil {
			return nil, fmt.Errorf("malformed list entry %q", sc.Text())
		}
		parts = append(parts, part{h, n})
	}
	return parts, sc.Err()
}

// sealedSize is at least the number of bytes of a value in its envelope.
func (v Value) sealedSize() int64 {
	if !worker.IsList(v.Layout) {
		return v.Size
	}
	return v.Size + int64(len(canon.Seal(v.Type, v.Layout, nil))) + 9
}

// write writes a value, in its envelope, as it is read and verified. After an
// error what was written is of no use.
func (v Value) write(w io.Writer, s *store.Store) error {
	if !worker.IsList(v.Layout) {
		return s.Copy(w, v.Hash)
	}
	items := make([]Value, len(v.parts))
	for i, p := range v.parts {
		items[i] = Value{Layout: v.Layout[len("[]"):], Hash: p.hash}
	}
	return writeJoined(w, s, v.Type, v.Layout, items)
}

// writeJoined writes the slice of some values, none of which is a number, in
// its envelope.
func writeJoined(w io.Writer, s *store.Store, typ, layout string, items []Value) error {
	if _, err := w.Write(append(canon.Seal(typ, layout, nil), canon.ListHead(len(items))...)); err != nil {
		return err
	}
	var flaws []error // all of them, so that they are mended together
	for _, v := range items {
		o := opener{w: w}
		err := v.write(&o, s)
		switch {
		case damaged(err):
			flaws, w = append(flaws, err), io.Discard
		case err != nil:
			return err
		case o.head != nil:
			return fmt.Errorf("object %s holds no value", v.Hash.Short())
		}
	}
	if len(flaws) > 0 {
		return damages(flaws)
	}
	return nil
}

// An opener passes on what is in an envelope.
type opener struct {
	w    io.Writer
	open bool
	head []byte // what came of the envelope so far
}

func (o *opener) Write(b []byte) (int, error) {
	n := len(b)
	if !o.open {
		o.head = append(o.head, b...)
		_, _, content, err := canon.Open(o.head)
		if err != nil && len(o.head) < maxEnvelope {
			return n, nil // it may come
		}
		if err != nil {
			return 0, err
		}
		b, o.open, o.head = content, true, nil
	}
	_, err := o.w.Write(b)
	return n, err
}

// maxEnvelope is more bytes than an envelope takes.
const maxEnvelope = 1 << 20

// sealed reads a value's bytes, in their envelope, verified.
func sealed(s *store.Store, v Value) ([]byte, error) {
	if !worker.IsList(v.Layout) {
		return s.Get(v.Hash)
	}
	var b bytes.Buffer
	b.Grow(int(v.sealedSize()))
	if err := v.write(&b, s); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// elements are the elements of a collection, each as a value of its own. The
// elements of a slice of numbers, which is one object, are taken out and kept.
func elements(s *store.Store, v Value) ([]Value, error) {
	typ, elem := strings.TrimPrefix(v.Type, "[]"), strings.TrimPrefix(v.Layout, "[]")
	if worker.IsList(v.Layout) {
		out := make([]Value, len(v.parts))
		for i, p := range v.parts {
			out[i] = Value{Type: typ, Layout: elem, Hash: p.hash, Size: p.size}
		}
		return out, nil
	}
	b, err := s.Get(v.Hash)
	if err != nil {
		return nil, err
	}
	_, _, data, err := canon.Open(b)
	if err != nil {
		return nil, err
	}
	items, err := split(elem, data)
	if err != nil {
		return nil, err
	}
	out := make([]Value, len(items))
	if worker.IsList(elem) {
		for i, item := range items {
			if out[i], err = putSealed(s, canon.Seal(typ, elem, item)); err != nil {
				return nil, err
			}
		}
		return out, nil
	}
	for first := 0; first < len(items); {
		var objects [][]byte
		for n := 0; first+len(objects) < len(items) && n < maxTogetherBytes; n += len(objects[len(objects)-1]) {
			objects = append(objects, canon.Seal(typ, elem, items[first+len(objects)]))
		}
		hashes, err := s.PutBatch(objects)
		if err != nil {
			return nil, err
		}
		for i, b := range objects {
			out[first+i] = Value{Type: typ, Layout: elem, Hash: hashes[i], Size: int64(len(b))}
		}
		first += len(objects)
	}
	return out, nil
}

// collect puts the results of a fan-out together, in the order of elements.
func collect(s *store.Store, typ, layout string, items []Value) (Value, error) {
	typ, whole := "[]"+typ, "[]"+layout
	if worker.IsList(whole) {
		parts := make([]part, len(items))
		for i, v := range items {
			parts[i] = part{v.Hash, v.Size}
		}
		v, list := listOf(typ, whole, parts)
		_, err := s.Put(list)
		return v, err
	}
	if !canon.IsNumber(layout) {
		d := s.NewDraft()
		if err := writeJoined(d, s, typ, whole, items); err != nil {
			d.Discard()
			return Value{}, err
		}
		v := Value{Type: typ, Layout: whole, Hash: d.Hash(), Size: d.Size()}
		return v, s.PutDrafts([]*store.Draft{d})
	}
	data := make([][]byte, len(items))
	var flaws []error // all of them, so that they are mended together
	for i, v := range items {
		b, err := sealed(s, v)
		if err == nil {
			_, _, data[i], err = canon.Open(b)
		}
		if damaged(err) {
			flaws = append(flaws, err)
		} else if err != nil {
			return Value{}, err
		}
	}
	if len(flaws) > 0 {
		return Value{}, damages(flaws)
	}
	joined, err := canon.Join(layout, data)
	if err != nil {
		return Value{}, err
	}
	return putSealed(s, canon.Seal(typ, whole, joined))
}
