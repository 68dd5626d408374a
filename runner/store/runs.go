package store

import (
	"errors"
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
	return s.write(name, []byte(path+"\n"), 0o644, s.files.rename)
}

// Runs lists the record files of registered runs, in order, also of those that
// are no longer there.
func (s *Store) Runs() ([]string, error) {
	entries, err := os.ReadDir(filepath.Join(s.dir, "runs"))
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return nil, err
	}
	var out []string
	for _, e := range entries {
		b, err := s.files.read(filepath.Join(s.dir, "runs", e.Name()))
		if err != nil {
			return nil, err
		}
		out = append(out, strings.TrimSuffix(string(b), "\n"))
	}
	sort.Strings(out)
	return out, nil
}
