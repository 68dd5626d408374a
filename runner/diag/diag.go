// Package diag holds what the program has to say about a recipe: positions in
// the Markdown file and complaints about them.
package diag

import (
	"fmt"
	"sort"
	"strings"
	"unicode/utf8"
)

// A Pos is a place in a recipe. Line and Col count from 1; Col counts bytes.
// A zero Line means the file as a whole.
type Pos struct {
	File string
	Line int
	Col  int
}

// String gives FILE:LINE:COL, or FILE alone for the file as a whole.
func (p Pos) String() string {
	if p.Line == 0 {
		return p.File
	}
	return fmt.Sprintf("%s:%d:%d", p.File, p.Line, p.Col)
}

// A Diagnostic is one fault found in a recipe.
type Diagnostic struct {
	Pos      Pos
	Message  string // what is wrong
	Expected string // what was expected or what to write instead; may be empty
	Nearest  string // the nearest known name, for a name that is not known; may be empty
}

// String gives "FILE:LINE:COL: what is wrong; what was expected; nearest
// known name: NAME" on one line.
func (d Diagnostic) String() string {
	s := d.Pos.String() + ": " + d.Message
	if d.Expected != "" {
		s += "; " + d.Expected
	}
	if d.Nearest != "" {
		s += "; nearest known name: " + d.Nearest
	}
	return strings.Join(strings.FieldsFunc(s, func(r rune) bool { return r == '\n' || r == '\r' }), " ")
}

// A List is the faults of one recipe. It is an error when not empty.
type List []Diagnostic

// Add appends a fault.
func (l *List) Add(pos Pos, message, expected, nearest string) {
	*l = append(*l, Diagnostic{pos, message, expected, nearest})
}

// Sort orders the list by position and drops exact repeats.
func (l *List) Sort() {
	s := *l
	sort.SliceStable(s, func(i, j int) bool {
		a, b := s[i], s[j]
		if a.Pos.Line != b.Pos.Line {
			return a.Pos.Line < b.Pos.Line
		}
		if a.Pos.Col != b.Pos.Col {
			return a.Pos.Col < b.Pos.Col
		}
		return a.Message < b.Message
	})
	out := s[:0]
	for i, d := range s {
		if i == 0 || d != s[i-1] {
			out = append(out, d)
		}
	}
	*l = out
}

// Err returns the list as an error, nil when it is empty.
func (l List) Err() error {
	if len(l) == 0 {
		return nil
	}
	return l
}

// Error gives every fault, one per line.
func (l List) Error() string {
	lines := make([]string, len(l))
	for i, d := range l {
		lines[i] = d.String()
	}
	return strings.Join(lines, "\n")
}

// Nearest returns the known name that is closest to name by edit distance
// (insertions, deletions, substitutions and swaps of neighbours each count
// one, case counts less), or "" when none is close enough to be meant.
func Nearest(name string, known []string) string {
	best, bestCost := "", 1+max(1, utf8.RuneCountInString(name)/3)
	for _, k := range known {
		if n := utf8.RuneCountInString(name) - utf8.RuneCountInString(k); max(n, -n) > bestCost {
			continue // no need to compare what is too long, at a cost of both lengths multiplied
		}
		c := distance(strings.ToLower(name), strings.ToLower(k))
		if c < bestCost || c == bestCost && best != "" && k < best {
			best, bestCost = k, c
		}
	}
	if best == name {
		return ""
	}
	return best
}

func distance(a, b string) int {
	s, t := []rune(a), []rune(b)
	d := make([][]int, len(s)+1)
	for i := range d {
		d[i] = make([]int, len(t)+1)
		d[i][0] = i
	}
	for j := range d[0] {
		d[0][j] = j
	}
	for i := 1; i <= len(s); i++ {
		for j := 1; j <= len(t); j++ {
			cost := 1
			if s[i-1] == t[j-1] {
				cost = 0
			}
			d[i][j] = min(d[i-1][j]+1, d[i][j-1]+1, d[i-1][j-1]+cost)
			if i > 1 && j > 1 && s[i-1] == t[j-2] && s[i-2] == t[j-1] {
				d[i][j] = min(d[i][j], d[i-2][j-2]+1)
			}
		}
	}
	return d[len(s)][len(t)]
}
