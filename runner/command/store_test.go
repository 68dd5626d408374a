package command

import (
	"bytes"
	"encoding/json"
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

// TestStoreList holds that the list says what reports need, and what each result
// is.
func TestStoreList(t *testing.T) {
	b := newBench(t, arithmetic)
	dir := filepath.Join(b.dir, "rimlight.store")
	b.run(ExitDone)
	b.run(ExitDone, "--set", "offset=7", "--out", filepath.Join(b.dir, "seven"))
	said := storeCommand(t, ExitDone, "list", dir)
	for _, want := range []string{"seven ", "r.out ", "r.md ", "30 results", "no report needs 0 of them, which take 0 B", "done"} {
		if !strings.Contains(said, want) {
			t.Errorf("the list does not say %q:\n%s", want, said)
		}
	}
	said = storeCommand(t, ExitDone, "list", dir, "--json")
	lines := strings.Split(strings.TrimSpace(said), "\n")
	shared := 0
	for _, l := range lines {
		var r struct {
			Key, What, By string
			Computed      time.Time
			Bytes         int64
			Needed_by     []string
			Results       []struct{ Name, Hash string }
		}
		if err := json.Unmarshal([]byte(l), &r); err != nil {
			t.Fatal(err)
		}
		if len(r.Key) != 64 || r.What == "" || r.By == "" || r.Computed.IsZero() || r.Bytes == 0 || len(r.Results) == 0 {
			t.Errorf("a result is listed as %s", l)
		}
		if len(r.Needed_by) == 2 {
			shared++
		}
		if r.What != "Sum" {
			continue
		}
		said := storeCommand(t, ExitDone, "show", dir, r.Key[:9])
		for _, want := range []string{r.Key, r.By, "step Sum", "took", "needed by", r.Results[0].Hash, "code "} {
			if !strings.Contains(said, want) {
				t.Errorf("the record does not show %q:\n%s", want, said)
			}
		}
	}
	if len(lines) != 30 || shared != 2 { // List and Name
		t.Errorf("%d results are listed, %d of them shared:\n%s", len(lines), shared, said)
	}
	if said := storeCommand(t, ExitWrong, "show", dir, "xyz"); !strings.Contains(said, "no result whose key begins") {
		t.Errorf("of a key that is not there it says %s", said)
	}
}

// TestStoreKeeps holds that trimming spares what a recipe or report needs that is
// named, and refuses to guess what an unreadable report needs.
func TestStoreKeeps(t *testing.T) {
	b := newBench(t, flagged)
	dir, out := filepath.Join(b.dir, "rimlight.store"), filepath.Join(b.dir, "r.out")
	first, _ := b.run(ExitCheckFailed)
	age(t, dir, 48*time.Hour)
	if err := os.Rename(out, filepath.Join(b.dir, "moved")); err != nil {
		t.Fatal(err)
	}
	if said := storeCommand(t, ExitDone, "trim", dir); !strings.Contains(said, "15 results") || !strings.Contains(said, "r.out is gone") {
		t.Errorf("of a store that nothing needs, trim says\n%s", said)
	}
	said := storeCommand(t, ExitDone, "trim", dir, "--keep", filepath.Join(b.dir, "moved"))
	if !strings.Contains(said, "0 results and 0 files") {
		t.Errorf("with the report named, trim says\n%s", said)
	}
	// The recipe's element that fails keeps what comes after it from being known,
	// so that Sum is not among what it needs.
	said = storeCommand(t, ExitDone, "trim", dir, "--keep", filepath.Join(b.dir, "r.md"), "--remove")
	if !strings.Contains(said, "1 results") || !strings.Contains(said, "Sum ") {
		t.Errorf("with the recipe named, trim says\n%s", said)
	}
	again, _ := b.run(ExitCheckFailed)
	if hashes(again) != hashes(first) || !strings.Contains(reasons(again), "Sum") || strings.Contains(reasons(again), "List") {
		t.Errorf("after trimming, the run computed %q", reasons(again))
	}
	if err := os.WriteFile(filepath.Join(out, recordFile), []byte("{"), 0o644); err != nil {
		t.Fatal(err)
	}
	if said := storeCommand(t, ExitFailed, "trim", dir, "--remove"); !strings.Contains(said, "cannot be told") {
		t.Errorf("with a damaged run.json, trim says\n%s", said)
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
		{"trim", dir, "--older", "soon"}, {"trim", dir, "--size", "large"}, {"trim", dir, "--keep", filepath.Join(dir, "nowhere")}, {"show", dir}} {
		storeCommand(t, ExitWrong, args...)
	}
}
