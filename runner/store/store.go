package store

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"time"
)

// A Store is an open folder of results. It may be used by several goroutines.
type Store struct {
	dir string
	now func() time.Time

	// fault, when set, is asked before each step of writing a file and can
	// make it fail. For tests.
	fault func(op, path string) error

	mu      sync.Mutex
	folders map[string]bool // folders known to exist and to be synced
}

// A DamagedError says that an object was not what its name says. It has been
// set aside, so that the result can be computed again.
type DamagedError struct {
	Hash  Hash
	Path  string // where it was
	Aside string // where it is now, "" when it could not be moved
}

// Error names the object and where it went.
func (e *DamagedError) Error() string {
	s := fmt.Sprintf("the kept result %s is damaged", e.Path)
	if e.Aside != "" {
		s += "; it was set aside as " + e.Aside
	}
	return s
}

const markFile = "rimlight-store"

const readme = `This folder keeps results of rimlight, so that they need not be computed again.

Every file under objects/ is named by the SHA-256 of its content, and every
file under records/ says what a computation gave. Nothing here is needed to
read a report. The folder may be deleted as a whole; everything in it will
then be computed again when it is needed. Do not edit single files: an edited
file is noticed and set aside.
`

// Open opens the store in a folder, which it makes when there is none. A
// folder that holds something else, or a store of another version, is refused.
func Open(dir string) (*Store, error) {
	s := &Store{dir: dir, now: time.Now, folders: map[string]bool{}}
	mark := filepath.Join(dir, markFile)
	b, err := os.ReadFile(mark)
	switch {
	case err == nil:
		if v := strings.TrimSpace(string(b)); v != Version {
			return nil, fmt.Errorf("the result store %s has format %.20q; this program knows format %q: choose another folder with --store, or use the program that wrote it", dir, v, Version)
		}
		return s, nil
	case !errors.Is(err, fs.ErrNotExist):
		return nil, fmt.Errorf("the result store %s cannot be opened: %w", dir, err)
	}
	if entries, err := os.ReadDir(dir); err == nil && len(entries) > 0 {
		for _, e := range entries {
			if e.Name() != "tmp" && e.Name() != "README.txt" { // left by somebody who was stopped here
				return nil, fmt.Errorf("%s is not a result store and not empty: choose another folder with --store", dir)
			}
		}
	}
	if err := os.MkdirAll(filepath.Join(dir, "tmp"), 0o777); err != nil {
		return nil, fmt.Errorf("no result store could be made: %w", err)
	}
	if err := s.write(filepath.Join(dir, "README.txt"), []byte(readme), 0o644); err != nil {
		return nil, fmt.Errorf("no result store could be made: %w", err)
	}
	if err := s.write(mark, []byte(Version+"\n"), 0o644); err != nil {
		return nil, fmt.Errorf("no result store could be made: %w", err)
	}
	return s, nil
}

func (s *Store) objectPath(h Hash) string {
	name := h.String()
	return filepath.Join(s.dir, "objects", name[:2], name)
}

// Put keeps data and returns its name. When Put returns without an error, the
// object will survive a loss of power. An object that is already there is read
// and verified instead; a damaged one is replaced.
func (s *Store) Put(data []byte) (Hash, error) {
	h := HashOf(data)
	path := s.objectPath(h)
	if old, err := os.ReadFile(path); err == nil {
		if HashOf(old) == h {
			return h, nil
		}
		s.setAside(path)
	}
	if err := s.write(path, data, 0o444); err != nil {
		return Hash{}, fmt.Errorf("a result could not be kept: %w", err)
	}
	return h, nil
}

// Get reads an object and verifies it. A damaged one is set aside and gives a
// *[DamagedError]; one that is not there an error that is fs.ErrNotExist.
func (s *Store) Get(h Hash) ([]byte, error) {
	path := s.objectPath(h)
	data, err := os.ReadFile(path)
	if err != nil {
		if errors.Is(err, fs.ErrNotExist) {
			return nil, fmt.Errorf("the kept result %s is missing: %w", h.Short(), fs.ErrNotExist)
		}
		return nil, fmt.Errorf("a kept result cannot be read: %w", err)
	}
	if HashOf(data) != h {
		return nil, &DamagedError{h, path, s.setAside(path)}
	}
	return data, nil
}

