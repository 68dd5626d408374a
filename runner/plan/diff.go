package plan

import "strings"

// A Line is a line of a key's text, seen beside the text of another run.
type Line struct {
	Text string
	Mark byte // ' ' in both, '-' only before, '+' only now
}

// Diff lays the text of a key beside that of an earlier run: all lines of
// both, those that changed next to each other. The texts name the same things
// in the same order, so lines are matched by what they are about.
func (t KeyText) Diff(before KeyText) []Line {
	old := map[string]string{} // line by label
	var order []string
	for _, l := range before.lines() {
		label := labelOf(l)
		old[label] = l
		order = append(order, label)
	}
	var out []Line
	seen := map[string]bool{}
	for _, l := range t.lines() {
		label := labelOf(l)
		seen[label] = true
		was, ok := old[label]
		switch {
		case !ok && before == "", ok && was == l:
			out = append(out, Line{l, ' '})
		case !ok:
			out = append(out, Line{l, '+'})
		default:
			out = append(out, Line{was, '-'}, Line{l, '+'})
		}
	}
	for _, label := range order {
		if !seen[label] {
			out = append(out, Line{old[label], '-'})
		}
	}
	return out
}

func (t KeyText) lines() []string {
	if t == "" {
		return nil
	}
	return strings.Split(strings.TrimSuffix(string(t), "\n"), "\n")
}
