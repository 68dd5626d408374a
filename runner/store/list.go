package store

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// An Entry is a record in the store with what it holds on to.
type Entry struct {
	Record  Record
	Size    int64     // bytes of its objects, those that it shares with others included
	Written time.Time // when the record was written
	Whole   bool      // all objects that it names are there
}

// Keys lists the keys of all records in force, in order.
func (s *Store) Keys() ([]Key, error) {
	var keys []Key
	err := filepath.WalkDir(filepath.Join(s.dir, "records"), func(path string, d fs.DirEntry, err error) error {
		if errors.Is(err, fs.ErrNotExist) {
			return nil
		}
		if err != nil || d.IsDir() || strings.Contains(d.Name(), ".") {
			return err
		}
		k, err := ParseKey(d.Name())
		if err == nil {
			keys = append(keys, k)
		}
		return nil // what else lies there, Verify tells
	})
	return keys, err
}

// Entry looks up a record with what it holds on to. Objects that name further
// objects are not looked into: the store does not know what objects mean.
func (s *Store) Entry(k Key) (Entry, bool, error) {
	r, ok, err := s.Record(k)
	if !ok {
		return Entry{}, false, err
	}
	e := Entry{Record: r, Whole: true}
	for _, res := range r.Results {
		st, err := os.Stat(s.objectPath(res.Hash))
		if err != nil {
			e.Whole = false
			continue
		}
		e.Size += max(st.Size(), res.Size)
	}
	if st, err := os.Stat(s.recordPath(k)); err == nil {
		e.Written = st.ModTime()
	}
	return e, true, nil
}

// Remove takes a record out of the store. Its objects stay until
// [Store.Sweep].
func (s *Store) Remove(k Key) error {
	err := os.Remove(s.recordPath(k))
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	return s.explain(err)
}

// Sweep removes the objects that keep does not ask for and that were written
// before the given time, and the files left in tmp and damaged before it. It
// gives their number and bytes; with dry set it removes nothing. Objects that
// a running process has just put, and whose record is yet to come, are safe as
// long as the time lies before its start.
func (s *Store) Sweep(keep map[Hash]bool, before time.Time, dry bool) (files int, bytes int64, err error) {
	for _, dir := range []string{"objects", "tmp", "damaged", using} {
		err := filepath.WalkDir(filepath.Join(s.dir, dir), func(path string, d fs.DirEntry, err error) error {
			if errors.Is(err, fs.ErrNotExist) {
				return nil
			}
			if err != nil || d.IsDir() {
				return err
			}
			if h, err := ParseHash(d.Name()); dir == "objects" && (err != nil || keep[h]) {
				return nil
			}
			st, err := d.Info()
			if err != nil || !st.ModTime().Before(before) {
				return nil // gone, or too young
			}
			if !dry {
				if err := os.Remove(path); err != nil {
					return s.explain(err)
				}
			}
			files, bytes = files+1, bytes+st.Size()
			return nil
		})
		if err != nil {
			return files, bytes, err
		}
	}
	return files, bytes, nil
}
