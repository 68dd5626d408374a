package store

import (
	"errors"
	"fmt"
	"os"
	"testing"
)

// TestSyncing holds that a batch is synced file by file, and folder by folder,
// unless everything is known to be on disk at once, and that a sync which fails
// is an error.
func TestSyncing(t *testing.T) {
	batch := make([][]byte, 3*manySyncs)
	for i := range batch {
		batch[i] = fmt.Appendf(nil, "object %d", i)
	}
	for _, certain := range []bool{false, true} {
		s := open(t)
		files, folders, asked := 0, 0, 0
		s.files.all = func(string) bool { asked++; return certain }
		s.files.sync = func(f *os.File) error {
			if st, err := f.Stat(); err == nil && st.IsDir() {
				folders++
			} else {
				files++
			}
			return nil
		}
		hashes, err := s.PutBatch(batch)
		if err != nil {
			t.Fatal(err)
		}
		for i, h := range hashes {
			if b, err := s.Get(h); err != nil || string(b) != string(batch[i]) {
				t.Errorf("object %d is %q, %v", i, b, err)
			}
		}
		if want := map[bool]int{false: len(batch), true: 0}[certain]; files != want || asked != 2 {
			t.Errorf("certain %v: %d files synced, expected %d; everything synced %d times, expected 2", certain, files, want, asked)
		}
		if folders == 0 {
			t.Errorf("certain %v: the folders that were made were not synced", certain)
		}
	}
	s := open(t)
	s.files.all = func(string) bool { return false }
	s.files.sync = func(*os.File) error { return errors.New("input/output error") }
	if _, err := s.PutBatch(batch); err == nil {
		t.Error("syncs failed, and nothing was said")
	}
}
