package recipe

import (
	"fmt"
	"go/token"
	"go/types"
	"strings"
	"unicode"
	"unicode/utf8"
)

// reserved are the names that a step's signature uses for other things.
var reserved = map[string]string{
	"seed":   "the random seed of a step",
	"priors": "the parameter table of a section",
	"err":    "the error of a step",
}

const nameForm = "expected a lower-case letter, then letters and digits, such as clipSigma"

// checkName complains about a name that cannot be that of a step's parameter.
func (p *parsing) checkName(what string, c cell) bool {
	s := c.text
	switch first, _ := utf8.DecodeRuneInString(s); {
	case s == "":
		p.add(c.start, fmt.Sprintf("the %s has no name", what), nameForm, "")
	case token.IsKeyword(s):
		p.add(c.start, fmt.Sprintf("%s is a keyword of Go and cannot name the %s", s, what), "expected another name", "")
	case !token.IsIdentifier(s) || !unicode.IsLower(first):
		p.add(c.start, fmt.Sprintf("%s cannot name the %s: steps have no parameter of this form", quote(s), what), nameForm, "")
	case types.Universe.Lookup(s) != nil:
		p.add(c.start, fmt.Sprintf("%s has a meaning in Go and cannot name the %s", s, what), "expected another name", "")
	case reserved[s] != "":
		p.add(c.start, fmt.Sprintf("%s stands for %s and cannot name the %s", s, reserved[s], what), "expected another name", "")
	default:
		return true
	}
	return false
}

// word reports whether s is a letter followed by letters, digits and any of
// the further characters.
func word(s, further string) bool {
	for i, r := range s {
		if unicode.IsLetter(r) || i > 0 && (unicode.IsDigit(r) || strings.ContainsRune(further, r)) {
			continue
		}
		return false
	}
	return s != ""
}
