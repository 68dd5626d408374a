package store

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

func TestUse(t *testing.T) {
	s := open(t)
	one, _, err := s.Use(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	two, _, err := s.Use(t.Context())
	if err != nil {
		t.Fatalf("a second run: %v", err)
	}
	one()
	_, err = s.Alone()
	var in *InUseError
	if !errors.As(err, &in) || !strings.Contains(err.Error(), "a run on ") || !strings.Contains(err.Error(), "wait until that is done") {
		t.Fatalf("trimming while a run goes on: %v", err)
	}
	two()
	trimmed, err := s.Alone()
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.Alone(); !errors.As(err, &in) || !strings.Contains(err.Error(), "trimming on ") {
		t.Errorf("trimming twice: %v", err)
	}
	ctx, cancel := context.WithTimeout(t.Context(), 100*time.Millisecond)
	defer cancel()
	if _, _, err := s.Use(ctx); !errors.Is(err, context.DeadlineExceeded) {
		t.Errorf("a run does not wait for a trimming: %v", err)
	}
	time.AfterFunc(50*time.Millisecond, trimmed)
	release, notes, err := s.Use(t.Context())
	if err != nil || len(notes) > 0 {
		t.Fatalf("%q, %v", notes, err)
	}
	release()
	if left := tree(t, s, using); len(left) > 0 {
		t.Errorf("left are %v", left)
	}
}

// TestUseSilent holds that one who has given no sign of life for long counts as
// gone, one who has gives way to nobody, and that the age is told by the disk's
// clock and not by this machine's.
func TestUseSilent(t *testing.T) {
	s := open(t)
	s.now = func() time.Time { return time.Now().Add(-1000 * time.Hour) }
	if _, err := s.announce(byRun, "a run"); err != nil {
		t.Fatal(err)
	}
	killed := tree(t, s, using)[0]
	for _, c := range []struct {
		age  time.Duration
		free bool
	}{{silence - time.Minute, false}, {silence + time.Minute, true}, {-time.Hour, false}} {
		when := time.Now().Add(-c.age)
		if err := os.Chtimes(killed, when, when); err != nil {
			t.Fatal(err)
		}
		release, err := s.Alone()
		if (err == nil) != c.free {
			t.Errorf("after %s of silence: %v", c.age, err)
		}
		if err == nil {
			release()
		}
	}
}

// TestLeftBehind holds that a run deletes what others left in tmp/ and using/
// when that is old, whoever they were, and nothing that may be in the making.
func TestLeftBehind(t *testing.T) {
	s := open(t)
	put(t, s, "depth")
	at := func(name string, age time.Duration) string {
		path := filepath.Join(s.dir, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte("half"), 0o444); err != nil {
			t.Fatal(err)
		}
		when := time.Now().Add(-age)
		if err := os.Chtimes(path, when, when); err != nil {
			t.Fatal(err)
		}
		return path
	}
	old := []string{at("tmp/new-1", 25*time.Hour), at("using/run-1", 25*time.Hour), at("using/trim-1", 1000*time.Hour)}
	young := []string{at("tmp/new-2", 23*time.Hour), at("tmp/new-3", 0), at("tmp/new-4", -1000*time.Hour), at("using/run-2", time.Hour), at("damaged/d", 1000*time.Hour)}
	release, notes, err := s.Use(t.Context())
	if err != nil || len(notes) > 0 {
		t.Fatalf("%q, %v", notes, err)
	}
	defer release()
	for _, path := range old {
		if _, err := os.Stat(path); !os.IsNotExist(err) {
			t.Errorf("%s is still there", path)
		}
	}
	for _, path := range young {
		if _, err := os.Stat(path); err != nil {
			t.Errorf("%s was deleted", path)
		}
	}
}

// TestSigns holds that a use is kept fresh for as long as it lasts.
func TestSigns(t *testing.T) {
	s := open(t)
	synctest.Test(t, func(t *testing.T) {
		u, err := s.announce(byRun, "a run")
		if err != nil {
			t.Fatal(err)
		}
		if err := os.Truncate(u.path, 0); err != nil {
			t.Fatal(err)
		}
		time.Sleep(2 * signs)
		synctest.Wait()
		if text, err := os.ReadFile(u.path); err != nil || string(text) != u.text {
			t.Errorf("after two minutes it says %q, %v", text, err)
		}
		u.release()
		if _, err := os.Stat(u.path); !os.IsNotExist(err) {
			t.Errorf("after the release: %v", err)
		}
	})
}

func TestUseReadOnly(t *testing.T) {
	s := open(t)
	put(t, s, "depth")
	makeReadOnly(t, s.dir)
	release, notes, err := s.Use(t.Context())
	if err != nil || len(notes) != 1 || !strings.Contains(notes[0], "may be trimmed while it goes on") {
		t.Errorf("%q, %v", notes, err)
	}
	release()
	if _, err := s.Alone(); err == nil || !strings.Contains(err.Error(), "cannot be written to") {
		t.Errorf("trimming: %v", err)
	}
}

// TestRuns damages a registration, and holds that this is noticed: a report
// would lose what it needs.
func TestRuns(t *testing.T) {
	s := open(t)
	for range 2 {
		for _, run := range []string{"/reports/a/run.json", "/reports/b/run.json"} {
			if err := s.Register(run); err != nil {
				t.Fatal(err)
			}
		}
	}
	runs, flaws, err := s.Runs()
	if len(runs) != 2 || runs[1] != "/reports/b/run.json" || len(flaws) > 0 || err != nil {
		t.Fatalf("%q, %v, %v", runs, flaws, err)
	}
	file := tree(t, s, "runs")[0]
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	sound := string(data)
	for bit := range 8 * len(data) {
		data[bit/8] ^= 1 << (bit % 8)
		replace(t, file, data)
		if runs, flaws, err := s.Runs(); len(runs) != 1 || len(flaws) != 1 || err != nil || !strings.Contains(flaws[0].Error(), file+" is damaged") {
			t.Errorf("with bit %d flipped: %q, %v, %v", bit, runs, flaws, err)
		}
		data[bit/8] ^= 1 << (bit % 8)
	}
	if _, errs, err := s.Verify(nil); len(errs) != 1 || err != nil {
		t.Errorf("verifying says %v, %v", errs, err)
	}
	if err := s.Register(strings.TrimSuffix(sound, "\n")); err != nil {
		t.Fatal(err)
	}
	if runs, flaws, err := s.Runs(); len(runs) != 2 || len(flaws) > 0 || err != nil {
		t.Errorf("registered again: %q, %v, %v", runs, flaws, err)
	}
}
