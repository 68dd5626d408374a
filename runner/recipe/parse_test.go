package recipe

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

const small = "# T\n\n| setting | value | unit | about |\n|---|---|---|---|\n| a | 5 | d | x |\n\n```go\nfunc F(a float64) (b float64) {\n\treturn a\n}\n```\n"

func TestParseEncodings(t *testing.T) {
	for _, c := range []struct{ name, source, want string }{
		{"plain", small, ""},
		{"byte order mark", "\ufeff" + small, ""},
		{"carriage returns", strings.ReplaceAll(small, "\n", "\r\n"), ""},
		{"no final newline", strings.TrimSuffix(small, "\n"), ""},
		{"tabs in a table", strings.ReplaceAll(small, "| a | 5 |", "|\ta\t|\t5\t|"), ""},
		{"empty", "", "r.md:1:1: the recipe has no title; expected a level-1 heading, such as # A warm Saturn's transmission spectrum"},
		{"NUL", strings.Replace(small, "x", "\x00", 1), "r.md:5:15: the file holds a NUL byte; expected text only"},
		{"not UTF-8", strings.Replace(small, "x", "\xb5m", 1), "r.md:5:15: byte 0xb5 is not UTF-8; expected the file to be saved as UTF-8"},
		{"lone carriage return", small + "a\rb\n", "r.md:12:2: a carriage return stands alone; expected lines to end in a line feed, or in both"},
		{"UTF-16", "\xff\xfe#\x00 \x00", "r.md:1:1: the file is not UTF-8 text: it starts like UTF-16; expected UTF-8"},
		{"deep", small + strings.Repeat(">", 1000), "r.md:12:33: the line nests too deeply; expected at most 32 block quote and list markers at the start of a line"},
		{"far in", small + strings.Repeat(" ", 1000) + "x", "r.md:12:121: the line is indented too far; expected at most 120 columns of blanks"},
		{"long rule", small + strings.Repeat("- ", 1000), ""},
	} {
		r, diags := Parse("r.md", []byte(c.source))
		if diags.Error() != c.want {
			t.Errorf("%s: got %v, want %s", c.name, diags, c.want)
			continue
		}
		if c.want != "" {
			continue
		}
		if r.Title != "T" || len(r.Settings) != 1 || r.Settings[0].Name != "a" || len(r.Blocks) != 1 {
			t.Errorf("%s: read %s", c.name, dump(r))
			continue
		}
		if want := "func F(a float64) (b float64) {\n\treturn a\n}\n"; r.Blocks[0].Code != want || r.Blocks[0].Line != 8 {
			t.Errorf("%s: code %q at line %d", c.name, r.Blocks[0].Code, r.Blocks[0].Line)
		}
		if code := string(r.Code()); !strings.HasPrefix(code, strings.Repeat("\n", 7)+"func F(a float64) (b float64) {\n\treturn a\n}\n") {
			t.Errorf("%s: code %q", c.name, code)
		}
	}
	for _, huge := range []string{small + strings.Repeat("\n", MaxLines), small + strings.Repeat("a ", MaxSize/2)} {
		if _, diags := Parse("r.md", []byte(huge)); len(diags) != 1 || !strings.Contains(diags.Error(), "expected at most") {
			t.Errorf("a huge file: %v", diags)
		}
	}
}

func TestParseLeavesSourceAlone(t *testing.T) {
	buffer := []byte("# T\n```go\nfunc f() {}!!!!")
	Parse("r.md", buffer[:len(buffer)-4])
	if !bytes.HasSuffix(buffer, []byte("!!!!")) {
		t.Errorf("Parse wrote into %q", buffer)
	}
}

