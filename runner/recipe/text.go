package recipe

import (
	"bytes"
	"fmt"
	"sort"
	"strings"
	"unicode/utf8"

	"rimlight/runner/diag"
)

// The largest recipe that is read. A recipe is prose, tables and code; numbers
// by the million belong in input files.
const (
	MaxSize  = 4 << 20 // bytes
	MaxLines = 100_000
)

// Bounds on what one line may open. Markdown nests block quotes and lists
// without end, at a cost in time and memory that grows with the depth times
// the number of lines; text meant to be read stays far below these.
const (
	maxMarkers = 32  // block quote and list markers at the start of a line
	maxIndent  = 120 // columns of leading blanks, tabs counted as four
)

// A text is a recipe's source with its line starts.
type text struct {
	file   string
	source []byte
	starts []int // offset of each line's first byte
}

func newText(file string, source []byte) *text {
	t := &text{file: file, source: source, starts: []int{0}}
	for i, c := range source {
		if c == '\n' {
			t.starts = append(t.starts, i+1)
		}
	}
	return t
}

// line is the index, from 0, of the line that holds offset.
func (t *text) line(offset int) int {
	return sort.SearchInts(t.starts, offset+1) - 1
}

// end is the offset after the last byte of a line, without its line ending.
func (t *text) end(line int) int {
	end := len(t.source)
	if line+1 < len(t.starts) {
		end = t.starts[line+1] - 1
	}
	if end > t.starts[line] && t.source[end-1] == '\r' {
		end--
	}
	return end
}

func (t *text) pos(offset int) diag.Pos {
	offset = min(max(offset, 0), len(t.source))
	line := t.line(offset)
	return diag.Pos{File: t.file, Line: line + 1, Col: offset - t.starts[line] + 1}
}

// checkText complains about bytes that are not text, each kind once. It
// reports whether the rest is worth reading.
func (p *parsing) checkText() bool {
	s := p.text.source
	if len(s) > MaxSize {
		p.add(0, fmt.Sprintf("the recipe has %d bytes", len(s)), fmt.Sprintf("expected at most %d; large tables belong in input files", MaxSize), "")
		return false
	}
	if n := len(p.text.starts); n > MaxLines {
		p.add(0, fmt.Sprintf("the recipe has %d lines", n), fmt.Sprintf("expected at most %d; large tables belong in input files", MaxLines), "")
		return false
	}
	if bytes.HasPrefix(s, []byte{0xff, 0xfe}) || bytes.HasPrefix(s, []byte{0xfe, 0xff}) {
		p.add(0, "the file is not UTF-8 text: it starts like UTF-16", "expected UTF-8", "")
		return false
	}
	if i := bytes.IndexByte(s, 0); i >= 0 {
		p.add(i, "the file holds a NUL byte", "expected text only", "")
	}
	for i := 0; i < len(s); {
		r, size := utf8.DecodeRune(s[i:])
		if r == utf8.RuneError && size == 1 {
			p.add(i, fmt.Sprintf("byte 0x%02x is not UTF-8", s[i]), "expected the file to be saved as UTF-8", "")
			break
		}
		i += size
	}
	for i, c := range s {
		if c == '\r' && (i+1 == len(s) || s[i+1] != '\n') {
			p.add(i, "a carriage return stands alone", "expected lines to end in a line feed, or in both", "")
			break
		}
	}
	return p.checkDepth()
}

// checkDepth refuses lines that nest too deeply.
func (p *parsing) checkDepth() bool {
	s := p.text.source
	for _, start := range p.text.starts {
		markers, indent := 0, 0
	line:
		for i := start; i < len(s); i++ {
			switch c := s[i]; {
			case c == ' ':
				indent++
			case c == '\t':
				indent += 4
			case c == '>', c >= '0' && c <= '9':
				indent = 0
			case strings.IndexByte("-+*.)", c) >= 0:
				if i+1 < len(s) && s[i+1] != ' ' && s[i+1] != '\t' {
					break line
				}
				indent = 0
			default:
				break line
			}
			if s[i] == '>' || strings.IndexByte("-+*.)", s[i]) >= 0 {
				markers++
			}
			if markers > maxMarkers {
				if rule(s[start:]) {
					break line
				}
				p.add(i, "the line nests too deeply", fmt.Sprintf("expected at most %d block quote and list markers at the start of a line", maxMarkers), "")
				return false
			}
			if indent > maxIndent {
				p.add(i, "the line is indented too far", fmt.Sprintf("expected at most %d columns of blanks", maxIndent), "")
				return false
			}
		}
	}
	return true
}

// rule reports whether the first line of s is a thematic break such as
// "- - - -", however long.
func rule(s []byte) bool {
	if i := bytes.IndexByte(s, '\n'); i >= 0 {
		s = s[:i]
	}
	s = bytes.TrimSpace(s)
	return len(s) > 0 && (s[0] == '-' || s[0] == '*') && len(bytes.Trim(s, string(s[0])+" \t")) == 0
}
