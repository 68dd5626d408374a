package table

import "fmt"

// Text returns a column of words. The column shares the memory of values.
func Text(name, about string, values []string) Column {
	return Column{Name: name, About: about, Text: values}
}

// Number returns a column of numbers, in the FITS-standard unit given (empty
// for pure numbers), shown with that many significant digits (0 means 6). The
// column shares the memory of values.
func Number(name, unit, about string, digits int, values []float64) Column {
	return Column{Name: name, Unit: unit, About: about, Number: values, Digits: digits}
}

// New puts columns together. It is an error when they break a rule that
// [Table.Check] holds a table to.
func New(title string, columns ...Column) (Table, error) {
	t := Table{Title: title, Columns: columns}
	if err := t.Check(); err != nil {
		return Table{}, err
	}
	return t, nil
}

// Check reports the first thing wrong with a table: a column without a name or
// with the name of an earlier one, with both text and numbers, with a unit on
// text, with a number of digits outside 0 to 17, or of another length than the
// first column. A table without columns is allowed.
func (t Table) Check() error {
	seen := make(map[string]bool, len(t.Columns))
	for k, c := range t.Columns {
		switch {
		case c.Name == "":
			return fmt.Errorf("table %.40q: column %d has no name; give it one", t.Title, k+1)
		case seen[c.Name]:
			return fmt.Errorf("table %.40q: two columns are named %.40q; rename one", t.Title, c.Name)
		case len(c.Text) > 0 && len(c.Number) > 0:
			return fmt.Errorf("table %.40q: column %.40q has text and numbers; set one of the two", t.Title, c.Name)
		case len(c.Text) > 0 && c.Unit != "":
			return fmt.Errorf("table %.40q: column %.40q is text and has unit %.40q; leave the unit empty", t.Title, c.Name, c.Unit)
		case c.Digits < 0 || c.Digits > 17:
			return fmt.Errorf("table %.40q: column %.40q asks for %d digits; expected 0 (for 6) to 17", t.Title, c.Name, c.Digits)
		case c.rows() != t.Columns[0].rows():
			return fmt.Errorf("table %.40q: column %.40q has %d rows; expected %d, as column %.40q has",
				t.Title, c.Name, c.rows(), t.Columns[0].rows(), t.Columns[0].Name)
		}
		seen[c.Name] = true
	}
	return nil
}

// Rows returns the number of rows: the length of the first column, 0 without one.
func (t Table) Rows() int {
	if len(t.Columns) == 0 {
		return 0
	}
	return t.Columns[0].rows()
}

func (c Column) rows() int { return max(len(c.Text), len(c.Number)) }
