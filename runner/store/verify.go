package store

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// leftOver is the age from which a temporary file counts as left by somebody
// who was stopped.
const leftOver = time.Hour

// Verify reads and checks everything in the store, and changes nothing. Errors
// are losses: damaged files, and objects that a record names but that are
// missing. Hints are worth knowing and do no harm: computations that
// were not reproducible, files that were set aside or left in tmp/, and
// files that do not belong here. Progress, which may be nil, is told how many
// files of how many are done. The last error says why the store could not be
// gone through.
func (s *Store) Verify(progress func(done, total int)) (hints, errs []error, err error) {
	objects, err := s.list("objects")
	if err != nil {
		return nil, nil, err
	}
	records, err := s.list("records")
	if err != nil {
		return nil, nil, err
	}
	_, flaws, err := s.Runs()
	if err != nil {
		return nil, nil, err
	}
	errs = append(s.frame(), flaws...)
	done, total := 0, len(objects)+len(records)
	tick := func() {
		if done++; progress != nil {
			progress(done, total)
		}
	}
	for _, path := range objects {
		hint, err := s.verifyObject(path)
		hints, errs = collect(hints, hint), collect(errs, err)
		tick()
	}
	for _, path := range records {
		moreHints, moreErrs := s.verifyRecord(path)
		hints, errs = append(hints, moreHints...), append(errs, moreErrs...)
		tick()
	}
	more, err := s.leftovers()
	return append(hints, more...), errs, err
}

func collect(list []error, err error) []error {
	if err != nil {
		list = append(list, err)
	}
	return list
}

// list gives the files below a folder of the store, in the order of names.
func (s *Store) list(kind string) ([]string, error) {
	var paths []string
	err := filepath.WalkDir(filepath.Join(s.dir, kind), func(path string, d fs.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			paths = append(paths, path)
		}
		return err
	})
	if errors.Is(err, fs.ErrNotExist) && len(paths) == 0 {
		return nil, nil // nothing was put yet
	}
	return paths, err
}

// ignoreMissing is for files that are deleted while somebody looks.
func ignoreMissing(err error) error {
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	return err
}

func stray(path string) error {
	return fmt.Errorf("%s does not belong into a result store", path)
}

func (s *Store) verifyObject(path string) (hint, err error) {
	h, err := ParseHash(filepath.Base(path))
	if err != nil || path != s.objectPath(h) {
		return stray(path), nil
	}
	flaw, err := s.readObject(io.Discard, h)
	switch {
	case err != nil:
		return nil, err
	case flaw != "":
		return nil, &DamagedError{Hash: h, Path: path, Reason: flaw}
	}
	return nil, nil
}

func (s *Store) verifyRecord(path string) (hints, errs []error) {
	name, beside, isBeside := strings.Cut(filepath.Base(path), ".")
	k, err := ParseKey(name)
	if err != nil || filepath.Dir(path) != filepath.Dir(s.recordPath(k)) {
		return []error{stray(path)}, nil
	}
	data, err := s.files.read(path)
	var r Record
	if err == nil {
		r, err = decodeRecord(k, data)
	}
	if err != nil {
		return nil, []error{&BadRecordError{path, err}}
	}
	if isBeside {
		return []error{fmt.Errorf("the computation %s was not reproducible: its other outcome %s is in %s", k.Short(), beside, path)}, nil
	}
	for _, res := range r.Results {
		if !s.Has(res.Hash) {
			errs = append(errs, fmt.Errorf("the result %s, %s, of the record %s is missing", res.Name, res.Hash.Short(), path))
		}
	}
	return nil, errs
}

// leftovers are the files that were set aside or never finished.
func (s *Store) leftovers() (hints []error, err error) {
	for _, place := range [][2]string{{"damaged", "was set aside as damaged"}, {"tmp", "was left by a run that was stopped"}, {using, "was left by a run that was stopped"}} {
		dir, about := place[0], place[1]
		entries, err := os.ReadDir(filepath.Join(s.dir, dir))
		if err != nil && !errors.Is(err, fs.ErrNotExist) {
			return hints, err
		}
		for _, e := range entries {
			st, err := e.Info()
			if err != nil || dir != "damaged" && s.now().Sub(st.ModTime()) < leftOver {
				continue // gone, or perhaps being written
			}
			hints = append(hints, fmt.Errorf("%s %s; it can be deleted", filepath.Join(s.dir, dir, e.Name()), about))
		}
	}
	return hints, nil
}
