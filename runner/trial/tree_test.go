package trial

import (
	"fmt"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"regexp"
	"sort"
	"strings"
	"testing"

	"rimlight/runner/store"
)

// A tree is everything that a run is to give, by name: the objects, the records
// without times, the tables, and the report without times. Objects are named by
// their content, and have that content where the store verifies.
type tree map[string]string

// treeOf collects what a run gave that has completed. It runs the recipe once
// more, with everything known, so that the reports of all trees are of such a
// run.
func treeOf(b *bench) tree {
	b.t.Helper()
	b.run(0)
	b.verify(0)
	out := tree{}
	for _, dir := range []string{"objects", "records"} {
		for _, path := range filesBelow(b.t, filepath.Join(b.store, dir)) {
			out[dir+"/"+filepath.Base(path)] = "there"
		}
	}
	for _, r := range b.records() {
		out["records/"+r.Key.String()] = fmt.Sprint(r.Text, r.Results, r.Log, r.Notes)
	}
	for _, name := range []string{"spectrum.csv", "spectrum.ecsv", "report.html"} {
		text, err := os.ReadFile(filepath.Join(b.out, name))
		if err != nil {
			b.t.Fatal(err)
		}
		out[name] = times.ReplaceAllString(string(text), "·")
	}
	return out
}

// undisturbed is the tree of a run that nobody disturbs.
func undisturbed(t testing.TB) tree {
	t.Helper()
	if quiet == nil {
		b := newBench(t)
		b.run(0)
		quiet = treeOf(b)
	}
	return maps.Clone(quiet)
}

var quiet tree // the tests here run one after another

// times are what differs between the reports of two runs: when they were, how
// long things took, and what took longest.
var times = regexp.MustCompile(`\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ|(&lt; )?[0-9.]+ m?s\b|the slowest \([^)]*\)`)

// equal demands that two trees are the same.
func (got tree) equal(t testing.TB, want tree) {
	t.Helper()
	var differ []string
	for name, text := range want {
		if got[name] != text {
			differ = append(differ, name)
		}
	}
	for name := range got {
		if _, ok := want[name]; !ok {
			differ = append(differ, name+" (not in an undisturbed run's)")
		}
	}
	sort.Strings(differ)
	if len(differ) > 0 {
		t.Errorf("%d of %d parts of the tree differ from an undisturbed run's: %s", len(differ), len(want), strings.Join(differ[:min(len(differ), 10)], ", "))
	}
}

// within leaves out what another tree does not have.
func (got tree) within(want tree) tree {
	maps.DeleteFunc(got, func(name, _ string) bool { return want[name] == "" })
	return got
}

// records are all records of the store, each of which must be readable.
func (b *bench) records() []store.Record {
	b.t.Helper()
	s, err := store.Open(b.store)
	if err != nil {
		b.t.Fatal(err)
	}
	keys, err := s.Keys()
	if err != nil {
		b.t.Fatal(err)
	}
	var out []store.Record
	for _, k := range keys {
		r, ok, err := s.Record(k)
		if !ok {
			b.t.Fatalf("record %s: %v", k.Short(), err)
		}
		out = append(out, r)
	}
	return out
}

// gapBeyond reports whether an object that is not in want is the gap of an
// element that cost two workers their lives. A run that was killed right then
// may not have told of it.
func gapBeyond(b *bench, want tree) bool {
	for _, path := range filesBelow(b.t, filepath.Join(b.store, "objects")) {
		if want["objects/"+filepath.Base(path)] != "" {
			continue
		}
		content, err := os.ReadFile(path)
		if err != nil {
			b.t.Fatal(err)
		}
		if strings.Contains(string(content), "killed from outside") {
			return true
		}
	}
	return false
}

// filesBelow lists the files below a folder, in order; none if it is not there.
func filesBelow(t testing.TB, dir string) []string {
	t.Helper()
	var out []string
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			out = append(out, path)
		}
		if os.IsNotExist(err) {
			return nil // or it goes while this looks
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}
