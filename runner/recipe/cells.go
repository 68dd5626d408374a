package recipe

import (
	"strings"
	"unicode"
)

// A cell is a table cell. Its text is what a reader sees: without the blanks
// around it, without backticks or emphasis around the whole, and with escaped
// punctuation set free. Other markup inside is kept as written.
type cell struct {
	text  string
	raw   string // text before escapes are resolved
	code  bool   // stood between backticks
	start int    // offset of raw in the source; of the cell, when it is empty
}

// splitRow cuts a table row into its cells as GFM does: at every pipe that has
// no backslash before it, leaving out one pipe at either end.
func splitRow(source []byte, start, end int) []cell {
	for start < end && blank(source[start]) {
		start++
	}
	for start < end && blank(source[end-1]) {
		end--
	}
	if start < end && source[start] == '|' {
		start++
	}
	if start < end && source[end-1] == '|' && (end-1 == start || source[end-2] != '\\') {
		end--
	}
	var cells []cell
	from := start
	for i := start; i < end; i++ {
		if source[i] == '|' && (i == start || source[i-1] != '\\') {
			cells = append(cells, newCell(source, from, i))
			from = i + 1
		}
	}
	if from < end || len(cells) > 0 {
		cells = append(cells, newCell(source, from, end))
	}
	return cells
}

func blank(c byte) bool { return c == ' ' || c == '\t' || c == '\r' || c == '\v' || c == '\f' }

func newCell(source []byte, start, end int) cell {
	s := string(source[start:end])
	trimmed := strings.TrimLeftFunc(s, unicode.IsSpace)
	if trimmed == "" {
		return cell{start: start}
	}
	start += len(s) - len(trimmed)
	c := cell{raw: strings.TrimRightFunc(trimmed, unicode.IsSpace), start: start}
	c.unwrap()
	c.text = unescape(c.raw, c.code)
	return c
}

// unwrap takes off emphasis and backticks that surround the whole cell.
func (c *cell) unwrap() {
	for _, mark := range []string{"**", "__", "*", "_"} {
		if in, ok := between(c.raw, mark); ok && !strings.Contains(in, mark[:1]) && strings.TrimSpace(in) == in {
			c.raw, c.start = in, c.start+len(mark)
			break
		}
	}
	ticks := len(c.raw) - len(strings.TrimLeft(c.raw, "`"))
	if ticks == 0 {
		return
	}
	mark := c.raw[:ticks]
	in, ok := between(c.raw, mark)
	if !ok || strings.Contains(in, mark) {
		return
	}
	c.code = true
	c.start += ticks
	left := strings.TrimLeftFunc(in, unicode.IsSpace)
	c.start += len(in) - len(left)
	c.raw = strings.TrimRightFunc(left, unicode.IsSpace)
}

// bare takes blanks and backticks off an element of a cell.
func bare(s string) string {
	s = strings.TrimSpace(s)
	if in, ok := between(s, "`"); ok && !strings.Contains(in, "`") {
		return strings.TrimSpace(in)
	}
	return s
}

func between(s, mark string) (string, bool) {
	if len(s) <= 2*len(mark) || !strings.HasPrefix(s, mark) || !strings.HasSuffix(s, mark) {
		return "", false
	}
	return s[len(mark) : len(s)-len(mark)], true
}

// escaped reports whether s[i] is a backslash that hides the next byte. In
// code only a pipe can be hidden.
func escaped(s string, i int, code bool) bool {
	if s[i] != '\\' || i+1 == len(s) {
		return false
	}
	if code {
		return s[i+1] == '|'
	}
	c := s[i+1]
	return c > ' ' && c < 0x7f && !('0' <= c && c <= '9' || 'a' <= c && c <= 'z' || 'A' <= c && c <= 'Z')
}

func unescape(s string, code bool) string {
	if !strings.Contains(s, `\`) {
		return s
	}
	var b strings.Builder
	for i := 0; i < len(s); i++ {
		if escaped(s, i, code) {
			i++
		}
		b.WriteByte(s[i])
	}
	return b.String()
}

// offset is where byte i of the cell's text stands in the source.
func (c cell) offset(i int) int {
	if len(c.text) == len(c.raw) {
		return c.start + i
	}
	at := 0
	for ; at < len(c.raw) && i > 0; i-- {
		if escaped(c.raw, at, c.code) {
			at++
		}
		at++
	}
	if at < len(c.raw) && escaped(c.raw, at, c.code) {
		at++
	}
	return c.start + at
}
