package store

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

func open(t testing.TB) *Store {
	t.Helper()
	s, err := Open(filepath.Join(t.TempDir(), "store"))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// tree lists the files below a folder of the store.
func tree(t testing.TB, s *Store, kind string) []string {
	t.Helper()
	paths, err := s.list(kind)
	if err != nil {
		t.Fatal(err)
	}
	return paths
}

func TestOpen(t *testing.T) {
	s := open(t)
	h, err := s.Put([]byte("depth"))
	if err != nil {
		t.Fatal(err)
	}
	again, err := Open(s.dir)
	if err != nil || !again.Has(h) {
		t.Errorf("opened again: %v", err)
	}
	if b, err := os.ReadFile(filepath.Join(s.dir, "rimlight-store")); err != nil || string(b) != "rimlight result store, format 1\n" {
		t.Errorf("mark %q, %v", b, err)
	}
	if b, err := os.ReadFile(filepath.Join(s.dir, "README.txt")); err != nil || !strings.Contains(string(b), "rimlight") {
		t.Errorf("README %q, %v", b, err)
	}
}

func TestOpenRefuses(t *testing.T) {
	for _, c := range []struct{ name, file, content, want string }{
		{"later format", markFile, "rimlight result store, format 2\n", "has format 2, but this program knows format 1 only: choose another folder with --store, or use the program that made it"},
		{"damaged mark", markFile, "rimlight result store, format \x00\n", `should begin with "rimlight result store, format "`},
		{"empty mark", markFile, "", `should begin with "rimlight result store, format "`},
		{"someone's README", readmeFile, "my thesis", "is no result store, and not empty (it has README.txt)"},
		{"someone's file", "tmp", "my thesis", "is no result store, and not empty (it has tmp)"},
		{"someone's folder", "thesis.tex", "", "is no result store, and not empty (it has thesis.tex): choose another folder"},
	} {
		dir := t.TempDir()
		if err := os.WriteFile(filepath.Join(dir, c.file), []byte(c.content), 0o644); err != nil {
			t.Fatal(err)
		}
		if _, err := Open(dir); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v; expected %s", c.name, err, c.want)
		}
		if entries, _ := os.ReadDir(dir); len(entries) != 1 {
			t.Errorf("%s: the folder was changed", c.name)
		}
	}
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o644); err != nil {
		t.Fatal(err)
	}
	for _, dir := range []string{"", file} {
		if _, err := Open(dir); err == nil {
			t.Errorf("%q was opened", dir)
		}
	}
}

// TestMark damages or removes the mark of a store, or the text beside it, and
// holds that the store can still be opened, that verifying tells, and that its
// use mends it; but not when both are damaged, or the mark is that of another
// format.
func TestMark(t *testing.T) {
	for _, c := range []struct {
		name, mark, text string
		opens            bool
	}{
		{"sound", markContent, readme, true},
		{"another digit", "rimlight result store, format 3\n", readme, true},
		{"another letter", "rimlight result stoze, format 1\n", readme, true},
		{"empty mark", "", readme, true},
		{"no mark", "none", readme, true},
		{"damaged text", markContent, readme[1:], true},
		{"no text", markContent, "none", true},
		{"both damaged", "rimlight result stoze, format 1\n", readme[1:], false},
		{"another format", "rimlight result store, format 2\n", strings.Replace(readme, "format 1", "format 2", 1), false},
		{"mark lost and text damaged", "none", readme[1:], false},
	} {
		s := open(t)
		h := put(t, s, "depth")[0]
		for name, text := range map[string]string{markFile: c.mark, readmeFile: c.text} {
			path := filepath.Join(s.dir, name)
			if text == "none" {
				if err := os.Remove(path); err != nil {
					t.Fatal(err)
				}
				continue
			}
			replace(t, path, []byte(text))
		}
		again, err := Open(s.dir)
		if (err == nil) != c.opens {
			t.Errorf("%s: %v", c.name, err)
		}
		if err != nil {
			continue
		}
		_, errs, err := again.Verify(nil)
		if sound := c.name == "sound" || c.name == "no mark"; err != nil || (len(errs) == 0) != sound {
			t.Errorf("%s: verifying says %v, %v", c.name, errs, err)
		}
		release, notes, err := again.Use(t.Context())
		if err != nil || len(notes) != len(errs) {
			t.Errorf("%s: using it says %q, %v; verifying %v", c.name, notes, err, errs)
		}
		release()
		if hints, errs, err := again.Verify(nil); len(hints)+len(errs) > 0 || err != nil || !again.Has(h) {
			t.Errorf("%s: after that, verifying says %v, %v, %v", c.name, hints, errs, err)
		}
	}
}

