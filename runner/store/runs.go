package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"strings"
)

// Register remembers a run whose record, a file outside the store, lists keys
// that the run needs. Registering again changes nothing.
func (s *Store) Register(recordFile string) error {
	path, err := filepath.Abs(recordFile)
	if err != nil {
		return err
	}
	name := filepath.Join(s.dir, "runs", HashOf([]byte(path)).Short())
	if old, err := s.files.read(name); err == nil && string(old) == path+"\n" {
		return nil
	}
	return s.write(name, []byte(path+"\n"), 0o644, s.rename)
}

// Runs lists the record files of registered runs, in order, also of those that
// are no longer there. Registrations that are damaged are among the flaws: which
// run they are of cannot be told.
func (s *Store) Runs() (runs []string, flaws []error, err error) {
	entries, err := os.ReadDir(filepath.Join(s.dir, "runs"))
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return nil, nil, err
	}
	for _, e := range entries {
		file := filepath.Join(s.dir, "runs", e.Name())
		b, err := s.files.read(file)
		if err != nil {
			return nil, nil, err
		}
		path := strings.TrimSuffix(string(b), "\n")
		if string(b) != path+"\n" || HashOf([]byte(path)).Short() != e.Name() {
			flaws = append(flaws, fmt.Errorf("%s is damaged: it should name the run.json of a report that needs results of this store; run the recipe of that report again, or delete the file if there is no such report", file))
			continue
		}
		runs = append(runs, path)
	}
	sort.Strings(runs)
	return runs, flaws, nil
}
