package store

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

func TestPutAndGet(t *testing.T) {
	s := open(t)
	for _, want := range [][]byte{nil, []byte("depth"), bytes.Repeat([]byte{0, 255}, 1<<20)} {
		h, err := s.Put(want)
		if err != nil {
			t.Fatal(err)
		}
		if got, err := s.Get(h); err != nil || !bytes.Equal(got, want) || h != HashOf(want) {
			t.Errorf("%d bytes came back as %d, %v", len(want), len(got), err)
		}
		path := filepath.Join(s.dir, "objects", h.String()[:2], h.String())
		st, err := os.Stat(path)
		if err != nil || st.Mode() != 0o444 {
			t.Errorf("%s: %v, %v", path, st, err)
		}
		if again, err := s.Put(want); err != nil || again != h {
			t.Errorf("put again: %v, %v", again, err)
		}
	}
	if n := len(tree(t, s, "tmp")); n != 0 {
		t.Errorf("%d temporary files are left", n)
	}
}

func TestPutBatch(t *testing.T) {
	s := open(t)
	if _, err := s.Put([]byte("7")); err != nil {
		t.Fatal(err)
	}
	data := [][]byte{[]byte("twice")}
	for i := range 40 {
		data = append(data, fmt.Append(nil, i))
	}
	data = append(data, []byte("twice"))
	hashes, err := s.PutBatch(data)
	if err != nil || len(hashes) != len(data) {
		t.Fatal(hashes, err)
	}
	for i, h := range hashes {
		if got, err := s.Get(h); err != nil || !bytes.Equal(got, data[i]) {
			t.Errorf("object %d: %q, %v", i, got, err)
		}
	}
	if n := len(tree(t, s, "objects")); n != 41 {
		t.Errorf("%d objects, expected 41", n)
	}
	if hashes, err := s.PutBatch(nil); err != nil || len(hashes) != 0 {
		t.Errorf("an empty batch: %v, %v", hashes, err)
	}
}

// TestDamage damages an object in every way, and puts it again.
func TestDamage(t *testing.T) {
	s := open(t)
	want := []byte("an object of some bytes")
	h, err := s.Put(want)
	if err != nil {
		t.Fatal(err)
	}
	damages := [][]byte{{}, make([]byte, len(want)), append(bytes.Clone(want), 0), []byte("another object")}
	for i := range want {
		flipped := bytes.Clone(want)
		flipped[i] ^= 1 << (i % 8)
		damages = append(damages, flipped, want[:i])
	}
	for n, damage := range damages {
		replace(t, s.objectPath(h), damage)
		_, err := s.Get(h)
		var d *DamagedError
		if !errors.As(err, &d) || d.Hash != h || d.Path != s.objectPath(h) {
			t.Fatalf("%q: %v", damage, err)
		}
		if kept, err := os.ReadFile(d.Aside); err != nil || !bytes.Equal(kept, damage) || filepath.Dir(d.Aside) != filepath.Join(s.dir, "damaged") {
			t.Errorf("%q was set aside in %q as %q, %v", damage, d.Aside, kept, err)
		}
		if _, err := s.Get(h); !errors.Is(err, fs.ErrNotExist) || s.Has(h) {
			t.Errorf("%q: it is still there: %v", damage, err)
		}
		if n%2 == 0 { // found by Put rather than by Get
			replace(t, s.objectPath(h), damage)
		}
		if _, err := s.Put(want); err != nil {
			t.Fatal(err)
		}
		if got, err := s.Get(h); err != nil || !bytes.Equal(got, want) {
			t.Errorf("%q: after mending: %q, %v", damage, got, err)
		}
	}
}

// replace puts other bytes in the place of a read-only file.
func replace(t *testing.T, path string, data []byte) {
	t.Helper()
	if err := os.Remove(path); err != nil && !errors.Is(err, fs.ErrNotExist) {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, data, 0o444); err != nil {
		t.Fatal(err)
	}
}

// TestDamageMended checks that an object that another process mends between
// reading and setting aside is not lost.
func TestDamageMended(t *testing.T) {
	s := open(t)
	want := []byte("depth")
	h, err := s.Put(want)
	if err != nil {
		t.Fatal(err)
	}
	first := true
	s.files.open = func(path string) (io.ReadCloser, error) {
		if first {
			first = false
			return io.NopCloser(strings.NewReader("damaged")), nil
		}
		return os.Open(path)
	}
	if got, err := s.Get(h); err != nil || !bytes.Equal(got, want) {
		t.Errorf("%q, %v", got, err)
	}
	if !s.Has(h) || len(tree(t, s, "damaged")) != 0 {
		t.Error("the object was moved, although it is good")
	}

	// another process sets it aside first
	s.files.open = func(path string) (io.ReadCloser, error) {
		if err := os.Remove(path); err != nil {
			return nil, err
		}
		return io.NopCloser(strings.NewReader("damaged")), nil
	}
	if _, err := s.Get(h); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("%v is not fs.ErrNotExist", err)
	}
}

func TestReadErrors(t *testing.T) {
	s := open(t)
	h, err := s.Put([]byte("depth"))
	if err != nil {
		t.Fatal(err)
	}
	fault := error(syscall.EACCES)
	s.files.open = func(path string) (io.ReadCloser, error) {
		return nil, &fs.PathError{Op: "read", Path: path, Err: fault}
	}
	var d *DamagedError
	if _, err := s.Get(h); !errors.Is(err, fs.ErrPermission) || errors.As(err, &d) || !s.Has(h) {
		t.Errorf("an object that may not be read: %v", err)
	}
	fault = syscall.EIO // a bad block
	if _, err := s.Get(h); !errors.As(err, &d) || s.Has(h) {
		t.Errorf("an object that can't be read: %v", err)
	}
}

