package store

import (
	"bytes"
	"errors"
	"math"
	"strings"
	"testing"
)

func TestLimit(t *testing.T) {
	s := open(t)
	put(t, s, strings.Repeat("a", 600))
	s, err := Open(s.dir)
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Limit(0, 1000); err != nil {
		t.Fatal(err)
	}
	put(t, s, strings.Repeat("b", 300), strings.Repeat("a", 600)) // of which one is there
	var full *RoomError
	if _, err := s.Put(bytes.Repeat([]byte("c"), 101)); !errors.As(err, &full) || full.Used != 900 || full.Need != 101 {
		t.Errorf("more than there may be: %v", err)
	}
	put(t, s, strings.Repeat("d", 100))
	if err := s.Limit(0, 1000); err != nil {
		t.Fatal(err)
	}
	d := s.NewDraft() // as it grows, and not only when it is complete
	for size := 0; err == nil && size < 2*spill; size += spill / 4 {
		_, err = d.Write(make([]byte, spill/4))
	}
	if d.Discard(); !errors.As(err, &full) {
		t.Errorf("a long draft: %v", err)
	}
	put(t, s, strings.Repeat("d", 100))
	if err := s.Limit(math.MaxInt64/2, 0); err != nil {
		t.Fatal(err)
	}
	if _, known := free(s.dir); known {
		if _, err := s.Put([]byte("e")); !errors.As(err, &full) || !strings.Contains(err.Error(), "(--reserve)") {
			t.Errorf("more than is to stay free: %v", err)
		}
	}
	put(t, s, strings.Repeat("d", 100))
	if left := tree(t, s, "tmp"); len(left) > 0 {
		t.Errorf("left are %v", left)
	}
}
