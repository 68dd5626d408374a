package command

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"

	"rimlight/runner/record"
)

// unfinished begins the names of files that are being written into the folder
// of a report.
const unfinished = ".unfinished-"

// prepareFolder makes the folder of a report and sees whether it can be written
// to, before anything is computed. Files that killed runs left there a day ago
// are deleted.
func prepareFolder(dir string) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return fmt.Errorf("no folder for the report can be made; choose another one with --out: %w", err)
	}
	probe, err := os.CreateTemp(dir, unfinished+"*")
	if err != nil {
		return fmt.Errorf("the report cannot be written into %s; choose another folder with --out: %w", dir, err)
	}
	probe.Close()
	defer os.Remove(probe.Name())
	now, err := os.Stat(probe.Name())
	if err != nil {
		return nil // it was deleted: it can be made again
	}
	entries, _ := os.ReadDir(dir) // what cannot be seen does no harm
	for _, e := range entries {
		st, err := e.Info()
		if err == nil && strings.HasPrefix(e.Name(), unfinished) && now.ModTime().Sub(st.ModTime()) > 24*time.Hour {
			os.Remove(filepath.Join(dir, e.Name())) // or stays
		}
	}
	return nil
}

// An outFile is a file for the folder of a report; one without data is to be
// taken away.
type outFile struct {
	name string
	data []byte
}

func (f outFile) identity() record.File {
	sum := sha256.Sum256(f.data)
	return record.File{Name: f.name, Size: int64(len(f.data)), SHA256: hex.EncodeToString(sum[:])}
}

// replaceFiles puts files into a folder, in the given order, each of them
// complete or not at all. Of runs that write into one folder at the same time,
// the files of the last one stay, and all of these.
func replaceFiles(dir string, files []outFile) error {
	if err := os.MkdirAll(dir, 0o777); err != nil { // it may have been deleted
		return fmt.Errorf("the report cannot be written: %w", err)
	}
	defer lockFolder(dir)()
	staged := make([]string, len(files))
	defer func() {
		for _, tmp := range staged {
			if tmp != "" {
				os.Remove(tmp)
			}
		}
	}()
	for i, f := range files {
		if f.data == nil {
			continue
		}
		var err error
		if staged[i], err = stageFile(dir, f.data); err != nil {
			return fmt.Errorf("%s cannot be written; all results are kept, and will be used again: %w", filepath.Join(dir, f.name), err)
		}
	}
	for i, f := range files {
		path := filepath.Join(dir, f.name)
		var err error
		if f.data == nil {
			if err = os.Remove(path); errors.Is(err, fs.ErrNotExist) {
				err = nil
			}
		} else if err = os.Rename(staged[i], path); err == nil {
			staged[i] = ""
		}
		if err != nil {
			return fmt.Errorf("%s cannot be replaced; all results are kept, and will be used again: %w", path, err)
		}
	}
	return nil
}

// stageFile writes a file that has no name yet, and gives its path.
func stageFile(dir string, data []byte) (string, error) {
	f, err := os.CreateTemp(dir, unfinished+"*")
	if err != nil {
		return "", err
	}
	_, err = f.Write(data)
	if err := errors.Join(err, f.Chmod(0o644), f.Close()); err != nil {
		os.Remove(f.Name())
		return "", err
	}
	return f.Name(), nil
}
