package recipe

// A span is the code on one line of a Go fence.
type span struct {
	line, start, end int // line from 0; byte offsets in the source
}

// Code gives the Go code of the recipe at its places in the file: all else is
// left out, lines without code are empty, and code that is set in, inside a
// list or a block quote, is moved to its column with spaces. So the lines and
// columns of the code are those of the Markdown. The first line is always
// empty, since a fence opens before its code. Line endings are single line
// feeds.
//
// The spaces end up inside a raw string literal that runs over several lines;
// everywhere else Go takes no notice of them.
func (r *Recipe) Code() []byte {
	out := make([]byte, 0, len(r.Source))
	next := 0
	line := 0
	emit := func() {
		if next < len(r.code) && r.code[next].line == line {
			s := r.code[next]
			start := s.start
			for start > 0 && r.Source[start-1] != '\n' {
				start--
			}
			for range s.start - start {
				out = append(out, ' ')
			}
			out = append(out, r.Source[s.start:s.end]...)
			next++
		}
	}
	for _, c := range r.Source {
		if c == '\n' {
			emit()
			out = append(out, '\n')
			line++
		}
	}
	emit()
	return out
}