func TestFaultsTogether(t *testing.T) {
	const source = `| setting | value | unit | about |
|---|---|---|---|
| func | 1e999 | days | three faults |
| x | "a | % | two |
| x | 1 | | one |

| Setting | value |
|---|---|
| prose | this table is none of ours |

~~~go
func F() {}
`
	_, diags := Parse("r.md", []byte(source))
	var got []string
	for _, d := range diags {
		got = append(got, strings.TrimPrefix(d.Pos.String(), "r.md:"))
	}
	if want := "1:1 3:3 3:10 3:18 4:7 4:12 5:3 11:1"; strings.Join(got, " ") != want {
		t.Errorf("faults at %v, want %s\n%v", got, want, diags)
	}
}

func TestCells(t *testing.T) {
	for _, c := range []struct{ line, want string }{
		{"| a | b |", "a@2 b@6"},
		{"a | b", "a@0 b@4"},
		{"  |a|b  ", "a@3 b@5"},
		{"||a|", "@1 a@2"},
		{`| a\|b | c\*d |`, "a|b@2 c*d@9"},
		{"| `a\\|b\\*` | `` `x` `` |", "a|b\\*@3 `x`@16"},
		{"| **5** | _x_ | *a*b* | `a`; `b` |", "5@4 x@11 *a*b*@16 `a`; `b`@24"},
		{"| a | ", "a@2"},
		{`| a \|`, "a |@2"},
		{"|", ""},
		{"| é | b |", "é@2 b@7"},
	} {
		var got []string
		for _, cell := range splitRow([]byte(c.line), 0, len(c.line)) {
			got = append(got, cell.text+"@"+itoa(cell.start))
		}
		if s := strings.Join(got, " "); s != c.want {
			t.Errorf("%q: got %s, want %s", c.line, s, c.want)
		}
	}
	c := newCell([]byte(`a\*b\|c`), 0, 7)
	for i, want := range []int{0, 2, 3, 5, 6} {
		if got := c.offset(i); got != want {
			t.Errorf("byte %d of %q is at %d, want %d", i, c.text, got, want)
		}
	}
}

func itoa(n int) string {
	if n < 10 {
		return string(rune('0' + n))
	}
	return itoa(n/10) + itoa(n%10)
}

func TestLayouts(t *testing.T) {
	for name, want := range map[string]string{
		"light-curve table": "rimlight/steps/lightcurve.Cube", "comparison table": "rimlight/steps/lightcurve.Cube",
		"limb-darkening table": "rimlight/steps/limbtable.Table", "intensity table": "rimlight/steps/limbtable.Intensities",
		"throughput curve": "rimlight/steps/limbtable.Throughput", "text": "string", "image": "",
	} {
		if got := TypeOf(name); got != want {
			t.Errorf("layout %s has the type %q, want %q", name, got, want)
		}
	}
}

