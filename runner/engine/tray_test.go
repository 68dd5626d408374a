package engine

import (
	"bytes"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/canon"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

func newTray(t *testing.T) *tray {
	t.Helper()
	s, err := store.Open(filepath.Join(t.TempDir(), "store"))
	if err != nil {
		t.Fatal(err)
	}
	return &tray{store: s}
}

// object is a text, in its envelope, as a worker sends it.
func object(t *testing.T, text string) []byte {
	t.Helper()
	b, err := canon.Marshal(text)
	if err != nil {
		t.Fatal(err)
	}
	return canon.Seal("string", "string", b)
}

func (t *tray) object(parts ...[]byte) error {
	for _, p := range parts {
		if err := t.Part(p); err != nil {
			return err
		}
	}
	return t.End()
}

func TestTray(t *testing.T) {
	tr := newTray(t)
	long := object(t, strings.Repeat("x", 5<<20))
	want := [][]byte{object(t, "a"), object(t, "b"), object(t, "c"), long, long, long, long, long}
	for _, b := range want {
		if err := tr.object(b[:len(b)-1], b[len(b)-1:]); err != nil {
			t.Fatal(err)
		}
	}
	if tr.size > trayful {
		t.Errorf("%d bytes are in memory", tr.size)
	}
	values, err := tr.values([]worker.Result{{Type: "string", Layout: "string", Objects: 1}, {Type: "[]string", Layout: "[]string", Objects: 7}, {Type: "[]string", Layout: "[]string"}})
	if err != nil {
		t.Fatal(err)
	}
	if err := tr.store.PutDrafts(tr.drafts); err != nil {
		t.Fatal(err)
	}
	if len(values) != 3 || values[0].Len() != -1 || values[1].Len() != 7 || values[2].Len() != 0 {
		t.Fatalf("got %+v", values)
	}
	for i, v := range append([]Value{values[0]}, func() []Value { e, _ := elements(tr.store, values[1]); return e }()...) {
		if b, err := sealed(tr.store, v); err != nil || !bytes.Equal(b, want[i]) {
			t.Errorf("object %d came back as %d bytes (%v)", i, len(b), err)
		}
	}
	// The whole list, read at once, is what it would be without a store.
	list := make([]string, 0, 7)
	for _, b := range want[1:] {
		var text string
		_, _, data, _ := canon.Open(b)
		if err := canon.Unmarshal(data, &text); err != nil {
			t.Fatal(err)
		}
		list = append(list, text)
	}
	data, err := canon.Marshal(list)
	if err != nil {
		t.Fatal(err)
	}
	if b, err := sealed(tr.store, values[1]); err != nil || !bytes.Equal(b, canon.Seal("[]string", "[]string", data)) || int64(len(b)) > values[1].sealedSize() {
		t.Errorf("the list came back as %d bytes, of at most %d (%v)", len(b), values[1].sealedSize(), err)
	}
}

// TestTrayRefuses holds that objects which do not make up the results are told.
func TestTrayRefuses(t *testing.T) {
	text := worker.Result{Type: "string", Layout: "string", Objects: 1}
	for name, results := range map[string][]worker.Result{
		"left over":         {text},
		"too few":           {text, text, text},
		"not one":           {{Type: "string", Layout: "string", Objects: 2}},
		"negative":          {{Type: "[]string", Layout: "[]string", Objects: -1}, text, text},
		"of another layout": {text, {Type: "int", Layout: "int", Objects: 1}},
		"too many":          {{Type: "[]string", Layout: "[]string", Objects: worker.MaxElements + 1}},
	} {
		tr := newTray(t)
		for range 2 {
			if err := tr.object(object(t, "a")); err != nil {
				t.Fatal(err)
			}
		}
		if _, err := tr.values(results); err == nil || !strings.Contains(err.Error(), "malformed") {
			t.Errorf("%s: %v", name, err)
		}
	}
	tr := newTray(t)
	if err := tr.object([]byte("nonsense")); err == nil {
		t.Error("an object without an envelope was taken")
	}
	if err := newTray(t).End(); err == nil {
		t.Error("an object without content was taken")
	}
}
