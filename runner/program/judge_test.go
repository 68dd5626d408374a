package program

import (
	"fmt"
	"os"
	"sort"
	"strings"
	"testing"
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
func judge(t *testing.T, suspects []sample, complaint map[string]string, want map[string][]string) int {
	given := withoutRules(t, suspects)
	var entries []string
	judged := map[string]bool{}
	for _, s := range suspects {
		judged[s.name] = true
		for _, way := range []way{bare, rewritten} {
			if agree(given[s.name+" "+string(way)], want[s.name]) {
				first, _, _ := strings.Cut(complaint[s.name], "\n")
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
	l := &linter{checker: c, changes: newChanges(c)}
	l.declarations()
	walk(c.tree, l.result)
	return len(c.diags) > 0
}

// withoutRules runs programs in the interpreter that the rules refuse, each as
// it stands and rewritten. One that does not end gives nothing.
func withoutRules(t *testing.T, list []sample) map[string]string {
	var errands []errand
	for _, s := range list {
		errands = append(errands, s.errand(bare), s.errand(rewritten))
	}
	out := map[string]string{}
	for i, o := range apart(t, errands) {
		out[errands[i].Name+" "+string(errands[i].Way)] = string(o.Text)
	}
	return out
}
