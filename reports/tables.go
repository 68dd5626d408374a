package reports

import (
	"bytes"
	"encoding/base64"
	"encoding/csv"
	"fmt"
	"html/template"
	"math"
	"strings"

	"rimlight/steps/table"
)

// Limits on what of tables goes into a report.
const (
	shownRows    = 400     // rows that are shown
	scrolledRows = 24      // from this many rows on, a table scrolls in a box of its own
	shownColumns = 40      // columns that are shown
	fileCells    = 24_000  // cells of a table that is offered as a file
	fileBytes    = 1 << 20 // of all such files together
)

// A gridView is a table as it is shown.
type gridView struct {
	Number  int    // "Table 3"; 0 for a table without a number
	Caption string // as a title; may be empty
	Note    string
	Columns []columnView
	Rows    []rowView
	Scroll  bool
	Wide    bool   // may spread over the margin
	Folded  string // says what there is when the table is shown only on demand
	Named   bool   // the first cell of a row names the row
	File    *fileView
}

type columnView struct {
	Name, Unit, About string
	Number            bool
}

type rowView struct {
	Class string
	Cells []string
	Rest  string // a cell over all columns that Cells leaves
}

// Left is the number of columns that a row's own cells leave.
func (g *gridView) Left(r rowView) int { return len(g.Columns) - len(r.Cells) }

// Body is the rows of the table. A report can have tens of thousands of cells,
// of which the template would take one step each.
func (g *gridView) Body() template.HTML {
	var out strings.Builder
	for _, r := range g.Rows {
		openTag(&out, "\n<tr", r.Class)
		for i, c := range r.Cells {
			if g.Named && i == 0 {
				out.WriteString(`<th scope="row">` + template.HTMLEscapeString(c) + "</th>")
				continue
			}
			class := ""
			if g.Columns[i].Number {
				class = "right"
			}
			openTag(&out, "<td", class)
			out.WriteString(template.HTMLEscapeString(c) + "</td>")
		}
		if r.Rest != "" {
			fmt.Fprintf(&out, `<td colspan="%d">%s</td>`, g.Left(r), template.HTMLEscapeString(r.Rest))
		}
		out.WriteString("</tr>")
	}
	return template.HTML(out.String())
}

// openTag writes the start of an element, with its class, if it has one.
func openTag(out *strings.Builder, tag, class string) {
	out.WriteString(tag)
	if class != "" {
		out.WriteString(` class="` + template.HTMLEscapeString(class) + `"`)
	}
	out.WriteByte('>')
}

// A fileView is something that the reader can save.
type fileView struct {
	Name string
	Size string
	Link template.URL
}

func newFile(name, mediaType string, content []byte) *fileView {
	return &fileView{
		Name: name,
		Size: size(int64(len(content))),
		Link: template.URL("data:" + mediaType + ";base64," + base64.StdEncoding.EncodeToString(content)),
	}
}

// rows counts the rows of a table: those of its longest column.
func rows(t table.Table) int {
	n := 0
	for _, c := range t.Columns {
		n = max(n, len(c.Text), len(c.Number))
	}
	return n
}

// cell is a cell as it is shown.
func cell(c table.Column, row int) string {
	switch {
	case row < len(c.Text):
		return label(c.Text[row])
	case row < len(c.Number) && !math.IsNaN(c.Number[row]):
		if c.Digits > 0 {
			return decimal(c.Number[row], c.Digits, true)
		}
		return number(c.Number[row], 6)
	}
	return ""
}

// grid shows a table; file is its file's name without the ending.
func (b *builder) grid(t table.Table, file string) *gridView {
	n := rows(t)
	g := &gridView{Caption: sentence(t.Title), Scroll: n > scrolledRows}
	columns := t.Columns
	if len(columns) > shownColumns {
		columns = columns[:shownColumns]
		g.Note = fmt.Sprintf("The first %d of %d columns are shown. ", shownColumns, len(t.Columns))
	}
	for i, c := range columns {
		g.Columns = append(g.Columns, columnView{Name: label(c.Name), Unit: label(c.Unit), About: sentence(c.About), Number: c.Text == nil})
		g.Named = g.Named || i == 0 && c.Text != nil
	}
	for row := range min(n, shownRows) {
		cells := make([]string, len(columns))
		for i, c := range columns {
			cells[i] = cell(c, row)
		}
		g.Rows = append(g.Rows, rowView{Cells: cells})
	}
	if n > shownRows {
		g.Note += fmt.Sprintf("The first %d of %s rows are shown. ", shownRows, grouped(n))
	}
	if g.File = b.tableFile(t, n, file); g.File == nil && n > 0 {
		g.Note += fmt.Sprintf("With %s rows and %s, it is too large to be part of the report as a file.", grouped(n), count(len(t.Columns), "column"))
	}
	return g
}

// tableFile writes a table as CSV with its numbers in full; nil when it is
// empty or too large.
func (b *builder) tableFile(t table.Table, n int, file string) *fileView {
	if n == 0 || n*len(t.Columns) > fileCells {
		return nil
	}
	var buf bytes.Buffer
	w := csv.NewWriter(&buf)
	record := make([]string, len(t.Columns))
	for i, c := range t.Columns {
		record[i] = inert(label(c.Name))
		if c.Unit != "" {
			record[i] += " (" + label(c.Unit) + ")"
		}
	}
	w.Write(record)
	for row := range n {
		for i, c := range t.Columns {
			record[i] = ""
			switch {
			case row < len(c.Text):
				record[i] = inert(label(c.Text[row]))
			case row < len(c.Number) && !math.IsNaN(c.Number[row]):
				record[i] = exact(c.Number[row])
			}
		}
		w.Write(record)
	}
	w.Flush()
	if w.Error() != nil || b.fileBytes+buf.Len() > fileBytes {
		return nil
	}
	b.fileBytes += buf.Len()
	return newFile(slug(file)+".csv", "text/csv", buf.Bytes())
}

// inert keeps spreadsheets from taking a text for a formula.
func inert(s string) string {
	if s != "" && strings.ContainsRune("=+-@\t\r", rune(s[0])) {
		return "'" + s
	}
	return s
}
