package surface

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"testing"
)

// TestSurface makes calls with random arguments.
func TestSurface(t *testing.T) {
	calls := 20000
	if testing.Short() {
		calls = 4000
	}
	calls = int(number(t, "RIMLIGHT_SURFACE_CALLS", uint64(calls)))
	first := number(t, "RIMLIGHT_SURFACE_SEED", 0)
	only := os.Getenv("RIMLIGHT_SURFACE_TARGET")
	all := targets()

	counts := try(t, schedule(all, only, first, calls))
	good := 0
	for _, target := range all {
		c := counts[target.Name]
		switch {
		case !strings.Contains(target.Name, only):
		case c == nil:
			t.Errorf("%s was not called", target.Name)
		default:
			good += c.Good
			t.Logf("%7d of %7d %s", c.Good, c.Calls, target.Name)
			// Whatever is refused at the door has not been tested.
			if calls >= 20000 && c.Good*20 < c.Calls {
				t.Errorf("%s: %d of %d calls returned without error; its samples are no good", target.Name, c.Good, c.Calls)
			}
		}
	}
	t.Logf("%d calls of %d targets from number %d, %d without error", calls, len(counts), first, good)
}

// TestCases makes the calls that once failed.
func TestCases(t *testing.T) {
	data, err := os.ReadFile("testdata/cases.txt")
	if err != nil {
		t.Fatal(err)
	}
	var jobs []job
	for line := range strings.Lines(string(data)) {
		line, _, _ = strings.Cut(line, "#")
		if fields := strings.Fields(line); len(fields) > 0 {
			var j job
			if _, err := fmt.Sscan(line, &j.Target, &j.Seed); err != nil {
				t.Fatalf("testdata/cases.txt: %q: expected a target and a number", line)
			}
			jobs = append(jobs, j)
		}
	}
	if len(jobs) == 0 {
		t.Fatal("testdata/cases.txt holds no cases")
	}
	try(t, jobs)
}

// try makes the calls and fails the test for each finding.
func try(t *testing.T, jobs []job) map[string]*count {
	t.Helper()
	counts := map[string]*count{}
	findings := map[string]bool{}
	run(t, jobs, counts, func(f finding) {
		// One report for each place.
		key := f.Job.Target + f.Kind + f.Text
		if !findings[key] && len(findings) < 400 {
			t.Errorf("%s %d: %s: %s", f.Job.Target, f.Job.Seed, f.Kind, f.Text)
		}
		findings[key] = true
	})
	return counts
}

// run makes the calls in workers, a new one when one dies.
func run(t *testing.T, jobs []job, counts map[string]*count, report func(finding)) {
	t.Helper()
	const enough = 40
	for deaths := 0; len(jobs) > 0; deaths++ {
		if deaths > enough {
			t.Fatalf("more than %d workers died", enough)
		}
		begun, complete, stderr := attempt(t, jobs, counts, report)
		if complete {
			return
		}
		if begun == 0 {
			t.Fatalf("a worker died before its first call:\n%s", stderr)
		}
		if stderr != "" {
			report(finding{jobs[begun-1], "died", stderr})
		}
		jobs = jobs[begun:]
	}
}

// A count says how many calls of a target were begun, and how many of them
// returned without an error.
type count struct{ Calls, Good int }

// attempt runs one worker. It gives the number of calls begun, whether all were
// made, and what the worker said when it died.
func attempt(t *testing.T, jobs []job, counts map[string]*count, report func(finding)) (begun int, complete bool, died string) {
	t.Helper()
	input, err := json.Marshal(jobs)
	if err != nil {
		t.Fatal(err)
	}
	var stderr bytes.Buffer
	cmd := exec.CommandContext(t.Context(), os.Args[0])
	cmd.Env = append(os.Environ(), workerMark+"=1")
	cmd.Stdin = bytes.NewReader(input)
	cmd.Stderr = &stderr
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	for d := json.NewDecoder(out); ; {
		var m message
		if err := d.Decode(&m); err != nil {
			if !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrUnexpectedEOF) {
				t.Errorf("what a worker wrote: %v", err)
			}
			break
		}
		if m.Good {
			counts[jobs[begun-1].Target].Good++
		}
		if m.Begin > 0 {
			begun = m.Begin
			name := jobs[begun-1].Target
			if counts[name] == nil {
				counts[name] = &count{}
			}
			counts[name].Calls++
		}
		if m.Finding != nil {
			report(*m.Finding)
		}
		complete = complete || m.Done
	}
	if err := cmd.Wait(); err != nil && !complete {
		return begun, false, head(stderr.String())
	}
	return begun, complete, ""
}

// head gives the cause of death and the places in the library.
func head(stderr string) string {
	if stderr == "" {
		return ""
	}
	first, _, _ := strings.Cut(stderr, "\n")
	return first + "\n" + inLibrary([]byte(stderr))
}

func number(t *testing.T, name string, otherwise uint64) uint64 {
	t.Helper()
	text := os.Getenv(name)
	if text == "" {
		return otherwise
	}
	n, err := strconv.ParseUint(text, 10, 64)
	if err != nil {
		t.Fatalf("%s is %q; expected a whole number", name, text)
	}
	return n
}