// Has reports whether there is an object of this name, without reading it.
func (s *Store) Has(h Hash) bool {
	st, err := os.Stat(s.objectPath(h))
	return err == nil && st.Mode().IsRegular() && (st.Size() > 0 || h == HashOf(nil))
}

// setAside moves a damaged file out of the way and returns where to, "" when
// it could not be moved. It is not deleted: it may tell what went wrong.
func (s *Store) setAside(path string) string {
	dir := filepath.Join(s.dir, "damaged")
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return ""
	}
	to := filepath.Join(dir, fmt.Sprintf("%s-%d", filepath.Base(path), s.now().UnixNano()))
	if err := os.Rename(path, to); err != nil {
		return ""
	}
	return to
}

// write puts a file in place: complete and synced, or not at all. What was
// there is replaced.
func (s *Store) write(path string, data []byte, mode fs.FileMode) error {
	return s.place(path, data, mode, os.Rename)
}

// create is write for a file that must not be there yet: the error is
// fs.ErrExist when it is. Of several processes, one succeeds.
func (s *Store) create(path string, data []byte, mode fs.FileMode) error {
	return s.place(path, data, mode, func(from, to string) error {
		err := os.Link(from, to)
		if err == nil || errors.Is(err, fs.ErrExist) {
			os.Remove(from)
			return err
		}
		return os.Rename(from, to) // a file system without links
	})
}

func (s *Store) place(path string, data []byte, mode fs.FileMode, move func(from, to string) error) (err error) {
	if err := s.folder(filepath.Dir(path)); err != nil {
		return err
	}
	tmpDir := filepath.Join(s.dir, "tmp")
	f, err := os.CreateTemp(tmpDir, "new-*")
	if errors.Is(err, fs.ErrNotExist) { // somebody tidied up
		if err = os.MkdirAll(tmpDir, 0o777); err == nil {
			f, err = os.CreateTemp(tmpDir, "new-*")
		}
	}
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			os.Remove(f.Name())
		}
	}()
	_, err = f.Write(data)
	if e := s.ask("write", path); err == nil {
		err = e
	}
	if err == nil {
		var size int64
		if size, err = f.Seek(0, io.SeekEnd); err == nil && size != int64(len(data)) {
			err = fmt.Errorf("%s has %d bytes after %d were written", f.Name(), size, len(data))
		}
	}
	if err == nil {
		err = f.Chmod(mode)
	}
	if err == nil {
		if err = s.ask("sync", path); err == nil {
			err = f.Sync()
		}
	}
	if e := f.Close(); err == nil {
		err = e
	}
	if err != nil {
		return err
	}
	if err = s.ask("rename", path); err != nil {
		return err
	}
	if err = move(f.Name(), path); err != nil {
		return err
	}
	return syncFolder(filepath.Dir(path))
}

func (s *Store) ask(op, path string) error {
	if s.fault == nil {
		return nil
	}
	return s.fault(op, path)
}

// folder makes sure that a folder exists and will survive a loss of power.
func (s *Store) folder(dir string) error {
	s.mu.Lock()
	known := s.folders[dir]
	s.mu.Unlock()
	if known {
		if _, err := os.Stat(dir); err == nil {
			return nil
		}
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return err
	}
	for d := dir; ; d = filepath.Dir(d) {
		if err := syncFolder(filepath.Dir(d)); err != nil {
			return err
		}
		if d == s.dir || !strings.HasPrefix(d, s.dir) {
			break
		}
	}
	s.mu.Lock()
	s.folders[dir] = true
	s.mu.Unlock()
	return nil
}

// syncFolder makes the names in a folder durable. A file system that cannot do
// this for folders says so with "invalid argument", and is taken to need none.
func syncFolder(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	defer d.Close()
	if err := d.Sync(); err != nil && !errors.Is(err, errInvalid) {
		return err
	}
	return nil
}
