// Package table holds small tables of text and numbers that a step returns to
// be shown in the report and exported.
package table

// A Column is one column of a table. Exactly one of Text and Number is set.
// Number columns are shown with Digits significant digits (0 means 6); NaN
// shows as an empty cell.
type Column struct {
	Name   string
	Unit   string // FITS-standard unit string, empty for text and pure numbers
	About  string // one sentence, shown with the header
	Text   []string
	Number []float64
	Digits int
}

// A Table is a titled list of columns of equal length.
type Table struct {
	Title   string
	Columns []Column
}
