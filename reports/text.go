package reports

import (
	"fmt"
	"strings"
	"time"
	"unicode/utf8"
)

// Longest texts that are shown, in bytes. What is longer is cut, and the
// reader is told. Names are identifiers and labels, texts are sentences,
// listings are logs, errors and code.
const (
	longestName    = 300
	longestText    = 8_000
	longestListing = 60_000
)

// clip cuts a text to at most n bytes, saying so.
func clip(s string, n int) string {
	if len(s) <= n {
		return s
	}
	cut := n
	for cut > 0 && !utf8.RuneStart(s[cut]) {
		cut--
	}
	return fmt.Sprintf("%s… [cut here, %s in all]", s[:cut], size(int64(len(s))))
}

func label(s string) string    { return clip(s, longestName) }
func sentence(s string) string { return clip(s, longestText) }
func listing(s string) string  { return clip(s, longestListing) }

// visible makes the characters visible that a reader would not see, or that
// would make him see something else than what is there: control characters,
// direction overrides, zero-width and tag characters. Line ends become "\n".
// It is applied to the whole report, after everything else.
func visible(in []byte) []byte {
	out := make([]byte, 0, len(in)+len(in)/64)
	for i := 0; i < len(in); {
		c := in[i]
		switch {
		case c >= 0x20 && c < 0x7f || c == '\n' || c == '\t':
			out = append(out, c)
			i++
			continue
		case c == '\r' && i+1 < len(in) && in[i+1] == '\n':
			i++
			continue
		}
		r, n := utf8.DecodeRune(in[i:])
		if hidden(r) {
			out = fmt.Appendf(out, "[U+%04X]", r)
		} else {
			out = utf8.AppendRune(out, r)
		}
		i += n
	}
	return out
}

// hidden reports whether a character is shown as nothing, or changes how its
// neighbours are shown. The joiners U+200C and U+200D, which several scripts
// need, are not.
func hidden(r rune) bool {
	switch {
	case r < 0x20, r >= 0x7f && r < 0xa0:
		return true
	case r == 0xad, r == 0x61c, r == 0x115f, r == 0x1160, r == 0x180e, r == 0x3164, r == 0xfeff, r == 0xffa0:
		return true
	case r == 0x200b, r == 0x200e, r == 0x200f:
		return true
	case r >= 0x2028 && r <= 0x202e, r >= 0x2060 && r <= 0x206f:
		return true
	case r >= 0xfff9 && r <= 0xfffb, r >= 0xe0000 && r <= 0xe0fff:
		return true
	}
	return false
}

// slug makes an element's id, or a file name, out of any text.
func slug(s string) string {
	var b strings.Builder
	for _, r := range clip(s, 80) {
		switch {
		case r >= 'a' && r <= 'z', r >= 'A' && r <= 'Z', r >= '0' && r <= '9', r == '_', r == '.':
			b.WriteRune(r)
		default:
			if !strings.HasSuffix(b.String(), "-") {
				b.WriteByte('-')
			}
		}
	}
	return strings.Trim(b.String(), "-.")
}

// shortType takes the folders off the package paths in a Go type.
func shortType(t string) string {
	t = label(t)
	var b strings.Builder
	start := 0
	for i := 0; i <= len(t); i++ {
		if i < len(t) && !strings.ContainsRune("[]*(){}, ;", rune(t[i])) {
			continue
		}
		word := t[start:i]
		b.WriteString(word[strings.LastIndexByte(word, '/')+1:])
		if i < len(t) {
			b.WriteByte(t[i])
		}
		start = i + 1
	}
	return b.String()
}

// size writes a number of bytes with three digits.
func size(n int64) string {
	switch {
	case n < 1000:
		return fmt.Sprintf("%d bytes", n)
	case n < 1_000_000:
		return fmt.Sprintf("%.3g kB", float64(n)/1e3)
	case n < 1_000_000_000:
		return fmt.Sprintf("%.3g MB", float64(n)/1e6)
	}
	return fmt.Sprintf("%.3g GB", float64(n)/1e9)
}

// duration writes a time span with about three digits.
func duration(d time.Duration) string {
	switch {
	case d <= 0:
		return ""
	case d < time.Millisecond:
		return "< 1 ms"
	case d < time.Second:
		return fmt.Sprintf("%d ms", d.Milliseconds())
	case d < time.Minute:
		return fmt.Sprintf("%.3g s", d.Seconds())
	case d < time.Hour:
		return fmt.Sprintf("%d min %02d s", int(d.Minutes()), int(d.Seconds())%60)
	}
	return fmt.Sprintf("%d h %02d min", int(d.Hours()), int(d.Minutes())%60)
}

// utc writes an instant in UTC, to the second.
func utc(t time.Time) string {
	if t.IsZero() {
		return ""
	}
	return t.UTC().Format("2006-01-02T15:04:05Z")
}

// count writes a number with its noun, in the plural where it belongs.
func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}
