// Package nearest finds the known name that a mistyped one was probably meant
// to be, for error messages.
package nearest

import "strings"

// longest is the length in bytes above which names are not compared: nobody
// mistypes such a name, and a hostile file may hold many.
const longest = 64

// Name returns the entry of known that is most like name, or "" when none is
// alike. Letter case does not count. Two names are alike when at most a third
// of the letters, and at least one, have to be changed; of equally close
// entries the first wins.
func Name(name string, known []string) string {
	if len(name) > longest {
		return ""
	}
	word := strings.ToUpper(name)
	best, bestCost := "", max(1, len(word)/3)+1
	for _, k := range known {
		if k == "" || len(k) > longest {
			continue
		}
		if cost := distance(word, strings.ToUpper(k)); cost < bestCost {
			best, bestCost = k, cost
		}
	}
	return best
}

// Hint returns "; nearest known name: NAME", or "" when no entry of known is
// like name.
func Hint(name string, known []string) string {
	if n := Name(name, known); n != "" {
		return "; nearest known name: " + n
	}
	return ""
}

// distance is the number of single-byte insertions, deletions and
// replacements that turn a into b (Levenshtein 1966).
func distance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := 1; i <= len(a); i++ {
		diagonal := row[0]
		row[0] = i
		for j := 1; j <= len(b); j++ {
			replace := diagonal
			if a[i-1] != b[j-1] {
				replace++
			}
			diagonal = row[j]
			row[j] = min(replace, row[j]+1, row[j-1]+1)
		}
	}
	return row[len(b)]
}
