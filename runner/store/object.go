package store

import (
	"bytes"
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
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
	drafts := make([]*Draft, len(data))
	hashes := make([]Hash, len(data))
	for i, b := range data {
		hashes[i] = HashOf(b)
		drafts[i] = &Draft{store: s, hash: hashes[i], size: int64(len(b)), data: b, done: true}
	}
	return hashes, s.PutDrafts(drafts)
}

// PutDrafts is [Store.PutBatch] for objects that were written piece by piece.
// The drafts are used up, also after an error.
func (s *Store) PutDrafts(drafts []*Draft) error {
	err := s.putDrafts(drafts)
	if errors.Is(err, fs.ErrNotExist) { // the store was deleted on the way
		err = s.putDrafts(drafts)
	}
	for _, d := range drafts {
		d.Discard()
	}
	return err
}

func (s *Store) putDrafts(drafts []*Draft) error {
	var staged []string // temporary files
	var missing []Hash  // the object in each
	defer func() {
		for _, tmp := range staged {
			os.Remove(tmp) // if that fails, a file remains in tmp, which does no harm
		}
	}()
	hashes := make([]Hash, len(drafts))
	total, unwritten := int64(0), int64(0)
	for _, d := range drafts {
		total += d.size
		if d.file == nil {
			unwritten += d.size
		}
	}
	seen := map[Hash]bool{}
	for i, d := range drafts {
		h := d.Hash()
		hashes[i] = h
		if seen[h] {
			continue
		}
		seen[h] = true
		if s.intact(h) {
			continue
		}
		if len(staged) == 0 {
			if err := s.room(total, unwritten); err != nil {
				return err
			}
		}
		tmp, err := d.stage(len(drafts) == 1)
		if err != nil {
			return err
		}
		s.used.Add(d.size)
		staged, missing = append(staged, tmp), append(missing, h)
	}
	for _, h := range missing {
		if err := s.folder(filepath.Dir(s.objectPath(h))); err != nil {
			return err
		}
	}
	if len(drafts) > 1 {
		if err := s.flush(staged); err != nil {
			return err
		}
	}
	for _, h := range missing {
		if err := s.rename(staged[0], s.objectPath(h)); err != nil {
			return s.explain(err)
		}
		staged = staged[1:]
	}
	// also of objects that were there: who put them may not have come so far
	return s.syncFolders(hashes)
}

func (s *Store) syncFolders(objects []Hash) error {
	if len(objects) > manySyncs && s.files.all(s.dir) {
		return nil
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
func (s *Store) intact(h Hash) bool { return s.Has(h) && s.Copy(io.Discard, h) == nil }

// Get reads an object and verifies it. A damaged one is set aside and gives a
// [*DamagedError], one that is not there an error that is fs.ErrNotExist.
func (s *Store) Get(h Hash) ([]byte, error) {
	var b bytes.Buffer
	if st, err := os.Stat(s.objectPath(h)); err == nil {
		b.Grow(int(st.Size()) + bytes.MinRead)
	}
	err := s.Copy(&b, h)
	var moved *DamagedError
	if errors.As(err, &moved) && moved.Aside == "" { // another process was quicker
		b.Reset()
		err = s.Copy(&b, h)
	}
	if err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// Copy writes an object to w as it is read. That it is damaged turns out at the
// end, and gives the error that [Store.Get] gives: what was written is then of
// no use.
func (s *Store) Copy(w io.Writer, h Hash) error {
	path := s.objectPath(h)
	flaw, err := s.readObject(w, h)
	if err != nil || flaw == "" {
		return err
	}
	// without a place aside, whatever the reason
	aside, _ := s.setAside(path, func(path string) bool {
		flaw, err := s.readFile(io.Discard, path, h)
		return flaw == "" && err == nil
	})
	found := DamagedError{h, path, aside, flaw}
	if aside == "" {
		found.Reason += "; it could not be set aside"
	} else {
		s.mu.Lock()
		s.damage = append(s.damage, found)
		s.mu.Unlock()
	}
	return &found
}

// Damage lists the damaged objects that were set aside since the store was
// opened, also those that were found only because they were put again.
func (s *Store) Damage() []DamagedError {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.damage)
}

// readObject copies an object and gives its flaw, or an error that says nothing
// about the object.
func (s *Store) readObject(w io.Writer, h Hash) (flaw string, err error) {
	flaw, err = s.readFile(w, s.objectPath(h), h)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return "", fmt.Errorf("the kept result %s is missing from %s: %w", h.Short(), s.dir, fs.ErrNotExist)
	case errors.Is(err, syscall.EIO) || errors.Is(err, syscall.EISDIR):
		return err.Error(), nil
	case err != nil:
		var to *writeError
		if errors.As(err, &to) {
			return "", to.error
		}
		return "", fmt.Errorf("the kept result %s cannot be read: %w", h.Short(), err)
	}
	return flaw, nil
}

// readFile copies a file that should hold an object and gives its flaw.
func (s *Store) readFile(w io.Writer, path string, h Hash) (flaw string, err error) {
	f, err := s.files.open(path)
	if errors.Is(err, syscall.ESTALE) { // replaced, on a network file system
		f, err = s.files.open(path)
	}
	if err != nil {
		return "", err
	}
	defer f.Close() // opened for reading: nothing can be lost
	sum, size := sha256.New(), 0
	buf := make([]byte, copySize)
	for {
		n, err := f.Read(buf)
		sum.Write(buf[:n])
		size += n
		if _, err := w.Write(buf[:n]); err != nil {
			return "", &writeError{err}
		}
		if err == io.EOF {
			break
		}
		if err != nil {
			return "", err
		}
	}
	if got := Hash(sum.Sum(nil)); got != h {
		return fmt.Sprintf("its %d bytes have the SHA-256 %s", size, got), nil
	}
	return "", nil
}

// copySize is how many bytes of an object are read at a time.
const copySize = 128 << 10

// A writeError is the fault of what an object is copied to.
type writeError struct{ error }

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
func (s *Store) setAside(path string, good func(path string) bool) (string, error) {
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
		if good(to) {
			return "", s.files.rename(to, path)
		}
		return to, nil
	}
}
