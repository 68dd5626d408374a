package engine

import (
	"errors"
	"fmt"

	"rimlight/runner/canon"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// A tray takes the objects that a worker gives, one after another. Much of them
// goes into the store at once, little stays in memory, to be kept together with
// what others give.
type tray struct {
	store  *store.Store
	now    *store.Draft // the object that is coming in
	drafts []*store.Draft
	size   int // bytes that drafts hold
	parts  []part
	layout []string // of each part
}

// trayful is how many bytes stay in memory, and draftOverhead what counts for a
// draft besides its content.
const (
	trayful       = 16 << 20
	draftOverhead = 1 << 10
)

// Part adds to the object that is coming in. Its envelope is in the first part.
func (t *tray) Part(b []byte) error {
	if t.now == nil {
		_, layout, _, err := canon.Open(b)
		if err != nil {
			return fmt.Errorf("the worker's answer is malformed: %w", err)
		}
		if n := len(t.layout); n > 0 && t.layout[n-1] == layout {
			layout = t.layout[n-1] // the same memory
		}
		t.now, t.layout = t.store.NewDraft(), append(t.layout, layout)
	}
	_, err := t.now.Write(b)
	return err
}

// End ends an object.
func (t *tray) End() error {
	if t.now == nil {
		return errors.New("the worker's answer is malformed: an object without content")
	}
	t.parts = append(t.parts, part{t.now.Hash(), t.now.Size()})
	t.drafts, t.size, t.now = append(t.drafts, t.now), t.size+t.now.Held()+draftOverhead, nil
	if t.size < trayful {
		return nil
	}
	drafts := t.drafts
	t.drafts, t.size = nil, 0
	return t.store.PutDrafts(drafts)
}

// clear discards what came in.
func (t *tray) clear() {
	for _, d := range append(t.drafts, t.now) {
		if d != nil {
			d.Discard()
		}
	}
	*t = tray{store: t.store}
}

// values gives the values that the objects make up, and adds the objects that
// name the elements of lists.
func (t *tray) values(results []worker.Result) ([]Value, error) {
	var out []Value
	next := 0
	for _, r := range results {
		list := worker.IsList(r.Layout)
		layout := r.Layout
		if list {
			layout = layout[len("[]"):]
		}
		n := r.Objects
		if n < 0 || n > len(t.parts)-next || !list && n != 1 || n > worker.MaxElements {
			return nil, fmt.Errorf("the worker's answer is malformed: %d objects for a result of type %s", n, r.Type)
		}
		for _, l := range t.layout[next : next+n] {
			if l != layout {
				return nil, fmt.Errorf("the worker's answer is malformed: an object of layout %.200s for a result of type %s", l, r.Type)
			}
		}
		parts := t.parts[next : next+n]
		next += n
		if !list {
			out = append(out, Value{Type: r.Type, Layout: r.Layout, Hash: parts[0].hash, Size: parts[0].size})
			continue
		}
		v, b := listOf(r.Type, r.Layout, parts)
		d := t.store.NewDraft()
		if _, err := d.Write(b); err != nil {
			return nil, err
		}
		t.drafts, t.size = append(t.drafts, d), t.size+d.Held()
		out = append(out, v)
	}
	if next != len(t.parts) {
		return nil, fmt.Errorf("the worker's answer is malformed: %d objects, of which its results take %d", len(t.parts), next)
	}
	return out, nil
}
