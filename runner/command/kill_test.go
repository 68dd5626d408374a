package command

import (
	"bytes"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"rimlight/runner/record"
)

// slow is arithmetic with squares that take a few milliseconds each.
var slow = strings.Replace(arithmetic, "func square(x float64) float64 { return x * x }",
	"func square(x float64) float64 {\n\ts := 0.0\n\tfor i := 0; i < 60000; i++ {\n\t\ts += 1\n\t}\n\treturn x * x * s / 60000\n}", 1)

// TestKilledRuns kills runs at random moments and holds that the one that is
// left in peace comes to the same results, and computes nothing twice.
func TestKilledRuns(t *testing.T) {
	if testing.Short() {
		t.Skip("takes several seconds")
	}
	undisturbed := newBench(t, slow)
	want, _ := undisturbed.run(ExitDone)
	b := newBench(t, slow)
	rng := rand.New(rand.NewPCG(1, 1))
	recipe := filepath.Join(b.dir, "r.md")
	records := filepath.Join(b.dir, "rimlight.store", "records")
	finished := map[string]time.Time{}
	for range 12 {
		c := rimlight(t, "run", recipe, "--jobs", "2", "--quiet")
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		time.Sleep(time.Duration(rng.IntN(120)) * time.Millisecond)
		c.Process.Signal(syscall.SIGKILL)
		c.Wait()
		filepath.WalkDir(records, func(path string, d os.DirEntry, err error) error {
			if err != nil || d.IsDir() {
				return nil
			}
			st, err := d.Info()
			if err != nil {
				return nil
			}
			if before, ok := finished[path]; ok && !before.Equal(st.ModTime()) {
				t.Errorf("%s was computed again", path)
			}
			finished[path] = st.ModTime()
			return nil
		})
	}
	got, _ := b.run(ExitDone)
	if hashes(got) != hashes(want) {
		t.Errorf("after the kills the results are\n%s\nexpected\n%s", hashes(got), hashes(want))
	}
}

// TestInterrupt holds that an interrupted run says so, keeps what finished, and
// is taken up where it stopped.
func TestInterrupt(t *testing.T) {
	b := newBench(t, strings.ReplaceAll(slow, "60000", "3000000"))
	c := rimlight(t, "run", filepath.Join(b.dir, "r.md"), "--jobs", "1")
	var errs bytes.Buffer
	c.Stderr = &errs
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	records := filepath.Join(b.dir, "rimlight.store", "records", "*", "*")
	for deadline := time.Now().Add(time.Minute); ; time.Sleep(5 * time.Millisecond) {
		if found, _ := filepath.Glob(records); len(found) >= 4 { // the list and some squares
			break
		}
		if time.Now().After(deadline) {
			t.Fatal("nothing was finished in a minute")
		}
	}
	c.Process.Signal(os.Interrupt)
	c.Wait()
	if status := c.ProcessState.ExitCode(); status != ExitInterrupted {
		t.Fatalf("exit status %d, expected %d; it said %s", status, ExitInterrupted, errs.String())
	}
	r, err := record.Read(filepath.Join(b.dir, "r.out", recordFile))
	if err != nil {
		t.Fatal(err)
	}
	if r.Outcome != "interrupted" {
		t.Errorf("the record says %q", r.Outcome)
	}
	done := 0
	for _, el := range r.Steps[1].Elements {
		if el.State == "computed" {
			done++
		}
	}
	r, _ = b.run(ExitDone)
	reused := 0
	for _, el := range r.Steps[1].Elements {
		if el.State == "reused" {
			reused++
		}
	}
	if done == 12 || reused < done {
		t.Errorf("%d elements were done when it was interrupted, %d were used again", done, reused)
	}
}
