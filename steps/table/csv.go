package table

import (
	"bytes"
	"encoding/csv"
	"math"
	"strconv"
)

// CSV returns the table as comma-separated values (RFC 4180, lines ended by a
// line feed): a row of column names, followed by the unit in brackets where
// there is one, then the rows. Numbers are written with the fewest digits that
// read back to the same float64; what is not a number is nan, inf or -inf. The
// title, the descriptions and the digits are not part of it. It is an error
// when [Table.Check] finds one.
func (t Table) CSV() ([]byte, error) {
	if err := t.Check(); err != nil {
		return nil, err
	}
	var out bytes.Buffer
	w := csv.NewWriter(&out)
	record := make([]string, len(t.Columns))
	for k, c := range t.Columns {
		record[k] = c.Name
		if c.Unit != "" {
			record[k] += " [" + c.Unit + "]"
		}
	}
	write := func() { _ = w.Write(record) } // a bytes.Buffer does not fail
	if len(record) > 0 {
		write()
	}
	for i := range t.Rows() {
		for k, c := range t.Columns {
			if len(c.Text) > 0 {
				record[k] = c.Text[i]
			} else {
				record[k] = FormatNumber(c.Number[i])
			}
		}
		write()
	}
	w.Flush()
	return out.Bytes(), nil
}

// FormatNumber writes x with the fewest digits that read back to the same
// float64; NaN and the infinities as nan, inf and -inf.
func FormatNumber(x float64) string {
	switch {
	case math.IsNaN(x):
		return "nan"
	case math.IsInf(x, 1):
		return "inf"
	case math.IsInf(x, -1):
		return "-inf"
	}
	return strconv.FormatFloat(x, 'g', -1, 64)
}
