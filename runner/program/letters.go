package program

import (
	"fmt"
	"go/token"
	"go/types"
	"strings"
	"unicode"
	"unicode/utf8"

	"rimlight/runner/diag"
	"rimlight/runner/program/available"
)

// A reader must see what is computed. So code has no characters that are
// invisible or that turn the direction of what follows, also in comments and
// texts; and no names that look like others. Greek names are fine, as are names of
// any one script, and Latin ones with a Greek letter: σ, λ0, Δflux, ширина.

// invisible reports whether r, which follows before, cannot be seen.
func invisible(before, r rune) bool {
	switch {
	case r >= ' ' && r <= '~' || r == '\n' || r == '\t' || r == '\r':
		return false
	case r == 0xfe0e || r == 0xfe0f: // which make a symbol text or emoji
		return !unicode.In(before, unicode.So, unicode.Sm, unicode.Po)
	}
	return unicode.In(r, unicode.Cc, unicode.Cf, unicode.Zl, unicode.Zp, unicode.Variation_Selector, unicode.Other_Default_Ignorable_Code_Point)
}

// visible refuses invisible characters.
func (c *checker) visible() {
	line, start := 1, 0
	var before rune
	for i := 0; i < len(c.src) && len(c.diags) <= maxFaults; {
		r, size := utf8.DecodeRune(c.src[i:])
		if invisible(before, r) {
			what := "an invisible character"
			if unicode.Is(unicode.Bidi_Control, r) {
				what = "a character that turns the direction of the text"
			}
			c.diags.Add(diag.Pos{File: c.file, Line: line, Col: i - start + 1},
				fmt.Sprintf("U+%04X is %s", r, what), fmt.Sprintf("leave it out, or write %s within a text", escaped(r)), "")
		}
		i += size
		if before = r; r == '\n' {
			line, start = line+1, i
		}
	}
}

func escaped(r rune) string {
	if r > 0xffff {
		return fmt.Sprintf(`\U%08x`, r)
	}
	return fmt.Sprintf(`\u%04x`, r)
}

// Letters that look like Latin ones. Those in same are drawn alike in nearly all
// fonts, those in near in many.
var same = alike("ΑA ΒB ΕE ΖZ ΗH ΙI ΚK ΜM ΝN ΟO ΡP ΤT ΥY ΧX οo ϲc Ϲc ϳj " +
	"АA ВB ЕE КK МM НH ОO РP СC ТT УY ХX ІI ЈJ ЅS аa еe оo рp сc уy хx іi јj ѕs һh ԁd ԛq ԝw " +
	"ɑa ɡg ıi ɩi ſf ǀl")

var near = alike("αa γy ιi κk νv ρp υu χx ηn ωw")

func alike(pairs string) map[rune]rune {
	out := map[rune]rune{}
	for _, p := range strings.Fields(pairs) {
		r := []rune(p)
		out[r[0]] = r[1]
	}
	return out
}

// names of scripts whose letters stand together in one language.
var together = []string{"Han Hiragana Katakana", "Han Bopomofo", "Han Hangul", "Latin Greek"}

// scriptsOf gives the scripts of the letters of a name.
func scriptsOf(name string) map[string]bool {
	out := map[string]bool{}
	for _, r := range name {
		if r < utf8.RuneSelf {
			if unicode.IsLetter(r) {
				out["Latin"] = true
			}
			continue
		}
		for script, table := range unicode.Scripts {
			if unicode.Is(table, r) && script != "Common" && script != "Inherited" {
				out[script] = true
			}
		}
	}
	return out
}