// TestParseTime catches files that are made to keep Parse busy without end. The
// limit leaves room for a slow machine; each takes well under a second on an
// idle one.
func TestParseTime(t *testing.T) {
	const size = 90 << 10 // so that lines of one byte are not too many
	fill := func(head, unit string) []byte {
		return []byte(head + strings.Repeat(unit, (size-len(head))/len(unit)))
	}
	table := "# T\n| setting | value | unit | about |\n|---|---|---|---|\n"
	nested := "# T\n"
	for i := range 60 {
		nested += strings.Repeat("  ", i) + "- a\n"
	}
	for name, source := range map[string][]byte{
		"settings":       fill(table, "| a | 1 | | |\n"),
		"short rows":     fill(table, "| a |\n"),
		"one long cell":  fill(table+"| a | U(", "1,"),
		"pipes":          fill(table, "|"),
		"escapes":        fill(table+"| a | ", `\|`),
		"code in cells":  fill("# T\n| a |\n|-|\n", "| `\\|` |\n"),
		"brackets":       fill("# T\n", "["),
		"references":     fill("# T\n", "[a]: b\n"),
		"reference":      fill("# T\n[", "a\n"),
		"quotes":         fill("# T\n", "> > > > > > > > a\n"),
		"lists":          fill("# T\n", "- - - - - - - - a\n"),
		"fences":         fill("# T\n", "```go\n```\n"),
		"code":           fill("# T\n```go\n", "a\n"),
		"headings":       fill("# T\n", "# *a* [b](c) `d`\n"),
		"long heading":   fill("# ", "*a "),
		"delimiters":     fill("# T\n| a |\n", "|-|-|\n"),
		"html":           fill("# T\n", "<a\n"),
		"comments":       fill("# T\n", "<!-- a\n"),
		"underlines":     fill("# T\n", "a\n---\n"),
		"tables":         fill("# T\n", "| column | name |\n|-|-|\n\n"),
		"priors":         fill("# T\n| parameter | prior | unit | about |\n|-|-|-|-|\n", "| a | N(b, 1) | | |\n"),
		"lookalikes":     fill("# T\n", "| setting | value |\n\n"),
		"long name":      fill(table+"| ", "a"),
		"long unit":      fill(table+"| a | 1 | ", "m "),
		"blank":          fill("# T\n", " \n"),
		"blank in lists": fill(nested, "\n"),
		"one long line":  fill("# T\n", "a "),
		"semicolons":     fill("# T\n| input | file | layout | about |\n|-|-|-|-|\n| a | ", ";"),
		"numbered lines": fill("# T\n", "1"),
	} {
		start := time.Now()
		Parse("r.md", source)
		if took := time.Since(start); took > 10*time.Second {
			t.Errorf("%s: %v for %d bytes", name, took, len(source))
		} else if testing.Verbose() {
			t.Logf("%s: %v", name, took)
		}
	}
}

func BenchmarkParse(b *testing.B) {
	source, err := os.ReadFile("testdata/good/visit.md")
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(source)))
	for b.Loop() {
		Parse("visit.md", source)
	}
}

func FuzzParse(f *testing.F) {
	for _, pattern := range []string{wrongDir + "/*.md", "testdata/good/*.md"} {
		files, _ := filepath.Glob(pattern)
		for _, file := range files {
			source, err := os.ReadFile(file)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(source)
		}
	}
	f.Add([]byte("\ufeff# T\r\n-\t```go\r\n\t\tx\r\n\t```"))
	f.Add([]byte("> - ~~~go\n>   `a\n> \tb`"))
	f.Add([]byte("* ```go\n \r\n0")) // a blank line of code that starts behind its own end
	f.Add([]byte("```go\n\r\r"))
	f.Add([]byte(small))
	f.Fuzz(func(t *testing.T, source []byte) {
		r, diags := Parse("r.md", source)
		lines := strings.Split(string(r.Source), "\n")
		for _, d := range diags {
			if d.Pos.Line < 1 || d.Pos.Line > len(lines) || d.Pos.Col < 1 || d.Pos.Col > len(lines[d.Pos.Line-1])+1 {
				t.Errorf("no such place: %v", d)
			}
			if strings.Contains(d.String(), "\n") {
				t.Errorf("more than one line: %q", d)
			}
		}
		code := strings.Split(string(r.Code()), "\n")
		if len(code) != len(lines) {
			t.Fatalf("%d lines of code for %d of source", len(code), len(lines))
		}
		for i, c := range code {
			text := strings.TrimLeft(c, " ")
			at := len(c) - len(text)
			if at > len(lines[i]) || strings.TrimRight(lines[i][at:], "\r") != strings.TrimRight(text, "\r") && text != "" {
				t.Errorf("line %d of the code is %q, of the source %q", i+1, c, lines[i])
			}
			if lost := strings.Trim(lines[i][:min(at, len(lines[i]))], " \t\r\v\f>-+*.)0123456789"); lost != "" && text != "" {
				t.Errorf("line %d of the code lost %q", i+1, lost)
			}
		}
		for _, b := range r.Blocks {
			n := strings.Count(b.Code, "\n")
			if b.Line < 2 || b.Line-1+n > len(lines)+1 || b.Section >= len(r.Sections) {
				t.Errorf("block at line %d of %d lines, section %d", b.Line, n, b.Section)
			}
		}
	})
}
