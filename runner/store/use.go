package store

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// Who uses a store says so with a file in using/, and writes it again from time
// to time as a sign of life. Runs may go on side by side; trimming needs the
// store to itself. Each first puts its own file there and then looks for those
// of others, so that of a run and a trimming that start at the same moment at
// least one sees the other. Ages are told by the clock of the disk that the
// files are on, the only one that all machines share.
const (
	using    = "using"
	byRun    = "run-"
	byTrim   = "trim-"
	signs    = time.Minute      // between two signs of life
	silence  = 15 * time.Minute // after which somebody counts as gone
	patience = time.Minute      // of a run with a trimming
)

// leftBehind is the age from which a run deletes files left in tmp/ and using/ by
// others who were stopped. It is long: there are machines that sleep over night
// and go on in the morning.
const leftBehind = 24 * time.Hour

// An InUseError says that a store cannot be had because of somebody else.
type InUseError struct {
	Dir  string
	By   string        // host, process, and what they do
	Last time.Duration // since the last sign of life
}

func (e *InUseError) Error() string {
	return fmt.Sprintf("the result store %s is in use (%s, last sign of life %s ago): wait until that is done; if it was killed, it counts as gone after %s without a sign of life",
		e.Dir, e.By, e.Last.Round(time.Second), silence)
}

// Use says that a run uses the store, so that no results are trimmed away that
// it relies on. It mends the mark of the store, and deletes files that others
// have left who were stopped long ago. It waits for a trimming that is going on,
// and gives an [*InUseError] if that takes too long. The notes are for the user;
// they also say so where a store can't be written to. Release ends the use.
func (s *Store) Use(ctx context.Context) (release func(), notes []string, err error) {
	notes = s.mend()
	if _, flaws, err := s.Runs(); err == nil {
		for _, f := range flaws {
			notes = append(notes, f.Error())
		}
	}
	u, err := s.announce(byRun, "a run")
	if err != nil {
		return func() {}, append(notes, fmt.Sprintf("the result store does not know of this run and may be trimmed while it goes on: %v", err)), nil
	}
	for began := time.Now(); ; {
		trimming, err := u.others(byTrim)
		if err != nil {
			return u.release, append(notes, fmt.Sprintf("whether the result store is being trimmed cannot be told: %v", err)), nil
		}
		if trimming == nil {
			u.discard()
			return u.release, notes, nil
		}
		if time.Since(began) > patience {
			u.release()
			return nil, notes, trimming
		}
		select {
		case <-ctx.Done():
			u.release()
			return nil, notes, ctx.Err()
		case <-time.After(20 * time.Millisecond):
		}
	}
}

// Alone says that the store is being trimmed. Where a run or another trimming
// uses it, the error is an [*InUseError]. Release ends it.
func (s *Store) Alone() (release func(), err error) {
	u, err := s.announce(byTrim, "trimming")
	if err != nil {
		return nil, err
	}
	for _, kind := range []string{byRun, byTrim} {
		other, err := u.others(kind)
		if err == nil && other != nil {
			err = other
		}
		if err != nil {
			u.release()
			return nil, err
		}
	}
	return u.release, nil
}

// A use is the file in using/ of somebody who uses a store.
type use struct {
	store       *Store
	path, text  string
	over, ended chan struct{}
}

// announce puts a file into using/ and gives signs of life until the release.
func (s *Store) announce(kind, what string) (*use, error) {
	dir := filepath.Join(s.dir, using)
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return nil, s.explain(err)
	}
	f, err := os.CreateTemp(dir, kind+"*")
	if err != nil {
		return nil, s.explain(err)
	}
	host, _ := os.Hostname()
	u := &use{store: s, path: f.Name(), over: make(chan struct{}), ended: make(chan struct{}),
		text: fmt.Sprintf("%s on %s, process %d, since %s\n", what, host, os.Getpid(), s.now().UTC().Format(time.RFC3339))}
	f.Chmod(0o644) // for others to read; who cannot, shows the name
	if err := errors.Join(f.Close(), u.sign()); err != nil {
		os.Remove(u.path)
		return nil, s.explain(err)
	}
	go func() {
		defer close(u.ended)
		tick := time.NewTicker(signs)
		defer tick.Stop()
		for {
			select {
			case <-tick.C:
				u.sign() // if that fails, others may take this process for gone
			case <-u.over:
				return
			}
		}
	}()
	return u, nil
}

// sign gives a sign of life: it writes the file again if it is still there.
func (u *use) sign() error {
	f, err := os.OpenFile(u.path, os.O_WRONLY, 0)
	if err != nil {
		return err
	}
	_, err = f.WriteString(u.text)
	return errors.Join(err, f.Close())
}

func (u *use) release() {
	close(u.over)
	<-u.ended
	os.Remove(u.path) // if that fails, it is silent from now on
}

// clock is what time it is where the store is.
func (u *use) clock() (time.Time, error) {
	if err := u.sign(); err != nil {
		return time.Time{}, u.store.explain(err)
	}
	st, err := os.Stat(u.path)
	if err != nil {
		return time.Time{}, u.store.explain(err)
	}
	return st.ModTime(), nil
}

// others gives somebody else of a kind who uses the store, nil if there is
// nobody.
func (u *use) others(kind string) (*InUseError, error) {
	now, err := u.clock()
	if err != nil {
		return nil, err
	}
	dir := filepath.Dir(u.path)
	entries, err := os.ReadDir(dir)
	if err != nil {
		return nil, u.store.explain(err)
	}
	for _, e := range entries {
		path := filepath.Join(dir, e.Name())
		if path == u.path || !strings.HasPrefix(e.Name(), kind) {
			continue
		}
		st, err := os.Stat(path)
		if errors.Is(err, fs.ErrNotExist) {
			continue // done this moment
		}
		if err != nil {
			return nil, u.store.explain(err)
		}
		age := now.Sub(st.ModTime())
		if age >= silence {
			continue
		}
		by, err := u.store.files.read(path)
		if err != nil || len(by) == 0 {
			by = []byte(e.Name())
		}
		return &InUseError{u.store.dir, fmt.Sprintf("%.200s", strings.TrimSpace(string(by))), max(0, age)}, nil
	}
	return nil, nil
}

// discard deletes what was left in tmp/ and using/ long ago.
func (u *use) discard() {
	now, err := u.clock()
	if err != nil {
		return
	}
	for _, name := range []string{"tmp", using} {
		dir := filepath.Join(u.store.dir, name)
		entries, _ := os.ReadDir(dir) // what cannot be seen does no harm
		for _, e := range entries {
			if st, err := e.Info(); err == nil && now.Sub(st.ModTime()) > leftBehind {
				os.Remove(filepath.Join(dir, e.Name())) // or stays
			}
		}
	}
}
