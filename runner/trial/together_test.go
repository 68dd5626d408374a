package trial

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"rimlight/runner/record"
	"rimlight/runner/store"
)

// together runs commands at once and demands of each that it is done.
func together(t testing.TB, commands ...*exec.Cmd) {
	t.Helper()
	said := make([]bytes.Buffer, len(commands))
	for i, c := range commands {
		c.Stdout, c.Stderr = &said[i], &said[i]
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
	}
	for i, c := range commands {
		if err := c.Wait(); err != nil {
			t.Errorf("%s: %v; it said\n%s", strings.Join(c.Args, " "), err, said[i].String())
		}
	}
}

// TestTwoRuns runs the recipe twice at once, with one store and one or two
// folders for the report.
func TestTwoRuns(t *testing.T) {
	want := undisturbed(t)
	for _, other := range []string{"r.out", "other.out"} {
		b := newBench(t)
		together(t, b.command(), b.command("--out", other))
		for _, dir := range []string{"r.out", other} {
			b.fits(filepath.Join(b.dir, dir))
		}
		treeOf(b).equal(t, want)
		if left := filesBelow(t, filepath.Join(b.store, "using")); len(left) > 0 {
			t.Errorf("left are %v", left)
		}
	}
}

// TestOneFolder has runs with different settings write into one folder again
// and again: what lies there is always of one of them.
func TestOneFolder(t *testing.T) {
	b := newBench(t)
	b.run(0)
	b.run(0, "--set", "work=6000")
	for range 2 {
		together(t, b.command(), b.command("--set", "work=6000"), b.command(), b.command("--set", "work=6000"))
		b.fits(b.out)
	}
}

// fits demands that the files in a folder are those that its record lists.
func (b *bench) fits(dir string) {
	b.t.Helper()
	r, err := record.Read(filepath.Join(dir, "run.json"))
	if err != nil {
		b.t.Fatal(err)
	}
	if len(r.Outputs) != 3 {
		b.t.Errorf("the record lists %v", r.Outputs)
	}
	for _, f := range r.Outputs {
		data, err := os.ReadFile(filepath.Join(dir, f.Name))
		if sum := sha256.Sum256(data); err != nil || hex.EncodeToString(sum[:]) != f.SHA256 {
			b.t.Errorf("%s is not of the run that the record is of (%v)", f.Name, err)
		}
	}
}

// TestStoreDeleted deletes the store of a run that goes on, or a part of it. The
// run ends with the right results or says what happened, and the next one
// completes.
func TestStoreDeleted(t *testing.T) {
	want := undisturbed(t)
	for i, part := range []string{"", "", "objects", "records"} {
		b := newBench(t).slow()
		c, said := b.started()
		b.caught(10 + 10*i)
		if i == 0 { // in one go
			if err := os.Rename(b.store, b.store+".gone"); err != nil {
				t.Fatal(err)
			}
		} else {
			for os.RemoveAll(filepath.Join(b.store, part)) != nil { // the run makes files meanwhile
			}
		}
		c.Wait()
		switch status := c.ProcessState.ExitCode(); status {
		case 0:
			b.fits(b.out)
		case 1:
			says(t, said.String(), "while it was in use")
		default:
			t.Errorf("exit status %d; it said\n%s", status, said.String())
		}
		t.Logf("%q deleted: %v", part, c.ProcessState)
		b.run(0)
		b.verify(0)
		b.write("r.md", recipe)
		b.run(0)
		treeOf(b).within(want).equal(t, want)
	}
}

// TestReportDeleted deletes the folder of the report while the run goes on.
func TestReportDeleted(t *testing.T) {
	b := newBench(t).slow()
	c := b.command()
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	b.caught(10)
	if err := os.RemoveAll(b.out); err != nil {
		t.Fatal(err)
	}
	if err := c.Wait(); err != nil {
		t.Error(err)
	}
	b.fits(b.out)
}

// TestTrimming trims a store with all that there is, again and again, while
// runs go on in it.
func TestTrimming(t *testing.T) {
	b := newBench(t)
	want := undisturbed(t)
	b.run(0, "--out", "deleted.out")
	if err := os.RemoveAll(filepath.Join(b.dir, "deleted.out")); err != nil { // nobody needs the results now
		t.Fatal(err)
	}
	old := time.Now().Add(-48 * time.Hour)
	for _, path := range filesBelow(t, b.store) {
		if err := os.Chtimes(path, old, old); err != nil {
			t.Fatal(err)
		}
	}
	c, said := b.slow().started()
	b.caught(elements + 20)
	says(t, demand(t, b.program("store", "trim", b.store), 0), "would be taken out")
	says(t, demand(t, b.program("store", "trim", b.store, "--remove"), 2), "the result store "+b.store+" is in use (a run on ", "wait until that is done")
	if err := c.Wait(); err != nil {
		t.Errorf("%v; it said\n%s", err, said.String())
	}
	b.write("r.md", recipe)
	before := b.finished()
	if n := before["step Fit"]; n != 2*elements {
		t.Errorf("the store has %d elements of two runs", n)
	}
	stop, stopped := make(chan struct{}), make(chan int)
	go func() {
		trimmed := 0
		for {
			select {
			case <-stop:
				stopped <- trimmed
				return
			default:
				c := b.program("store", "trim", b.store, "--remove")
				if c.Run() == nil {
					trimmed++
				}
			}
		}
	}()
	for range 3 {
		b.run(0)
		b.run(0, "--set", "work=6000")
	}
	close(stop)
	t.Log(<-stopped, "times trimmed")
	b.run(0)
	demand(t, b.program("store", "trim", b.store, "--remove"), 0)
	treeOf(b).within(want).equal(t, want)
}

