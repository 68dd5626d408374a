package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// A Record says what a computation gave.
type Record struct {
	Key     Key
	Text    string // the text of the key
	Results []Result
	Log     string        // what the computation said
	Took    time.Duration // its duration
	When    time.Time     // its end; kept in UTC
	Host    string        // where it was done
	Program string        // the version that did it
	Notes   []string
}

// A Result is a named object.
type Result struct {
	Name   string `json:"name"`
	Type   string `json:"type"`
	Layout string `json:"layout"`
	Hash   Hash   `json:"hash"`
	Size   int64  `json:"size"` // of the content, in bytes
}

// A NotReproducibleError says that a computation gave other results than the
// first time. Both records and all objects are kept.
type NotReproducibleError struct {
	Key      Key
	Name     string // of the first result that differs
	First    Hash   // what it was; zero if there was no such result
	Second   Hash   // what it is now; zero if there is no such result now
	Beside   string // the file of the record that is not in force
	Replaced bool   // the first results are no longer in the store, so the second ones took their place
}

func (e *NotReproducibleError) Error() string {
	s := fmt.Sprintf("not reproducible: the result %s was %s at first and is %s now; ", e.Name, orAbsent(e.First), orAbsent(e.Second))
	if e.Replaced {
		return s + "the first one is no longer in the store, its record is " + e.Beside
	}
	return s + "the first one stays in force, the record of the second one is " + e.Beside
}

func orAbsent(h Hash) string {
	if h == (Hash{}) {
		return "absent"
	}
	return h.Short()
}

// A BadRecordError says why a record is of no use.
type BadRecordError struct {
	Path   string
	Reason error
}

func (e *BadRecordError) Error() string {
	return fmt.Sprintf("the record %s is of no use: %v", e.Path, e.Reason)
}

// Unwrap gives the reason.
func (e *BadRecordError) Unwrap() error { return e.Reason }

// Record looks up what a computation gave: true and no error, if that is known.
// Without a record it gives false and no error. A record that is flawed in any
// way is as good as none; it gives false and a [*BadRecordError] with the
// reason, for the user to know, and stays until [Store.SetRecord] sets it aside.
// The objects that a record names have yet to be read.
func (s *Store) Record(k Key) (Record, bool, error) {
	path := s.recordPath(k)
	data, err := s.files.read(path)
	if errors.Is(err, fs.ErrNotExist) {
		return Record{}, false, nil
	}
	var r Record
	if err == nil {
		r, err = decodeRecord(k, data)
	}
	if err != nil {
		return Record{}, false, &BadRecordError{path, err}
	}
	return r, true, nil
}

// isRecord tells whether a file is a record of the key without a flaw.
func (s *Store) isRecord(k Key) func(path string) bool {
	return func(path string) bool {
		data, err := s.files.read(path)
		if err == nil {
			_, err = decodeRecord(k, data)
		}
		return err == nil
	}
}

// SetRecord keeps a record, of results that must have been put before. The
// first record of a key stays: if the same results are set again nothing
// changes, and other ones are kept beside the first and give a
// [*NotReproducibleError]. A flawed record is set aside. A first record whose
// objects are no longer there gives way to other results, with the same error.
func (s *Store) SetRecord(r Record) error {
	if KeyOf(r.Text) != r.Key {
		return fmt.Errorf("the record of %s has the key text of %s", r.Key.Short(), KeyOf(r.Text).Short())
	}
	for _, res := range r.Results {
		if !s.Has(res.Hash) {
			return fmt.Errorf("the record of %s names the result %s, %s, which is not in the store", r.Key.Short(), res.Name, res.Hash.Short())
		}
	}
	data, err := encodeRecord(r)
	if err != nil {
		return fmt.Errorf("the record of %s cannot be written: %w", r.Key.Short(), err)
	}
	var replaced error
	const tries = 10 // against other processes that set the same record
	for range tries {
		first, ok, flaw := s.Record(r.Key)
		switch {
		case flaw != nil:
			if _, err := s.setAside(s.recordPath(r.Key), s.isRecord(r.Key)); err != nil && !errors.Is(err, fs.ErrNotExist) {
				return s.explain(err)
			}
			continue
		case !ok:
			err := s.write(s.recordPath(r.Key), data, 0o444, s.exclusively)
			if errors.Is(err, fs.ErrExist) {
				continue
			}
			if err != nil {
				return err
			}
			return replaced
		}
		differs := difference(first, r)
		if differs == nil {
			return replaced
		}
		if differs.Replaced = !s.whole(first); differs.Replaced {
			differs.Beside = s.besidePath(first)
			if err := s.files.rename(s.recordPath(r.Key), differs.Beside); err != nil && !errors.Is(err, fs.ErrNotExist) {
				return s.explain(err)
			}
			replaced = differs
			continue
		}
		differs.Beside = s.besidePath(r)
		err := s.write(differs.Beside, data, 0o444, s.exclusively)
		if err != nil && !errors.Is(err, fs.ErrExist) {
			return err
		}
		return differs
	}
	return fmt.Errorf("the record of %s cannot be kept: other processes change it all the time", r.Key.Short())
}