// TestOpenAfterInterruption opens a folder in which somebody was stopped while
// making a store.
func TestOpenAfterInterruption(t *testing.T) {
	dir := t.TempDir()
	if err := os.MkdirAll(filepath.Join(dir, "tmp"), 0o777); err != nil {
		t.Fatal(err)
	}
	for name, text := range map[string]string{"tmp/new-1": "half", readmeFile: readme} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	s, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.Put([]byte("depth")); err != nil {
		t.Error(err)
	}
}

// TestDeleted deletes a store, or a part of it, while it is open.
func TestDeleted(t *testing.T) {
	for _, part := range []string{"", "tmp", "objects", "records"} {
		s := open(t)
		h := put(t, s, "depth")[0]
		if err := s.SetRecord(record("key", "depth", h)); err != nil {
			t.Fatal(err)
		}
		if err := os.RemoveAll(filepath.Join(s.dir, part)); err != nil {
			t.Fatal(err)
		}
		if h := put(t, s, "depth")[0]; !s.Has(h) {
			t.Errorf("%q was deleted: an object could not be put", part)
		}
		if err := s.SetRecord(record("key", "depth", h)); err != nil {
			t.Errorf("%q was deleted: %v", part, err)
		}
		again, err := Open(s.dir)
		if err != nil {
			t.Errorf("%q was deleted: it cannot be opened again: %v", part, err)
			continue
		}
		if _, ok, err := again.Record(KeyOf("key")); !ok || err != nil {
			t.Errorf("%q was deleted: %v, %v", part, ok, err)
		}
		if hints, errs, err := again.Verify(nil); len(hints)+len(errs) > 0 || err != nil {
			t.Errorf("%q was deleted: %v, %v, %v", part, hints, errs, err)
		}
	}
}

// TestForeignAppears has another process make the store, and use it, after this
// one has seen that there is none.
func TestForeignAppears(t *testing.T) {
	s := open(t)
	put(t, s, "depth")
	late := &Store{dir: s.dir, files: realFiles, durable: map[string]bool{}}
	if err := late.create(); err != nil {
		t.Error(err)
	}
}

func TestOpenAtOnce(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a", "store")
	var group sync.WaitGroup
	for range 8 {
		group.Go(func() {
			if s, err := Open(dir); err != nil {
				t.Error(err)
			} else if _, err := s.Put([]byte("depth")); err != nil {
				t.Error(err)
			}
		})
	}
	group.Wait()
}

func TestNames(t *testing.T) {
	// FIPS 180-4 example: SHA-256 of "abc"
	const abc = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
	h := HashOf([]byte("abc"))
	if h.String() != abc || h.Short() != abc[:12] || KeyOf("abc").String() != abc {
		t.Errorf("%s, %s", h, h.Short())
	}
	if got, err := ParseHash(abc); err != nil || got != h {
		t.Errorf("%v, %v", got, err)
	}
	for _, s := range []string{"", abc[:63], abc + "0", strings.ToUpper(abc), " " + abc[1:], abc[:62] + "zz", abc + abc} {
		if got, err := ParseHash(s); err == nil || got != (Hash{}) {
			t.Errorf("ParseHash(%q) = %v, %v", s, got, err)
		}
		if _, err := ParseKey(s); err == nil {
			t.Errorf("ParseKey(%q) was accepted", s)
		}
	}
}

// TestReadOnly uses a store in folders that may not be written to.
func TestReadOnly(t *testing.T) {
	s := open(t)
	h, err := s.Put([]byte("depth"))
	if err != nil {
		t.Fatal(err)
	}
	r := record("key", "depth", h)
	if err := s.SetRecord(r); err != nil {
		t.Fatal(err)
	}
	makeReadOnly(t, s.dir)

	s, err = Open(s.dir)
	if err != nil {
		t.Fatal(err)
	}
	if b, err := s.Get(h); err != nil || string(b) != "depth" {
		t.Errorf("%q, %v", b, err)
	}
	if _, ok, err := s.Record(r.Key); !ok || err != nil {
		t.Errorf("%v, %v", ok, err)
	}
	if _, err := s.Put([]byte("other")); err == nil || !strings.Contains(err.Error(), "cannot be written to: choose another folder with --store") {
		t.Errorf("put: %v", err)
	}
	if err := s.SetRecord(record("other key", "depth", h)); err == nil || !strings.Contains(err.Error(), "cannot be written to") {
		t.Errorf("set: %v", err)
	}
	if _, err := s.Put([]byte("depth")); err != nil {
		t.Errorf("put of what is there: %v", err)
	}
}

func TestMissing(t *testing.T) {
	s := open(t)
	h := HashOf([]byte("depth"))
	if _, err := s.Get(h); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("%v is not fs.ErrNotExist", err)
	}
	if s.Has(h) {
		t.Error("an object that was never put is there")
	}
}
