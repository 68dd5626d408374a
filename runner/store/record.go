package store

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"time"
)

// A Record says what a computation gave.
type Record struct {
	Key     Key           `json:"key"`
	Text    string        `json:"text"` // the key's text
	Results []Result      `json:"results"`
	Log     string        `json:"log,omitempty"`
	Took    time.Duration `json:"took"` // nanoseconds
	When    time.Time     `json:"when"`
	Host    string        `json:"host"`
	Program string        `json:"program"`
	Notes   []string      `json:"notes,omitempty"`
}

// A Result is a named object.
type Result struct {
	Name   string `json:"name"`
	Type   string `json:"type"`
	Layout string `json:"layout"`
	Hash   Hash   `json:"hash"`
	Size   int64  `json:"size"` // of the content, in bytes
}

// A NotReproducibleError says that a computation gave other bytes than the
// time before. The first results are kept.
type NotReproducibleError struct {
	Name          string // of the first result that differs
	First, Second Hash
}

// Error names the result and both hashes.
func (e *NotReproducibleError) Error() string {
	return fmt.Sprintf("not reproducible: %s was %s and is %s now; the first one is kept", e.Name, e.First.Short(), e.Second.Short())
}

const recordMark = "rimlight record 1"

func (s *Store) recordPath(k Key) string {
	name := k.String()
	return filepath.Join(s.dir, "records", name[:2], name)
}

// encodeRecord gives a record's file: a line with the mark and the SHA-256 of
// what follows, then JSON.
func encodeRecord(r Record) ([]byte, error) {
	body, err := json.MarshalIndent(r, "", " ")
	if err != nil {
		return nil, err
	}
	body = append(body, '\n')
	sum := sha256.Sum256(body)
	return append(fmt.Appendf(nil, "%s %s\n", recordMark, hex.EncodeToString(sum[:])), body...), nil
}

func decodeRecord(k Key, data []byte) (Record, error) {
	line, body, ok := bytes.Cut(data, []byte("\n"))
	sum, marked := bytes.CutPrefix(line, []byte(recordMark+" "))
	if !ok || !marked {
		return Record{}, errors.New("it does not begin as a record does")
	}
	if want := sha256.Sum256(body); string(sum) != hex.EncodeToString(want[:]) {
		return Record{}, errors.New("its checksum is wrong")
	}
	var r Record
	if err := json.Unmarshal(body, &r); err != nil {
		return Record{}, err
	}
	if r.Key != k || KeyOf(r.Text) != k {
		return Record{}, errors.New("it is the record of another key")
	}
	return r, nil
}

// Record looks up what a computation gave. Without a record it returns false;
// a record that can't be used is a miss too, with the reason as the error.
func (s *Store) Record(k Key) (Record, bool, error) {
	path := s.recordPath(k)
	data, err := os.ReadFile(path)
	if errors.Is(err, fs.ErrNotExist) {
		return Record{}, false, nil
	}
	if err != nil {
		return Record{}, false, err
	}
	r, err := decodeRecord(k, data)
	if err != nil {
		return Record{}, false, fmt.Errorf("the record %s is of no use: %w", path, err)
	}
	return r, true, nil
}

// SetRecord keeps a record whose objects are in the store. The first record of
// a key stays: the same results again change nothing, and other results are
// kept beside the first ones and give a *[NotReproducibleError]. A record that
// is damaged, or whose objects are gone, is replaced.
func (s *Store) SetRecord(r Record) error {
	if KeyOf(r.Text) != r.Key {
		panic("store: a record's key is not the hash of its text")
	}
	data, err := encodeRecord(r)
	if err != nil {
		return err
	}
	path := s.recordPath(r.Key)
	// Twice, for the case that another process sets the record in between.
	for range 2 {
		old, ok, flaw := s.Record(r.Key)
		if flaw != nil || ok && !s.whole(old) && compare(old, r) != nil {
			s.setAside(path)
			ok = false
		}
		if ok {
			differs := compare(old, r)
			if differs == nil {
				return nil
			}
			if err := s.write(path+"."+HashOf(data).Short(), data, 0o444); err != nil {
				return fmt.Errorf("a record could not be kept: %w", err)
			}
			return differs
		}
		if err = s.create(path, data, 0o444); err == nil || !errors.Is(err, fs.ErrExist) {
			break
		}
	}
	if err != nil {
		return fmt.Errorf("a record could not be kept: %w", err)
	}
	return nil
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

// compare gives the first difference between the results of two records.
func compare(first, second Record) error {
	for i, a := range first.Results {
		if i >= len(second.Results) {
			return &NotReproducibleError{Name: a.Name, First: a.Hash}
		}
		if b := second.Results[i]; a.Hash != b.Hash {
			return &NotReproducibleError{a.Name, a.Hash, b.Hash}
		}
	}
	return nil
}
