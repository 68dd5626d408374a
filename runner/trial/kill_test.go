package trial

import (
	"bufio"
	"encoding/json"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// TestKills kills runs at random moments: the program, a worker, or both. A run
// completes when it is left in peace for long enough; the results have to be
// those of an undisturbed one, whatever was killed before. No run may compute
// what the store had when it started.
func TestKills(t *testing.T) {
	kills := 60 // .ci/run asks for more
	if testing.Short() {
		kills = 20
	}
	if n, err := strconv.Atoi(os.Getenv("RIMLIGHT_KILLS")); err == nil {
		kills = n
	}
	want := undisturbed(t)
	seed := uint64(4)
	if n, err := strconv.ParseUint(os.Getenv("RIMLIGHT_SEED"), 10, 64); err == nil {
		seed = n
	}
	rng := rand.New(rand.NewPCG(seed, 200))
	trees, done, tally := 0, 0, map[string]int{}
	for ; done < kills; trees++ {
		b := newBench(t) // what is complete leaves nothing to kill
		for complete := false; !complete; {
			if done >= kills {
				b.run(0)
				break
			}
			var killed []string
			killed, complete = b.attempt(rng)
			for _, whom := range killed {
				done++
				tally[whom]++
			}
		}
		got := treeOf(b)
		if b.gap || gapBeyond(b, want) {
			got = got.within(want)
		}
		got.equal(t, want)
		b.tidy()
	}
	t.Logf("%d kills, %d trees, seed %d: %v", done, trees, seed, tally)
	for _, whom := range []string{program, aWorker, both} {
		if tally[whom] < kills/10 {
			t.Errorf("%d kills of %s in %d", tally[whom], whom, kills)
		}
	}
}

// Whom to kill.
const (
	program = "the program"
	aWorker = "a worker"
	both    = "both"
)

// A moment is when to kill, and whom: some time after so many more events, or
// after all steps are done.
type moment struct {
	whom   string
	events int
	last   bool
	after  time.Duration
}

// choose chooses a moment: by time, by events, of which each element gives one,
// or while the report is being made.
func choose(rng *rand.Rand) moment {
	m := moment{whom: []string{program, aWorker, both}[rng.IntN(3)]}
	milliseconds := func(n int) time.Duration { return time.Duration(rng.IntN(n*1000)) * time.Microsecond }
	switch n := rng.IntN(20); {
	case n < 6:
		m.after = milliseconds(200)
	case n < 17:
		m.events, m.after = 1+rng.IntN(12), milliseconds(5)
	case n < 18:
		m.events, m.after = 1+rng.IntN(elements+20), milliseconds(10)
	default:
		m.last, m.after = true, milliseconds(150)
	}
	return m
}

// attempt runs the recipe and kills until the program is dead or done. It gives
// who was killed, and whether the run completed nevertheless. It holds that
// nothing is computed that the store had before.
func (b *bench) attempt(rng *rand.Rand) (killed []string, complete bool) {
	b.t.Helper()
	before := b.finished()
	c := b.command("--json")
	var errs strings.Builder
	c.Stderr = &errs
	out, err := c.StdoutPipe()
	if err != nil {
		b.t.Fatal(err)
	}
	if err := c.Start(); err != nil {
		b.t.Fatal(err)
	}
	arriving := make(chan event)
	go func() {
		defer close(arriving)
		lines := bufio.NewScanner(out)
		lines.Buffer(nil, 1<<20)
		for lines.Scan() {
			var e event
			if json.Unmarshal(lines.Bytes(), &e) == nil { // else cut short by the kill
				arriving <- e
			}
		}
	}()
	var events []event
	reached := func(m moment) bool {
		for n, last := 0, false; n < m.events || m.last && !last; n++ {
			e, ok := <-arriving
			if !ok {
				return false
			}
			events, last = append(events, e), e.Finished == e.Of && e.Of > 0
		}
		then := time.After(m.after)
		for {
			select {
			case e, ok := <-arriving:
				if !ok {
					return false
				}
				events = append(events, e)
			case <-then:
				return true
			}
		}
	}
	var workers []int
	for alive := true; alive; {
		m := choose(rng)
		if !reached(m) {
			break
		}
		now := children(c.Process.Pid)
		workers = append(workers, now...)
		if m.whom != program && len(now) > 0 {
			syscall.Kill(now[rng.IntN(len(now))], syscall.SIGKILL)
		}
		if m.whom != aWorker {
			c.Process.Kill()
			alive = false
		}
		if m.whom != aWorker || len(now) > 0 {
			killed = append(killed, m.whom)
		}
	}
	for e := range arriving {
		events = append(events, e)
	}
	c.Wait()
	b.holdReuse(before, events)
	for _, e := range events { // two kills of workers hit the same element
		b.gap = b.gap || e.Name == "Fit" && e.Error != ""
	}
	for _, pid := range workers {
		gone(b.t, pid)
	}
	switch status := c.ProcessState.ExitCode(); {
	case status == 0:
		return killed, true
	case status == -1 && len(killed) > 0:
		return killed, false
	case slices.Contains(killed, aWorker):
		if !strings.Contains(errs.String()+fmt.Sprint(events), "killed") {
			b.t.Errorf("workers were killed, and the run failed without saying so: %s %v", errs.String(), events)
		}
		return killed, false
	}
	b.t.Fatalf("the run ended with %v; it said\n%s", c.ProcessState, errs.String())
	return
}

// events runs the recipe to its end, demands an exit status, and gives the
// events.
func (b *bench) events(status int) []event {
	b.t.Helper()
	var out []event
	for line := range strings.Lines(b.run(status, "--json")) {
		var e event
		if err := json.Unmarshal([]byte(line), &e); err != nil {
			b.t.Fatalf("%v in %q", err, line)
		}
		out = append(out, e)
	}
	return out
}

// An event is a line that a run says with --json.
type event struct {
	Event    string
	Name     string
	State    string
	Error    string
	Finished int // steps and inputs
	Of       int
	Done     int `json:"elements_done"`
	Elements int
}

// finished gives what the store has of each step and input, by name: the number
// of records.
func (b *bench) finished() map[string]int {
	b.t.Helper()
	out := map[string]int{}
	if _, err := os.Stat(filepath.Join(b.store, "rimlight-store")); err != nil {
		return out
	}
	for _, r := range b.records() {
		lines := strings.SplitN(r.Text, "\n", 3) // the version of keys, then what it is of
		out[lines[1]]++
	}
	return out
}

// holdReuse demands that a run used what the store had before: what was whole is
// reused, and a fan-out starts from the number of elements that were there.
func (b *bench) holdReuse(before map[string]int, events []event) {
	b.t.Helper()
	begun := map[string]bool{}
	for _, e := range events {
		if e.Name == "" || begun[e.Name] {
			continue
		}
		begun[e.Name] = true
		if b.gap && slices.Contains([]string{"Total", "Assemble", "Check"}, e.Name) {
			continue // they may have been computed from what had a gap in it
		}
		n := before["step "+e.Name]
		if e.Event == "input" {
			n = before["read text"]
		}
		whole := n > 0
		if e.Elements > 0 {
			whole = n == elements
			if e.Done != n {
				b.t.Errorf("step %s starts with %d of its elements, the store had %d", e.Name, e.Done, n)
			}
		}
		if (e.State == "reused") != whole {
			b.t.Errorf("%s %s was %q at first, and the store had %d results of it", e.Event, e.Name, e.State, n)
		}
	}
}

// tidy demands that killed runs left nothing but unfinished files, which a
// later run deletes when they are old.
func (b *bench) tidy() {
	b.t.Helper()
	old := time.Now().Add(-25 * time.Hour)
	places := []string{b.out, b.tmp(), filepath.Join(b.store, "tmp"), filepath.Join(b.store, "using")}
	for _, dir := range places {
		for _, path := range filesBelow(b.t, dir) {
			if err := os.Chtimes(path, old, old); err != nil {
				b.t.Fatal(err)
			}
		}
	}
	b.run(0)
	var left []string
	for _, dir := range places {
		left = append(left, filesBelow(b.t, dir)...)
	}
	if len(left) != 4 { // the report, two tables, the record
		b.t.Errorf("left are %v", left)
	}
}

// children lists the processes that a process has started, in order.
func children(pid int) []int {
	var out []int
	lists, _ := filepath.Glob(fmt.Sprintf("/proc/%d/task/*/children", pid))
	for _, l := range lists {
		text, _ := os.ReadFile(l)
		for _, f := range strings.Fields(string(text)) {
			if n, err := strconv.Atoi(f); err == nil {
				out = append(out, n)
			}
		}
	}
	slices.Sort(out)
	return out
}

// gone waits for a process to be gone.
func gone(t testing.TB, pid int) {
	t.Helper()
	for deadline := time.Now().Add(20 * time.Second); ; time.Sleep(time.Millisecond) {
		stat, err := os.ReadFile(fmt.Sprintf("/proc/%d/stat", pid))
		if err != nil || strings.Contains(string(stat), ") Z ") {
			return
		}
		if time.Now().After(deadline) {
			t.Errorf("a worker outlives the program: %s", stat)
			return
		}
	}
}