// scriptTrouble says what is wrong with the letters of a name by itself.
func scriptTrouble(name string) (message, expected string) {
	for _, r := range name {
		if plain := plainLetter(r); plain != 0 {
			return fmt.Sprintf("%c U+%04X in name %s is a form of %c", r, r, name, plain), fmt.Sprintf("write %c U+%04X", plain, plain)
		}
	}
	scripts := scriptsOf(name)
	if len(scripts) < 2 {
		return "", ""
	}
	for _, set := range together {
		of := strings.Fields(set)
		found := 0
		for _, s := range of {
			if scripts[s] {
				found++
			}
		}
		if found < len(scripts) {
			continue
		}
		if of[1] == "Greek" {
			for _, r := range name {
				if plain := same[r]; plain != 0 && unicode.Is(unicode.Greek, r) {
					return fmt.Sprintf("%c U+%04X in name %s looks like the Latin letter %c", r, r, name, plain), "use the Latin letter, or another name"
				}
			}
		}
		return "", ""
	}
	for _, r := range name {
		if r >= utf8.RuneSelf && !unicode.In(r, unicode.Latin, unicode.Common, unicode.Nd) {
			return fmt.Sprintf("name %s mixes letters of several scripts, as %c U+%04X", name, r, r), "use the letters of one script in a name"
		}
	}
	return "", ""
}

// plainLetter is the letter that r is a compatibility form of, 0 for other
// letters.
func plainLetter(r rune) rune {
	switch {
	case r == 0x212a:
		return 'K'
	case r == 0x212b:
		return '\u00c5'
	case r == 0x2126:
		return '\u03a9'
	case r >= 0xff21 && r <= 0xff3a || r >= 0xff41 && r <= 0xff5a || r >= 0xff10 && r <= 0xff19:
		return r - 0xff21 + 'A' // full width
	case r >= 0x1d400 && r <= 0x1d6a3: // mathematical letters, 13 alphabets
		if i := (r - 0x1d400) % 52; i < 26 {
			return 'A' + i
		} else {
			return 'a' + i - 26
		}
	case r >= 0x1d7ce && r <= 0x1d7ff:
		return '0' + (r-0x1d7ce)%10
	}
	return 0
}

// skeleton is what a name looks like. Single Greek letters look like Latin ones
// only where there is no difference at all.
func skeleton(name string) string {
	latin := strings.ContainsFunc(name, func(r rune) bool { return r < utf8.RuneSelf && unicode.IsLetter(r) })
	return strings.Map(func(r rune) rune {
		if r == 0xb5 { // the micro sign
			return 0x3bc
		}
		if s := same[r]; s != 0 {
			return s
		}
		if s := near[r]; s != 0 && latin {
			return s
		}
		return r
	}, name)
}

// A lookout finds names that look like others.
type lookout struct {
	names map[string]string // by skeleton
	lines map[string]int
	said  map[string]bool
}

func newLookout() *lookout {
	k := &lookout{names: map[string]string{}, lines: map[string]int{}, said: map[string]bool{}}
	for _, p := range available.Packages {
		name := available.Name(p.Path)
		k.names[name] = name
	}
	return k
}

// look takes a name of the recipe and says what is wrong with it, if anything.
func (k *lookout) look(name string, line int) (message, expected string) {
	if k.said[name] {
		return "", ""
	}
	if message, expected = scriptTrouble(name); message != "" {
		k.said[name] = true
		return message, expected
	}
	s := skeleton(name)
	other, known := k.names[s]
	if !known {
		if token.IsKeyword(s) || types.Universe.Lookup(s) != nil {
			other = s
		} else {
			k.names[s], k.lines[s] = name, line
			return "", ""
		}
	}
	if other == name {
		return "", ""
	}
	k.said[name] = true
	where := ""
	if l := k.lines[s]; l > 0 {
		where = fmt.Sprintf(" in line %d", l)
	}
	return fmt.Sprintf("name %s looks like name %s%s, and differs from it in %s", name, other, where, differences(name, other)), "choose names that a reader can tell apart"
}

// differences are the letters of a name that another lacks.
func differences(name, other string) string {
	var out []string
	for _, r := range name {
		if r >= utf8.RuneSelf && !strings.ContainsRune(other, r) {
			out = append(out, fmt.Sprintf("%c U+%04X", r, r))
		}
	}
	if out == nil {
		for _, r := range other {
			if r >= utf8.RuneSelf && !strings.ContainsRune(name, r) {
				out = append(out, fmt.Sprintf("%c U+%04X", r, r))
			}
		}
	}
	return strings.Join(out, ", ")
}