// faults are the ways in which writing can fail.
var faults = map[string]struct {
	set  func(f *files)
	want error
	text string
}{
	"disk full": {func(f *files) {
		f.write = func(f *os.File, b []byte) (int, error) {
			n, _ := f.Write(b[:len(b)/2])
			return n, &fs.PathError{Op: "write", Path: f.Name(), Err: syscall.ENOSPC}
		}
	}, syscall.ENOSPC, "is full: make room on its disk, or choose another folder with --store"},
	"quota": {func(f *files) {
		f.sync = func(f *os.File) error { return &fs.PathError{Op: "sync", Path: f.Name(), Err: syscall.EDQUOT} }
	}, syscall.EDQUOT, "is full"},
	"short write": {func(f *files) {
		f.write = func(f *os.File, b []byte) (int, error) {
			_, err := f.Write(b[:len(b)/2])
			return len(b), err
		}
	}, nil, "bytes after"},
	"sync": {func(f *files) { f.sync = func(*os.File) error { return syscall.EIO } }, syscall.EIO, "failed"},
	"rename": {func(f *files) {
		f.rename = func(_, _ string) error { return syscall.EROFS }
		f.link = f.rename
	}, syscall.EROFS, "cannot be written to"},
}

func TestWriteFaults(t *testing.T) {
	for name, fault := range faults {
		s := open(t)
		kept, err := s.Put([]byte("kept before"))
		if err != nil {
			t.Fatal(err)
		}
		fault.set(&s.files)
		_, putErr := s.Put([]byte("an object"))
		_, batchErr := s.PutBatch([][]byte{[]byte("an object"), []byte("a second one")})
		setErr := s.SetRecord(record("key", "depth", kept))
		for op, err := range map[string]error{"put": putErr, "batch": batchErr, "set": setErr} {
			if err == nil || fault.want != nil && !errors.Is(err, fault.want) || !strings.Contains(err.Error(), fault.text) || strings.Contains(err.Error(), "\n") {
				t.Errorf("%s, %s: %v; expected %q", name, op, err, fault.text)
			}
		}
		if n := len(tree(t, s, "objects")); n != 1 {
			t.Errorf("%s: %d objects are there, expected 1", name, n)
		}
		if n := len(tree(t, s, "records")) + len(tree(t, s, "tmp")); n != 0 {
			t.Errorf("%s: %d other files are there, expected none", name, n)
		}
		s.files = realFiles
		if _, err := s.Put([]byte("an object")); err != nil {
			t.Errorf("%s: when it was over: %v", name, err)
		}
		if hints, errs, err := s.Verify(nil); len(hints)+len(errs) > 0 || err != nil {
			t.Errorf("%s: %v, %v, %v", name, hints, errs, err)
		}
	}
}

// TestLostAnswers has a network file system do what it is asked, and say that it
// was done already, or that there is nothing to do it with.
func TestLostAnswers(t *testing.T) {
	s := open(t)
	s.files.rename = func(from, to string) error {
		if err := os.Rename(from, to); err != nil {
			return err
		}
		return &os.LinkError{Op: "rename", Old: from, New: to, Err: syscall.ENOENT}
	}
	s.files.link = func(from, to string) error {
		if err := os.Link(from, to); err != nil {
			return err
		}
		return &os.LinkError{Op: "link", Old: from, New: to, Err: syscall.EEXIST}
	}
	h := put(t, s, "depth", "error")
	if err := s.SetRecord(record("one", "depth", h[0])); err != nil {
		t.Error(err)
	}
	for _, err := range s.SetRecords([]Record{record("two", "depth", h[0]), record("three", "depth", h[1])}) {
		if err != nil {
			t.Error(err)
		}
	}
	if hints, errs, err := s.Verify(nil); len(hints)+len(errs) > 0 || err != nil {
		t.Errorf("%v, %v, %v", hints, errs, err)
	}
	if n, left := len(tree(t, s, "records")), tree(t, s, "tmp"); n != 3 || len(left) > 0 {
		t.Errorf("%d records, and left are %v", n, left)
	}
	s.files.rename = func(from, to string) error {
		return &os.LinkError{Op: "rename", Old: from, New: to, Err: syscall.ENOENT}
	}
	if _, err := s.Put([]byte("new")); err == nil || !strings.Contains(err.Error(), "was deleted, or a part of it, while it was in use: run again") {
		t.Errorf("with a file gone: %v", err)
	}
}

// TestFullDisk fills a real file system.
func TestFullDisk(t *testing.T) {
	if os.Getuid() != 0 {
		t.Skip("only root can mount a small disk")
	}
	dir := t.TempDir()
	mount(t, "-t", "tmpfs", "-o", "size=1m", "tmpfs", dir)
	s, err := Open(filepath.Join(dir, "store"))
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Limit(0, 0); err != nil {
		t.Fatal(err)
	}
	var hashes []Hash
	for i := 0; err == nil; i++ {
		var h Hash
		if h, err = s.Put(bytes.Repeat([]byte{byte(i)}, 50_000)); err == nil {
			hashes = append(hashes, h)
		}
		if i > 100 {
			t.Fatal("the disk never fills")
		}
	}
	if !errors.Is(err, syscall.ENOSPC) || !strings.Contains(err.Error(), "is full: make room") {
		t.Errorf("disk full: %v", err)
	}
	if n := len(tree(t, s, "objects")); n != len(hashes) || n < 10 {
		t.Errorf("%d objects are there after %d were put", n, len(hashes))
	}
	if n := len(tree(t, s, "tmp")); n != 0 {
		t.Errorf("%d temporary files take up room", n)
	}
	for _, h := range hashes {
		if _, err := s.Get(h); err != nil {
			t.Error(err)
		}
	}
}
