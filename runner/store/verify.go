package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// Verify reads and hashes everything in the store. Errors are damaged objects
// and records, which it leaves where they are; hints are things that do no
// harm: files left in tmp/ or set aside, records whose objects are gone.
// Progress, which may be nil, is told how many files of how many are done.
func (s *Store) Verify(progress func(done, total int)) (hints, errs []error, err error) {
	var objects, records []string
	for dir, list := range map[string]*[]string{"objects": &objects, "records": &records} {
		err := filepath.WalkDir(filepath.Join(s.dir, dir), func(path string, d fs.DirEntry, err error) error {
			if errors.Is(err, fs.ErrNotExist) {
				return nil
			}
			if err == nil && !d.IsDir() {
				*list = append(*list, path)
			}
			return err
		})
		if err != nil {
			return nil, nil, err
		}
	}
	done, total := 0, len(objects)+len(records)
	tick := func() {
		if done++; progress != nil {
			progress(done, total)
		}
	}
	for _, path := range objects {
		tick()
		data, err := os.ReadFile(path)
		if err != nil {
			errs = append(errs, err)
			continue
		}
		if h, err := ParseHash(filepath.Base(path)); err != nil {
			hints = append(hints, fmt.Errorf("%s does not belong into a store", path))
		} else if HashOf(data) != h {
			errs = append(errs, fmt.Errorf("the object %s is damaged", path))
		}
	}
	for _, path := range records {
		tick()
		name, _, second := strings.Cut(filepath.Base(path), ".")
		k, err := ParseKey(name)
		if err != nil {
			hints = append(hints, fmt.Errorf("%s does not belong into a store", path))
			continue
		}
		data, err := os.ReadFile(path)
		if err != nil {
			errs = append(errs, err)
			continue
		}
		r, err := decodeRecord(k, data)
		if err != nil {
			errs = append(errs, fmt.Errorf("the record %s is of no use: %w", path, err))
			continue
		}
		if second {
			hints = append(hints, fmt.Errorf("the computation %s was not reproducible: see %s", name[:12], path))
		}
		for _, res := range r.Results {
			if !s.Has(res.Hash) {
				hints = append(hints, fmt.Errorf("the result %s of the record %s is missing; it will be computed again", res.Name, path))
			}
		}
	}
	for _, dir := range []string{"tmp", "damaged"} {
		left, err := os.ReadDir(filepath.Join(s.dir, dir))
		if err != nil && !errors.Is(err, fs.ErrNotExist) {
			return hints, errs, err
		}
		for _, f := range left {
			hints = append(hints, fmt.Errorf("%s is of no use any more", filepath.Join(s.dir, dir, f.Name())))
		}
	}
	return hints, errs, nil
}
