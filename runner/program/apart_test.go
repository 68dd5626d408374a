package program

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"os"
	"os/exec"
	"runtime/debug"
	"strings"
	"testing"
	"time"
)

// Samples run in another process, since one that never ends, or that calls
// itself without end, could not be stopped in this one and would take all others
// with it.

// An errand is a sample and how it is to be run.
type errand struct {
	Name, Shared, Body string
	Way                way
}

type way string

const (
	checked   way = "checked"   // as a recipe: checked, and run when nothing is said against it
	bare      way = "bare"      // run as it stands, whatever the rules say
	rewritten way = "rewritten" // rewritten and run, whatever the rules say
)

func (s sample) errand(w way) errand { return errand{s.name, s.shared, s.body, w} }

// An outcome is what a sample gives; or, in Refused, the complaints about it; or,
// in Ended, how it ended the process.
type outcome struct {
	Text           []byte // no string: JSON would mend its UTF-8
	Refused, Ended string
}

const (
	// patience is how long a sample may take; nearly all take milliseconds.
	patience = 20 * time.Second
	// maxStack is what a call without end may use. Samples need far less.
	maxStack = 64 << 20
)

// apart runs samples in other processes, one after the other, and gives the
// outcome of each.
func apart(t *testing.T, list []errand) []outcome {
	var out []outcome
	for len(out) < len(list) {
		done, how := oneProcess(t, list[len(out):])
		out = append(out, done...)
		if len(out) < len(list) {
			out = append(out, outcome{Ended: how})
		}
	}
	return out
}

// oneProcess gives the outcomes of the samples that another process came
// through, and how it ended.
func oneProcess(t *testing.T, list []errand) (done []outcome, how string) {
	executable, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	var in, said bytes.Buffer
	if err := json.NewEncoder(&in).Encode(list); err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(executable, "-test.run=^TestErrands$")
	cmd.Env = append(os.Environ(), "RIMLIGHT_ERRANDS=1")
	cmd.Stdin, cmd.Stderr = &in, &said
	pipe, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	hung := make(chan struct{})
	alarm := time.AfterFunc(patience, func() {
		close(hung)
		_ = cmd.Process.Kill()
	})
	lines := bufio.NewScanner(pipe)
	lines.Buffer(nil, 1<<20)
	for lines.Scan() {
		var o outcome
		if json.Unmarshal(lines.Bytes(), &o) != nil {
			continue // what the test binary says
		}
		alarm.Reset(patience)
		done = append(done, o)
	}
	alarm.Stop()
	err = cmd.Wait()
	select {
	case <-hung:
		return done, fmt.Sprintf("it does not end within %v", patience)
	default:
	}
	for _, line := range strings.Split(said.String(), "\n") {
		if strings.HasPrefix(line, "fatal error: ") || strings.HasPrefix(line, "panic: ") {
			return done, line
		}
	}
	return done, fmt.Sprint(err)
}

// TestErrands is the other process of apart.
func TestErrands(t *testing.T) {
	if os.Getenv("RIMLIGHT_ERRANDS") == "" {
		t.Skip("serves other tests")
	}
	debug.SetMaxStack(maxStack)
	var list []errand
	if err := json.NewDecoder(os.Stdin).Decode(&list); err != nil {
		t.Fatal(err)
	}
	show := json.NewEncoder(os.Stdout)
	for _, e := range list {
		if err := show.Encode(e.run()); err != nil {
			t.Fatal(err)
		}
	}
}

func (e errand) run() (out outcome) {
	s := sample{name: e.Name, shared: e.Shared, body: e.Body}
	if e.Way == checked {
		p, diags := Check(s.name, []byte(s.source()))
		if len(diags) > 0 {
			return outcome{Refused: diags.Error()}
		}
		return outcome{Text: []byte(p.outcome())}
	}
	defer func() {
		if r := recover(); r != nil {
			out = outcome{Text: fmt.Append(nil, "LOST ", r)}
		}
	}()
	c := typed(s)
	p := &Program{file: s.name}
	c.stepRules()
	for _, d := range c.steps {
		p.Steps = append(p.Steps, c.step(d))
	}
	if e.Way == rewritten {
		c.lint()
		normalise(c)
	}
	p.src, p.tree = c.src, c.tree
	return outcome{Text: []byte(p.outcome())}
}

// TestRunaways checks that samples which never return are told from those beside
// them.
func TestRunaways(t *testing.T) {
	if testing.Short() {
		t.Skip("needs other processes")
	}
	list := []errand{
		sample{name: "before", body: "func Run() string { return \"a\" }\n"}.errand(checked),
		sample{name: "endless", body: "func Run() string { var f func(x float64) float64; f = func(x float64) float64 { return f(x) + 1 }; return fmt.Sprint(f(1)) }\n"}.errand(checked),
		sample{name: "after", body: "func Run() string { return \"b\" }\n"}.errand(checked),
	}
	out := apart(t, list)
	if len(out[0].Text) == 0 || out[1].Ended != "fatal error: stack overflow" || len(out[2].Text) == 0 {
		t.Errorf("outcomes %+v", out)
	}
}
