package command

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

func storeCommand(t *testing.T, status int, args ...string) string {
	t.Helper()
	var out, errs bytes.Buffer
	if got := Run(append([]string{"store"}, args...), &out, &errs); got != status {
		t.Fatalf("store %v: exit status %d, expected %d; it said %s%s", args, got, status, out.String(), errs.String())
	}
	return out.String() + errs.String()
}

// age makes everything in a store older.
func age(t *testing.T, dir string, by time.Duration) {
	t.Helper()
	when := time.Now().Add(-by)
	err := filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			err = os.Chtimes(path, when, when)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
}

// TestStoreTrim holds that trimming takes out what no report needs, and only
// that.
func TestStoreTrim(t *testing.T) {
	b := newBench(t, arithmetic)
	dir := filepath.Join(b.dir, "rimlight.store")
	b.run(ExitDone, "--set", "offset=7")
	first, _ := b.run(ExitDone) // the report of offset=7 is gone
	if said := storeCommand(t, ExitDone, "list", dir); !strings.Contains(said, "r.out (12 of 24)") || !strings.Contains(said, "Square") {
		t.Errorf("the list is\n%s", said)
	}
	age(t, dir, 48*time.Hour)
	if said := storeCommand(t, ExitDone, "trim", dir, "--older", "3d"); !strings.Contains(said, "0 results") {
		t.Errorf("nothing is three days old, but trim says\n%s", said)
	}
	// Square of 12 elements, their Sum and Draw belong to offset=7 alone.
	for _, args := range [][]string{{"trim", dir}, {"trim", dir, "--older", "1d"}, {"trim", dir, "--older", "1d", "--remove"}} {
		if said := storeCommand(t, ExitDone, args...); !strings.Contains(said, "14 results") {
			t.Errorf("%v says\n%s", args, said)
		}
	}
	if said := storeCommand(t, ExitDone, "trim", dir, "--remove"); !strings.Contains(said, "0 results and 0 files") {
		t.Errorf("the second time, trim says\n%s", said)
	}
	again, _ := b.run(ExitDone)
	if got := reasons(again); got != "" || hashes(again) != hashes(first) {
		t.Errorf("after trimming, the run computed %q", got)
	}
	storeCommand(t, ExitDone, "verify", dir)
	if r, _ := b.run(ExitDone, "--set", "offset=7"); !strings.HasPrefix(reasons(r), "Square: setting offset changed") {
		t.Errorf("what was taken out is not computed again: %q", reasons(r))
	}
}

func TestStoreVerify(t *testing.T) {
	b := newBench(t, arithmetic)
	dir := filepath.Join(b.dir, "rimlight.store")
	b.run(ExitDone)
	if said := storeCommand(t, ExitDone, "verify", dir); !strings.Contains(said, "0 damaged") {
		t.Errorf("a sound store gives\n%s", said)
	}
	objects, _ := filepath.Glob(filepath.Join(dir, "objects", "*", "*"))
	os.Chmod(objects[3], 0o644)
	if err := os.Truncate(objects[3], 1); err != nil {
		t.Fatal(err)
	}
	if said := storeCommand(t, ExitFailed, "verify", dir); !strings.Contains(said, "1 damaged") || !strings.Contains(said, filepath.Base(objects[3])) {
		t.Errorf("with an object cut short it gives\n%s", said)
	}
}

func TestStoreWrong(t *testing.T) {
	dir := t.TempDir()
	for _, args := range [][]string{{"list"}, {"list", filepath.Join(dir, "nowhere")}, {"verify", filepath.Join(dir, "nowhere")},
		{"trim", dir, "--older", "soon"}, {"trim", dir, "--size", "large"}, {"trim", dir, "--keep", filepath.Join(dir, "nowhere")}} {
		storeCommand(t, ExitWrong, args...)
	}
}
