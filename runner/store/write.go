package store

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"syscall"
)

// files are the ways to the disk, so that tests can make them fail.
type files struct {
	open   func(path string) (io.ReadCloser, error) // an object
	read   func(path string) ([]byte, error)        // anything else
	write  func(f *os.File, data []byte) (int, error)
	sync   func(f *os.File) error
	all    func(dir string) bool // see syncAll
	rename func(from, to string) error
	link   func(from, to string) error
}

var realFiles = files{func(path string) (io.ReadCloser, error) { return os.Open(path) }, os.ReadFile, (*os.File).Write, (*os.File).Sync, syncAll, os.Rename, os.Link}

// tmpPrefix begins the names of temporary files.
const tmpPrefix = "new-"

// write puts a file in place: complete and on disk, or not at all. Move gives
// the finished file its name.
func (s *Store) write(path string, data []byte, mode fs.FileMode, move func(from, to string) error) error {
	tmp, err := s.stage(data, mode, true)
	if err != nil {
		return err
	}
	err = s.folder(filepath.Dir(path))
	if err == nil {
		err = s.explain(move(tmp, path))
	}
	if err != nil {
		os.Remove(tmp) // if that fails too, a file remains in tmp, which does no harm
		return err
	}
	return s.syncFolder(filepath.Dir(path))
}

// stage writes a temporary file and gives its path. Without sync, it has yet to
// be brought to disk.
func (s *Store) stage(data []byte, mode fs.FileMode, sync bool) (path string, err error) {
	f, err := s.temporary()
	if err != nil {
		return "", err
	}
	_, err = s.files.write(f, data)
	return s.finish(f, err, int64(len(data)), mode, sync)
}

// temporary makes a temporary file.
func (s *Store) temporary() (*os.File, error) {
	dir := filepath.Join(s.dir, "tmp")
	f, err := os.CreateTemp(dir, tmpPrefix+"*")
	if errors.Is(err, fs.ErrNotExist) { // somebody tidied up
		if err := s.restore(); err != nil {
			return nil, err
		}
		f, err = os.CreateTemp(dir, tmpPrefix+"*")
	}
	return f, s.explain(err)
}

// finish closes a temporary file that was written to, with that outcome, and
// gives its path. After an error it is gone.
func (s *Store) finish(f *os.File, err error, size int64, mode fs.FileMode, sync bool) (path string, _ error) {
	if err == nil {
		err = s.seal(f, size, mode, sync)
	}
	if e := f.Close(); err == nil {
		err = e
	}
	if err != nil {
		os.Remove(f.Name()) // if that fails too, a file remains in tmp, which does no harm
		return "", s.explain(err)
	}
	return f.Name(), nil
}

// restore makes the folder for temporary files again and, if the whole store
// was deleted while it was open, begins it anew: without its mark, nobody could
// open it again.
func (s *Store) restore() error {
	if err := os.MkdirAll(filepath.Join(s.dir, "tmp"), 0o777); err != nil {
		return s.explain(err)
	}
	if _, err := os.Stat(filepath.Join(s.dir, markFile)); !errors.Is(err, fs.ErrNotExist) {
		return s.explain(err)
	}
	return s.begin()
}

func (s *Store) seal(f *os.File, size int64, mode fs.FileMode, sync bool) error {
	st, err := f.Stat()
	if err != nil {
		return err
	}
	if st.Size() != size {
		return fmt.Errorf("%s has %d bytes after %d were written", f.Name(), st.Size(), size)
	}
	if err := f.Chmod(mode); err != nil {
		return err
	}
	if sync {
		return s.files.sync(f)
	}
	return nil
}

// manySyncs is how many syncs are dearer than one of the whole file system.
const manySyncs = 4

// flush brings staged files to disk. Asking the file system for everything at
// once comes first because that costs little more than one file does, and is
// all there is to do where it can be relied on.
func (s *Store) flush(paths []string) error {
	if len(paths) > manySyncs && s.files.all(s.dir) {
		return nil
	}
	for _, p := range paths {
		f, err := os.Open(p)
		if err != nil {
			return s.explain(err)
		}
		err = s.files.sync(f)
		f.Close() // opened for reading: nothing can be lost
		if err != nil {
			return s.explain(err)
		}
	}
	return nil
}

// rename gives a finished file its name. A network file system may do it, lose
// the answer, ask again and then find no such file: what counts is whether
// the new name has the file that had the old one.
func (s *Store) rename(from, to string) error {
	was, _ := os.Stat(from)
	err := s.files.rename(from, to)
	if errors.Is(err, fs.ErrNotExist) && was != nil {
		if is, e := os.Stat(to); e == nil && os.SameFile(was, is) {
			return nil
		}
	}
	return err
}

// exclusively names a finished file unless the name is taken: the error is
// then fs.ErrExist. Of several processes, one succeeds. Where the file system
// has no hard links, the last one does.
func (s *Store) exclusively(from, to string) error {
	err := s.files.link(from, to)
	if err == nil || errors.Is(err, fs.ErrExist) {
		os.Remove(from) // if that fails, a file remains in tmp, which does no harm
		return err
	}
	if _, e := os.Lstat(to); e == nil {
		return fs.ErrExist
	}
	return s.rename(from, to)
}

// folder makes sure that a folder is there and will be there after a loss of
// power.
func (s *Store) folder(dir string) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	for d := dir; len(d) >= len(s.dir); d = filepath.Dir(d) {
		if _, err := os.Stat(d); err == nil {
			break
		}
		delete(s.durable, d) // it was deleted, if it was ever made
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return s.explain(err)
	}
	for d := dir; len(d) >= len(s.dir) && !s.durable[d]; d = filepath.Dir(d) {
		if err := s.syncFolder(filepath.Dir(d)); err != nil {
			return err
		}
	}
	for d := dir; len(d) >= len(s.dir); d = filepath.Dir(d) {
		s.durable[d] = true
	}
	return nil
}

// syncFolder brings the names in a folder to disk. A file system that cannot
// do this for folders says that it is invalid, and is taken to need none.
func (s *Store) syncFolder(dir string) error {
	d, err := os.Open(dir)
	if errors.Is(err, fs.ErrPermission) && len(dir) < len(s.dir) {
		return nil // a folder above the store that may not be read: not ours to sync
	}
	if err != nil {
		return s.explain(err)
	}
	defer d.Close() // opened for reading: nothing can be lost
	if err := s.files.sync(d); err != nil && !errors.Is(err, syscall.EINVAL) && !errors.Is(err, errors.ErrUnsupported) {
		return s.explain(err)
	}
	return nil
}

// explain says what an error in writing means to the user.
func (s *Store) explain(err error) error {
	switch {
	case err == nil || errors.Is(err, fs.ErrExist):
		return err
	case errors.Is(err, syscall.ENOSPC) || errors.Is(err, syscall.EDQUOT):
		return fmt.Errorf("the result store %s is full: make room on its disk, or choose another folder with --store (%w)", s.dir, err)
	case errors.Is(err, fs.ErrPermission) || errors.Is(err, syscall.EROFS):
		return fmt.Errorf("the result store %s cannot be written to: choose another folder with --store (%w)", s.dir, err)
	}
	if errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("the result store %s was deleted, or a part of it, while it was in use: run again (%w)", s.dir, err)
	}
	return fmt.Errorf("the result store %s failed: %w", s.dir, err)
}
