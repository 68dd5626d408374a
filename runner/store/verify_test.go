package store

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

func TestVerify(t *testing.T) {
	s := open(t)
	if hints, errs, err := s.Verify(nil); len(hints)+len(errs) > 0 || err != nil {
		t.Errorf("an empty store: %v, %v, %v", hints, errs, err)
	}
	h := put(t, s, "good", "to be damaged", "to be lost", "to be zeroed")
	for i, x := range h {
		if err := s.SetRecord(record(string(rune('a'+i)), "depth", x)); err != nil {
			t.Fatal(err)
		}
	}
	var last, total, calls int
	progress := func(d, n int) {
		calls++
		if d != last+1 {
			t.Errorf("progress went from %d to %d", last, d)
		}
		last, total = d, n
	}
	if hints, errs, err := s.Verify(progress); len(hints)+len(errs) > 0 || err != nil {
		t.Errorf("a good store: %v, %v, %v", hints, errs, err)
	}
	if last != 8 || total != 8 || calls != 8 {
		t.Errorf("progress ended at %d of %d after %d calls", last, total, calls)
	}

	replace(t, s.objectPath(h[1]), []byte("to bX damaged"))
	replace(t, s.objectPath(h[3]), make([]byte, len("to be zeroed")))
	if err := os.Remove(s.objectPath(h[2])); err != nil {
		t.Fatal(err)
	}
	replace(t, s.recordPath(KeyOf("a")), []byte("rimlight"))
	for _, stray := range []string{"objects/notes.txt", "objects/aa/" + h[0].String() + ".bak", "records/x", "damaged/d", "tmp/new-1", "tmp/new-2"} {
		if err := os.MkdirAll(filepath.Join(s.dir, filepath.Dir(stray)), 0o777); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(s.dir, stray), nil, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	old := time.Now().Add(-2 * leftOver)
	if err := os.Chtimes(filepath.Join(s.dir, "tmp/new-1"), old, old); err != nil {
		t.Fatal(err)
	}
	list := func() map[string]bool {
		all := map[string]bool{}
		for _, kind := range []string{"objects", "records", "damaged", "tmp"} {
			for _, p := range tree(t, s, kind) {
				all[p] = true
			}
		}
		return all
	}
	before := list()
	hints, errs, err := s.Verify(nil)
	if err != nil {
		t.Fatal(err)
	}
	says := func(kind string, got []error, want ...string) {
		t.Helper()
		if len(got) != len(want) {
			t.Errorf("%d %s, expected %d: %v", len(got), kind, len(want), got)
		}
		for _, w := range want {
			found := false
			for _, g := range got {
				found = found || strings.Contains(g.Error(), w)
			}
			if !found {
				t.Errorf("no %s says %q: %v", kind, w, got)
			}
		}
	}
	says("hint", hints, "notes.txt does not belong", ".bak does not belong", "records/x does not belong", "damaged/d was set aside", "new-1 was left by a run")
	says("error", errs, s.objectPath(h[1])+" is damaged", s.objectPath(h[3])+" is damaged", s.recordPath(KeyOf("a"))+" is of no use",
		"the result depth, "+h[2].Short()+", of the record")
	if len(list()) != len(before) {
		t.Error("verifying changed the store")
	}
	var damaged *DamagedError
	if !errors.As(errs[0], &damaged) && !errors.As(errs[1], &damaged) {
		t.Error("damage has no type")
	}

	// with the clock set back, a file may be younger than now
	s.now = func() time.Time { return old.Add(-time.Hour) }
	hints, _, err = s.Verify(nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, h := range hints {
		if strings.Contains(h.Error(), "was left") {
			t.Errorf("with the clock set back: %v", h)
		}
	}
}
