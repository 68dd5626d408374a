package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"syscall"
)

// A DamagedError says that an object is not what its name says. It is no longer
// in the store: put it again.
type DamagedError struct {
	Hash   Hash
	Path   string // where it was
	Aside  string // where it is now; empty when it was not moved
	Reason string
}

func (e *DamagedError) Error() string {
	s := fmt.Sprintf("the kept result %s is damaged: %s", e.Path, e.Reason)
	if e.Aside != "" {
		s += "; it was set aside as " + e.Aside
	}
	return s
}

// Put keeps data and gives its name. When it returns without an error, the
// object is on disk and will survive a loss of power. If the object is there
// already it is read and verified instead, and replaced if damaged.
func (s *Store) Put(data []byte) (Hash, error) {
	h, err := s.PutBatch([][]byte{data})
	if err != nil {
		return Hash{}, err
	}
	return h[0], nil
}

// PutBatch is [Store.Put] for many objects, and much quicker than as many
// calls, as it waits for the disk but once. Each object is kept or not; after
// an error some may have been.
func (s *Store) PutBatch(data [][]byte) ([]Hash, error) {
	hashes, err := s.putBatch(data)
	if errors.Is(err, fs.ErrNotExist) { // the store was deleted on the way
		hashes, err = s.putBatch(data)
	}
	return hashes, err
}

func (s *Store) putBatch(data [][]byte) ([]Hash, error) {
	hashes := make([]Hash, len(data))
	var staged []string // temporary files
	var missing []Hash  // the object in each
	defer func() {
		for _, tmp := range staged {
			os.Remove(tmp) // if that fails, a file remains in tmp, which does no harm
		}
	}()
	seen := map[Hash]bool{}
	for i, b := range data {
		h := HashOf(b)
		hashes[i] = h
		if seen[h] {
			continue
		}
		seen[h] = true
		if s.intact(h) {
			continue
		}
		tmp, err := s.stage(b, 0o444, len(data) == 1)
		if err != nil {
			return nil, err
		}
		staged, missing = append(staged, tmp), append(missing, h)
	}
	for _, h := range missing {
		if err := s.folder(filepath.Dir(s.objectPath(h))); err != nil {
			return nil, err
		}
	}
	if len(data) > 1 {
		if err := s.flush(staged); err != nil {
			return nil, err
		}
	}
	for _, h := range missing {
		if err := s.rename(staged[0], s.objectPath(h)); err != nil {
			return nil, s.explain(err)
		}
		staged = staged[1:]
	}
	// also of objects that were there: who put them may not have come so far
	return hashes, s.syncFolders(hashes)
}

func (s *Store) syncFolders(objects []Hash) error {
	if len(objects) > manySyncs {
		syncAll(s.dir)
	}
	done := map[byte]bool{}
	for _, h := range objects {
		if done[h[0]] {
			continue
		}
		done[h[0]] = true
		if err := s.syncFolder(filepath.Dir(s.objectPath(h))); err != nil {
			return err
		}
	}
	return nil
}

// intact reports whether an object is there and not damaged. A damaged one is
// set aside.
func (s *Store) intact(h Hash) bool {
	if !s.Has(h) {
		return false
	}
	_, err := s.Get(h)
	return err == nil
}

// Get reads an object and verifies it. A damaged one is set aside and gives a
// [*DamagedError], one that is not there an error that is fs.ErrNotExist.
func (s *Store) Get(h Hash) ([]byte, error) {
	path := s.objectPath(h)
	data, flaw, err := s.readObject(h)
	if err != nil || flaw == "" {
		return data, err
	}
	aside, err := s.setAside(path, func(data []byte) bool { return HashOf(data) == h })
	if err == nil && aside == "" || errors.Is(err, fs.ErrNotExist) { // another process was quicker
		data, again, err := s.readObject(h)
		if err != nil || again == "" {
			return data, err
		}
	}
	found := DamagedError{h, path, aside, flaw}
	if aside == "" {
		found.Reason += "; it could not be set aside"
	} else {
		s.mu.Lock()
		s.damage = append(s.damage, found)
		s.mu.Unlock()
	}
	return nil, &found
}

// Damage lists the damaged objects that were set aside since the store was
// opened, also those that were found only because they were put again.
func (s *Store) Damage() []DamagedError {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.damage)
}

// readObject gives an object that is as it should be, or its flaw, or an error
// that says nothing about the object.
func (s *Store) readObject(h Hash) (data []byte, flaw string, err error) {
	data, err = s.files.read(s.objectPath(h))
	if errors.Is(err, syscall.ESTALE) { // replaced, on a network file system
		data, err = s.files.read(s.objectPath(h))
	}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, "", fmt.Errorf("the kept result %s is missing from %s: %w", h.Short(), s.dir, fs.ErrNotExist)
	case errors.Is(err, syscall.EIO) || errors.Is(err, syscall.EISDIR):
		return nil, err.Error(), nil
	case err != nil:
		return nil, "", fmt.Errorf("the kept result %s cannot be read: %w", h.Short(), err)
	case HashOf(data) != h:
		return nil, fmt.Sprintf("its %d bytes have the SHA-256 %s", len(data), HashOf(data)), nil
	}
	return data, "", nil
}

// Has reports whether there is an object of this name. It does not read it.
func (s *Store) Has(h Hash) bool {
	_, err := os.Lstat(s.objectPath(h))
	return err == nil
}

// Size is how many bytes an object takes; false if there is no object of this
// name. It does not read it.
func (s *Store) Size(h Hash) (int64, bool) {
	st, err := os.Lstat(s.objectPath(h))
	if err != nil {
		return 0, false
	}
	return st.Size(), true
}

// setAside moves a flawed file to damaged/ and gives its path there. It is not
// deleted, since it may tell what went wrong. If the file turns out to be good
// because another process has replaced it meanwhile, it is moved back, and the
// path is empty.
func (s *Store) setAside(path string, good func(data []byte) bool) (string, error) {
	dir := filepath.Join(s.dir, "damaged")
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return "", err
	}
	for n := 1; ; n++ {
		to := filepath.Join(dir, filepath.Base(path)+"-"+strconv.Itoa(n))
		if _, err := os.Lstat(to); err == nil {
			continue
		}
		if err := s.files.rename(path, to); err != nil {
			return "", err
		}
		if data, err := s.files.read(to); err == nil && good(data) {
			return "", s.files.rename(to, path)
		}
		return to, nil
	}
}
