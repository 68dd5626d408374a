package store

import (
	"bytes"
	"errors"
	"io"
	"os"
	"testing"
)

func TestDraft(t *testing.T) {
	s := open(t)
	small, large := []byte("depth"), bytes.Repeat([]byte("spectrum "), spill/4)
	var drafts []*Draft
	var want [][]byte
	for _, b := range [][]byte{small, large, nil, large} {
		d := s.NewDraft()
		for rest := b; len(rest) > 0; {
			n := min(len(rest), 100_000)
			if _, err := d.Write(rest[:n]); err != nil {
				t.Fatal(err)
			}
			rest = rest[n:]
		}
		if d.Size() != int64(len(b)) || d.Hash() != HashOf(b) || d.Held() > spill {
			t.Errorf("%d bytes, %d of them held, expected %d", d.Size(), d.Held(), len(b))
		}
		drafts, want = append(drafts, d), append(want, b)
	}
	if n := len(tree(t, s, "tmp")); n != 2 {
		t.Errorf("%d temporary files, expected those of the large drafts", n)
	}
	if err := s.PutDrafts(drafts); err != nil {
		t.Fatal(err)
	}
	for _, b := range want {
		if got, err := s.Get(HashOf(b)); err != nil || !bytes.Equal(got, b) {
			t.Errorf("%d bytes came back as %d (%v)", len(b), len(got), err)
		}
	}
	// the folder is deleted between writing and putting
	d := s.NewDraft()
	other := append([]byte("another "), large...)
	d.Write(other)
	if err := os.RemoveAll(s.dir); err != nil {
		t.Fatal(err)
	}
	if err := s.PutDrafts([]*Draft{d}); err != nil {
		t.Fatal(err)
	}
	if got, err := s.Get(HashOf(other)); err != nil || !bytes.Equal(got, other) {
		t.Errorf("after the store was deleted: %d bytes (%v)", len(got), err)
	}
	d = s.NewDraft()
	d.Write(large)
	d.Discard()
	if n := len(tree(t, s, "tmp")); n != 0 {
		t.Errorf("%d temporary files are left", n)
	}
}

func TestDraftFault(t *testing.T) {
	for name, fault := range faults {
		s := open(t)
		if _, err := s.Put([]byte("before")); err != nil {
			t.Fatal(err)
		}
		fault.set(&s.files)
		d := s.NewDraft()
		_, err := d.Write(make([]byte, spill+1))
		if e := s.PutDrafts([]*Draft{d}); err == nil {
			err = e
		}
		if err == nil || fault.want != nil && !errors.Is(err, fault.want) {
			t.Errorf("%s: %v", name, err)
		}
		if n := len(tree(t, s, "tmp")) + len(tree(t, s, "objects")); n != 1 {
			t.Errorf("%s: %d files are there, expected one", name, n)
		}
	}
}

// TestCopyFault holds that the fault of whoever is copied to is not put down to
// the object.
func TestCopyFault(t *testing.T) {
	s := open(t)
	h, err := s.Put([]byte("depth"))
	if err != nil {
		t.Fatal(err)
	}
	r, w := io.Pipe()
	r.Close()
	if err := s.Copy(w, h); err != io.ErrClosedPipe || !s.Has(h) {
		t.Errorf("got %v", err)
	}
}
