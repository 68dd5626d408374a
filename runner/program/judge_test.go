package program

import (
	"bufio"
	"encoding/json"
	"fmt"
	"os"
	"os/exec"
	"sort"
	"strings"
	"testing"
	"time"
)

const strictList = "../../testdata/program/strict.md"

const strictHead = `# Programs refused needlessly

Programs of this folder that recipes may not contain, although their results are determined and the interpreter gives what
compiled Go does, with or without the rewriting. Each is the price of a rule that is right elsewhere. The test of
runner/program writes this list with -update.

`

// judge holds refused programs, whose results are determined, against what they
// give compiled. A refusal is deserved when the interpreter, left to itself and
// with the rewriting, gives something else. All others must be in the list of
// those refused needlessly. It gives their number.
func judge(t *testing.T, suspects []sample, complaint map[string]error, want map[string][]string) int {
	given := withoutRules(t, suspects)
	var entries []string
	judged := map[string]bool{}
	for _, s := range suspects {
		judged[s.name] = true
		for _, way := range []string{"bare", "rewritten"} {
			if agree(given[s.name+" "+way], want[s.name]) {
				first, _, _ := strings.Cut(complaint[s.name].Error(), "\n")
				_, message, _ := strings.Cut(first, ": ")
				entries = append(entries, fmt.Sprintf("- `%s` (%s): %s\n", s.name, way, message))
				break
			}
		}
	}
	sort.Strings(entries)
	text := strictHead + fmt.Sprintf("%d programs:\n\n", len(entries)) + strings.Join(entries, "")
	if *update {
		if err := os.WriteFile(strictList, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	old, err := os.ReadFile(strictList)
	if err != nil {
		t.Fatal(err)
	}
	if thorough() {
		if string(old) != text {
			t.Errorf("%s is not up to date, it should be:\n%s", strictList, text)
		}
		return len(entries)
	}
	var listed []string // of the programs that were run
	for _, line := range strings.SplitAfter(string(old), "\n") {
		if name := strings.Split(line, "`"); strings.HasPrefix(line, "- `") && judged[name[1]] {
			listed = append(listed, line)
		}
	}
	if got, want := strings.Join(entries, ""), strings.Join(listed, ""); got != want {
		t.Errorf("%s should say of the programs run:\n%snot:\n%s", strictList, got, want)
	}
	return len(entries)
}

func agree(got string, want []string) bool {
	for _, w := range want {
		if got != w {
			return false
		}
	}
	return got != "" && len(want) > 0
}

// undetermined reports whether the program breaks a rule that has nothing to
// do with the interpreter: its result is not a function of its arguments, or it
// acts otherwise than by its results.
func undetermined(s sample) bool {
	c := typed(s)
	l := &linter{checker: c}
	l.declarations()
	walk(c.tree, l.result)
	return len(c.diags) > 0
}

// withoutRules runs programs in the interpreter that the rules refuse, each as
// it stands and rewritten. They may hang, so that happens in another process.
func withoutRules(t *testing.T, list []sample) map[string]string {
	out := map[string]string{}
	for len(list) > 0 {
		done := runRefused(t, list, out)
		if done < len(list) {
			out[list[done].name+" bare"] += "" // it hangs
			done++
		}
		list = list[done:]
	}
	return out
}

// patience is how long a program may take in the interpreter.
const patience = 20 * time.Second

// runRefused gives the number of programs that another process came through.
func runRefused(t *testing.T, list []sample, out map[string]string) (done int) {
	executable, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, s := range list {
		names = append(names, s.name)
	}
	cmd := exec.Command(executable, "-test.run=^TestRefusedProgram$")
	cmd.Env = append(os.Environ(), "RIMLIGHT_REFUSED="+strings.Join(names, " "))
	pipe, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	alarm := time.AfterFunc(patience, func() { _ = cmd.Process.Kill() })
	lines := bufio.NewScanner(pipe)
	lines.Buffer(nil, 1<<20)
	for lines.Scan() {
		var r refusedOutcome
		if json.Unmarshal(lines.Bytes(), &r) != nil {
			continue // what the test binary says
		}
		alarm.Reset(patience)
		if r.Done {
			done++
			continue
		}
		out[r.Name] = r.Text
	}
	alarm.Stop()
	_ = cmd.Wait() // a program may have ended it
	return done
}

type refusedOutcome struct {
	Name, Text string
	Done       bool
}

// TestRefusedProgram is the other process of runRefused.
func TestRefusedProgram(t *testing.T) {
	wanted := os.Getenv("RIMLIGHT_REFUSED")
	if wanted == "" {
		t.Skip("serves another test")
	}
	byName := map[string]sample{}
	for _, s := range corpus(t) {
		byName[s.name] = s
	}
	show := json.NewEncoder(os.Stdout)
	for _, name := range strings.Fields(wanted) {
		for _, way := range []string{"bare", "rewritten"} {
			if err := show.Encode(refusedOutcome{Name: name + " " + way, Text: refusedOutput(byName[name], way)}); err != nil {
				t.Fatal(err)
			}
		}
		if err := show.Encode(refusedOutcome{Name: name, Done: true}); err != nil {
			t.Fatal(err)
		}
	}
}

func refusedOutput(s sample, way string) (text string) {
	defer func() {
		if r := recover(); r != nil {
			text = fmt.Sprint("LOST ", r)
		}
	}()
	c := typed(s)
	p := &Program{file: s.name}
	c.stepRules()
	for _, d := range c.steps {
		p.Steps = append(p.Steps, c.step(d))
	}
	if way == "rewritten" {
		c.lint()
		normalise(c)
	}
	p.src, p.tree = c.src, c.tree
	return p.outcome()
}
