package store

import (
	"fmt"
	"io/fs"
	"path/filepath"
)

// DefaultReserve is how many bytes of its disk a store leaves free, for
// everybody else who writes there, unless told otherwise.
const DefaultReserve = 256 << 20

// Limit sets how many bytes of its disk the store is to leave free, and how
// many its objects may take up in all, 0 for no such limit. What other
// processes put from now on is not counted. It is called before anything is
// put.
func (s *Store) Limit(reserve, most int64) error {
	s.reserve, s.most = reserve, most
	if most == 0 {
		return nil
	}
	return filepath.WalkDir(filepath.Join(s.dir, "objects"), func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return ignoreMissing(err)
		}
		st, err := d.Info()
		if err != nil {
			return ignoreMissing(err)
		}
		s.used.Add(st.Size())
		return nil
	})
}

// Limits are the limits in force, as [Store.Limit] takes them.
func (s *Store) Limits() (reserve, most int64) { return s.reserve, s.most }

// A RoomError says that a store was told not to take up as much as it would
// have to. The sizes are in bytes.
type RoomError struct {
	Dir     string
	Free    int64 // on the disk
	Reserve int64 // what is to stay free
	Used    int64 // by objects
	Most    int64 // what they may use, 0 for no limit
	Need    int64 // what is to be kept now
}

func (e *RoomError) Error() string {
	if e.Most > 0 && e.Used+e.Need > e.Most {
		return fmt.Sprintf("the result store %s is full: it has %s of results and may have %s (--store-size), which leaves no room for %s: trim it, or allow it more",
			e.Dir, inBytes(e.Used), inBytes(e.Most), inBytes(e.Need))
	}
	return fmt.Sprintf("the result store %s is full: its disk has %s free, of which %s are to stay so (--reserve), which leaves no room for %s: make room on it, or choose another folder with --store",
		e.Dir, inBytes(e.Free), inBytes(e.Reserve), inBytes(e.Need))
}

// inBytes writes a number of bytes for people.
func inBytes(n int64) string {
	switch {
	case n >= 1e9:
		return fmt.Sprintf("%.1f GB", float64(n)/1e9)
	case n >= 1e6:
		return fmt.Sprintf("%.1f MB", float64(n)/1e6)
	}
	return fmt.Sprintf("%.1f kB", float64(n)/1e3)
}

// room demands that there is room for so many bytes of objects, of which some
// have yet to be written to the disk.
func (s *Store) room(need, unwritten int64) error {
	e := &RoomError{Dir: s.dir, Reserve: s.reserve, Used: s.used.Load(), Most: s.most, Need: need}
	if e.Most > 0 && e.Used+need > e.Most {
		return e
	}
	if s.reserve == 0 {
		return nil
	}
	var known bool
	if e.Free, known = free(s.dir); known && e.Free-unwritten < s.reserve {
		return e
	}
	return nil
}
