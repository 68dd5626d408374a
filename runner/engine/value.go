package engine

import (
	"bufio"
	"bytes"
	"fmt"
	"strconv"
	"strings"

	"rimlight/runner/canon"
	"rimlight/runner/store"
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
	if !isList(v.Layout) {
		return -1
	}
	return len(v.parts)
}

// isList reports whether values of the layout are kept as lists.
func isList(layout string) bool {
	elem, ok := strings.CutPrefix(layout, "[]")
	return ok && (strings.HasPrefix(elem, "struct") || elem == "string")
}

// maxElements is how many elements a list may have, and a collection that a
// step runs over: each of them is a file in the store.
const maxElements = 100000

// split takes a slice apart into the bytes of its elements.
func split(elem string, data []byte) ([][]byte, error) {
	n, err := canon.Len(elem, data)
	if err != nil {
		return nil, err
	}
	if n > maxElements {
		return nil, fmt.Errorf("a slice of %d elements of type %s: a step runs over at most %d, and no longer slice of structures or texts is kept; use slices of numbers for mass data",
			n, elem, maxElements)
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
	if !isList(layout) {
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
	if !isList(r.Layout) {
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

// sealed reads a value's bytes, in their envelope, verified.
func sealed(s *store.Store, v Value) ([]byte, error) {
	if !isList(v.Layout) {
		return s.Get(v.Hash)
	}
	items := make([][]byte, len(v.parts))
	var flaws []error // all of them, so that they are mended together
	for i, p := range v.parts {
		b, err := s.Get(p.hash)
		if err == nil {
			_, _, items[i], err = canon.Open(b)
		}
		if damaged(err) {
			flaws = append(flaws, err)
		} else if err != nil {
			return nil, err
		}
	}
	if len(flaws) > 0 {
		return nil, damages(flaws)
	}
	data, err := canon.Join(v.Layout[len("[]"):], items)
	if err != nil {
		return nil, err
	}
	return canon.Seal(v.Type, v.Layout, data), nil
}

// elements are the elements of a collection, each as a value of its own. The
// elements of a slice of numbers, which is one object, are taken out and kept.
func elements(s *store.Store, v Value) ([]Value, error) {
	typ, elem := strings.TrimPrefix(v.Type, "[]"), strings.TrimPrefix(v.Layout, "[]")
	if isList(v.Layout) {
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
	if isList(elem) {
		for i, item := range items {
			if out[i], err = putSealed(s, canon.Seal(typ, elem, item)); err != nil {
				return nil, err
			}
		}
		return out, nil
	}
	objects := make([][]byte, len(items))
	for i, item := range items {
		objects[i] = canon.Seal(typ, elem, item)
	}
	hashes, err := s.PutBatch(objects)
	if err != nil {
		return nil, err
	}
	for i, b := range objects {
		out[i] = Value{Type: typ, Layout: elem, Hash: hashes[i], Size: int64(len(b))}
	}
	return out, nil
}

// collect puts the results of a fan-out together, in the order of elements.
func collect(s *store.Store, typ, layout string, items []Value) (Value, error) {
	typ, whole := "[]"+typ, "[]"+layout
	if isList(whole) {
		parts := make([]part, len(items))
		for i, v := range items {
			parts[i] = part{v.Hash, v.Size}
		}
		v, list := listOf(typ, whole, parts)
		_, err := s.Put(list)
		return v, err
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