// TestTrimAfterKill holds that a killed run keeps others from trimming for a
// while only.
func TestTrimAfterKill(t *testing.T) {
	b := newBench(t).slow()
	c := b.command()
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	b.caught(20)
	c.Process.Kill()
	c.Wait()
	says(t, demand(t, b.program("store", "trim", b.store, "--remove"), 2), "if it was killed, it counts as gone after 15m0s without a sign of life")
	old := time.Now().Add(-16 * time.Minute)
	for _, path := range filesBelow(t, filepath.Join(b.store, "using")) {
		if err := os.Chtimes(path, old, old); err != nil {
			t.Fatal(err)
		}
	}
	says(t, demand(t, b.program("store", "trim", b.store, "--remove", "--older", "1d"), 0), "0 results and")
	b.run(0)
}

// TestUnknownNeeds holds that nothing is trimmed as long as it cannot be told
// what a report needs.
func TestUnknownNeeds(t *testing.T) {
	b := newBench(t)
	b.run(0)
	b.run(0, "--set", "work=6000")
	before := len(filesBelow(t, b.store))
	registered := filesBelow(t, filepath.Join(b.store, "runs"))[0]
	for _, file := range []string{registered, filepath.Join(b.out, "run.json")} {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.Truncate(file, int64(len(data)/2)); err != nil {
			t.Fatal(err)
		}
		says(t, demand(t, b.program("store", "trim", b.store, "--remove"), 1), file, "nothing was taken out, since it could be what a report needs")
		if err := os.WriteFile(file, data, 0o644); err != nil {
			t.Fatal(err)
		}
		if n := len(filesBelow(t, b.store)); n != before {
			t.Errorf("%d files are left of %d", n, before)
		}
	}
	says(t, demand(t, b.program("store", "trim", b.store, "--remove"), 0), "taken out")
	b.run(0, "--set", "work=6000")
}

// TestClockSetBack has everything in the store and the last report be of the
// year after next, as when the clock has been set back since.
func TestClockSetBack(t *testing.T) {
	b := newBench(t)
	b.run(0)
	want := treeOf(b)
	const ahead = 2 * 365 * 24 * time.Hour
	s, err := store.Open(b.store)
	if err != nil {
		t.Fatal(err)
	}
	keys, err := s.Keys()
	if err != nil {
		t.Fatal(err)
	}
	for _, k := range keys {
		r, _, err := s.Record(k)
		if err != nil {
			t.Fatal(err)
		}
		r.When = r.When.Add(ahead)
		if err := s.Remove(k); err != nil {
			t.Fatal(err)
		}
		if err := s.SetRecord(r); err != nil {
			t.Fatal(err)
		}
	}
	year := fmt.Sprintf(`%d-`, time.Now().Year())
	later := strings.ReplaceAll(b.read("run.json"), `"`+year, fmt.Sprintf(`"%d-`, time.Now().Year()+2))
	if err := os.WriteFile(filepath.Join(b.out, "run.json"), []byte(later), 0o644); err != nil {
		t.Fatal(err)
	}
	when := time.Now().Add(ahead)
	for _, path := range append(filesBelow(t, b.store), filesBelow(t, b.out)...) {
		if err := os.Chtimes(path, when, when); err != nil {
			t.Fatal(err)
		}
	}
	b.holdReuse(b.finished(), b.events(0))
	treeOf(b).equal(t, want)
	says(t, demand(t, b.program("store", "list", b.store), 0), "r.out")
	b.run(0, "--set", "work=6000", "--out", "other.out")
	if err := os.RemoveAll(filepath.Join(b.dir, "other.out")); err != nil {
		t.Fatal(err)
	}
	says(t, demand(t, b.program("store", "trim", b.store, "--older", "1d", "--remove"), 0), "0 results")
	says(t, demand(t, b.program("store", "trim", b.store, "--remove"), 0), "taken out")
	treeOf(b)
	r, err := record.Read(filepath.Join(b.out, "run.json"))
	if err != nil {
		t.Fatal(err)
	}
	if took := r.Ended.Sub(r.Started); took < 0 || took > time.Minute {
		t.Errorf("the run took %s", took)
	}
}