// SetRecords is [Store.SetRecord] for many records of different keys, and much
// quicker than as many calls, as it waits for the disk but once. The errors are
// those of the records, nil for one that is kept.
func (s *Store) SetRecords(records []Record) []error {
	errs := make([]error, len(records))
	staged := make([]string, len(records)) // temporary files, "" for records that are set one by one
	var all []string
	for i, r := range records {
		if _, err := os.Lstat(s.recordPath(r.Key)); !errors.Is(err, fs.ErrNotExist) || KeyOf(r.Text) != r.Key || !s.whole(r) {
			continue
		}
		data, err := encodeRecord(r)
		if err != nil {
			continue
		}
		if staged[i], err = s.stage(data, 0o444, false); err != nil {
			errs[i] = err
			continue
		}
		all = append(all, staged[i])
	}
	flushed := s.flush(all)
	folders := map[string]bool{}
	for i, r := range records {
		switch {
		case errs[i] != nil:
			continue
		case staged[i] == "":
			errs[i] = s.SetRecord(r)
			continue
		case flushed != nil:
			errs[i] = flushed
		default:
			dir := filepath.Dir(s.recordPath(r.Key))
			if errs[i] = s.folder(dir); errs[i] == nil {
				errs[i] = s.exclusively(staged[i], s.recordPath(r.Key))
			}
			if errors.Is(errs[i], fs.ErrExist) { // another process was quicker
				errs[i] = s.SetRecord(r)
				continue
			}
			folders[dir] = errs[i] == nil || folders[dir]
		}
		if errs[i] != nil {
			os.Remove(staged[i]) // if that fails, a file remains in tmp, which does no harm
			errs[i] = s.explain(errs[i])
		}
	}
	if len(folders) > manySyncs && s.files.all(s.dir) {
		return errs
	}
	for dir := range folders {
		if err := s.syncFolder(dir); err != nil {
			for i, r := range records {
				if errs[i] == nil && filepath.Dir(s.recordPath(r.Key)) == dir {
					errs[i] = err
				}
			}
		}
	}
	return errs
}

// besidePath is where a record lies that is not in force: one for each
// different outcome.
func (s *Store) besidePath(r Record) string {
	var results strings.Builder
	for _, res := range r.Results {
		fmt.Fprintf(&results, "%q %s\n", res.Name, res.Hash)
	}
	return s.recordPath(r.Key) + "." + HashOf([]byte(results.String())).Short()
}

// whole reports whether all objects of a record are there.
func (s *Store) whole(r Record) bool {
	for _, res := range r.Results {
		if !s.Has(res.Hash) {
			return false
		}
	}
	return true
}

// difference gives the first difference between the results of two records.
func difference(first, second Record) *NotReproducibleError {
	for i := range max(len(first.Results), len(second.Results)) {
		var a, b Result
		if i < len(first.Results) {
			a = first.Results[i]
		}
		if i < len(second.Results) {
			b = second.Results[i]
		}
		if a.Hash != b.Hash || a.Name != b.Name {
			name := a.Name
			if name == "" {
				name = b.Name
			}
			return &NotReproducibleError{Key: first.Key, Name: name, First: a.Hash, Second: b.Hash}
		}
	}
	return nil
}
