package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"
	"time"
)

// A Store is an open folder of results. It may be used by several goroutines.
type Store struct {
	dir   string
	now   func() time.Time
	files files

	reserve, most int64        // see Limit
	used          atomic.Int64 // bytes of objects, counted only against most

	mu      sync.Mutex
	durable map[string]bool // folders whose own names this process has synced
	damage  []DamagedError  // what was set aside
}

const (
	markFile   = "rimlight-store"
	markText   = "rimlight result store, format "
	formatMade = 1 // the format that this program reads and writes
	readmeFile = "README.txt"
)

// readme is part of the format: where the mark is damaged, it vouches for it.
// A format with another number needs another text.
const readme = `This folder keeps results of rimlight, so that they need not be computed again.
It is a result store of format 1.

Every file under objects/ is named by the SHA-256 of its content. Every file
under records/ says which objects a computation gave, and what it depended on.
Reports do not need this folder. It may be deleted as a whole; what was in it
is then computed again when it is needed. Single files must not be edited: that
is noticed, and the file is set aside in damaged/, where it may be deleted.
`

var markContent = fmt.Sprintf("%s%d\n", markText, formatMade)

// Open opens the store in a folder, which it makes if there is none. A folder
// that holds something else, or a store of an unknown format, is refused. A
// store on a read-only disk can be opened; putting something in it fails.
func Open(dir string) (*Store, error) {
	if dir == "" {
		return nil, errors.New("the result store has no folder: name one with --store")
	}
	dir, err := filepath.Abs(dir)
	if err != nil {
		return nil, fmt.Errorf("the result store cannot be found: %w", err)
	}
	s := &Store{dir: dir, now: time.Now, files: realFiles, reserve: DefaultReserve, durable: map[string]bool{}}
	mark, err := os.ReadFile(filepath.Join(dir, markFile))
	switch {
	case err == nil && s.vouched():
		return s, nil // and if the mark is damaged, Verify says so, and Use mends it
	case errors.Is(err, fs.ErrNotExist):
		if err := s.create(); err != nil {
			return nil, err
		}
		return s, nil
	case err != nil:
		return nil, fmt.Errorf("the result store %s cannot be opened: %w", dir, err)
	}
	return s, checkMark(dir, string(mark))
}

// Is reports whether a folder is a store, of whatever format.
func Is(dir string) bool {
	_, err := os.Stat(filepath.Join(dir, markFile))
	return err == nil
}

// Dir is the folder of the store, an absolute path.
func (s *Store) Dir() string { return s.dir }

// vouched reports whether the file for people says that this is a store of the
// format that this program knows.
func (s *Store) vouched() bool {
	text, err := s.files.read(filepath.Join(s.dir, readmeFile))
	return err == nil && string(text) == readme
}

// frame gives the flaws of the files that make the folder a store.
func (s *Store) frame() []error {
	var flaws []error
	for _, f := range []struct{ name, text string }{{readmeFile, readme}, {markFile, markContent}} {
		path := filepath.Join(s.dir, f.name)
		text, err := s.files.read(path)
		if err == nil && string(text) != f.text {
			err = fmt.Errorf("%s is damaged: its %d bytes are not those of a store of format %d", path, len(text), formatMade)
		}
		if err != nil {
			flaws = append(flaws, err)
		}
	}
	return flaws
}

// mend writes the files again that make the folder a store, and says what was
// wrong with them.
func (s *Store) mend() (notes []string) {
	flaws := s.frame()
	if len(flaws) == 0 {
		return nil
	}
	end := "; it was written again"
	if err := s.begin(); err != nil {
		end = "; it could not be written again: " + err.Error()
	}
	for _, f := range flaws {
		notes = append(notes, f.Error()+end)
	}
	return notes
}

func checkMark(dir, mark string) error {
	format, ok := strings.CutPrefix(mark, markText)
	n, err := strconv.Atoi(strings.TrimSuffix(format, "\n"))
	switch {
	case !ok || err != nil:
		return fmt.Errorf("the file %s should begin with %q, but holds %.60q: choose another folder with --store, or, if this is a store and that file was damaged, write %q into it", filepath.Join(dir, markFile), markText, mark, markContent)
	case n != formatMade:
		return fmt.Errorf("the result store %s has format %d, but this program knows format %d only: choose another folder with --store, or use the program that made it", dir, n, formatMade)
	}
	return nil
}

// create makes a store in a folder that is absent, empty, or was left by
// somebody who was stopped in here.
func (s *Store) create() error {
	entries, err := os.ReadDir(s.dir)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("no result store can be made in %s: %w", s.dir, err)
	}
	if s.vouched() {
		entries = nil // a store whose mark was lost, or is about to be made
	}
	for _, e := range entries {
		if s.leftByCreate(e) {
			continue
		}
		if mark, err := os.ReadFile(filepath.Join(s.dir, markFile)); err == nil {
			return checkMark(s.dir, string(mark)) // another process has just made it
		}
		return fmt.Errorf("%s is no result store, and not empty (it has %s): choose another folder with --store", s.dir, e.Name())
	}
	return s.begin()
}

// leftByCreate reports whether an entry of the folder can be there because
// somebody is making a store in it, or was stopped in that.
func (s *Store) leftByCreate(e fs.DirEntry) bool {
	if e.Name() != "tmp" {
		return false
	}
	staged, err := os.ReadDir(filepath.Join(s.dir, "tmp"))
	for _, e := range staged {
		if !strings.HasPrefix(e.Name(), tmpPrefix) {
			return false
		}
	}
	return err == nil
}

// begin makes the folder a store.
func (s *Store) begin() error {
	if err := os.MkdirAll(filepath.Join(s.dir, "tmp"), 0o777); err != nil {
		return fmt.Errorf("no result store can be made in %s: %w", s.dir, err)
	}
	// the mark comes last: with it, the folder is a store
	for _, f := range []struct{ name, text string }{{readmeFile, readme}, {markFile, markContent}} {
		if err := s.write(filepath.Join(s.dir, f.name), []byte(f.text), 0o644, s.rename); err != nil {
			return err
		}
	}
	return nil
}
