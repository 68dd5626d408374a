package limbtable

import (
	"bytes"
	"fmt"
	"strings"

	"rimlight/steps/fits"
	"rimlight/steps/sheet"
)

// Read reads the limb-darkening table layout.
//
// In CSV, the columns are wave_lo and wave_hi in um, u1 and u2, and optionally
// u1_err and u2_err; a comment line "# law: quadratic" names the law. In FITS,
// gzip-compressed or not, the binary table LIMB has the columns WAVE_LO, WAVE_HI
// (with TUNITn um or none), U1, U2 and optionally U1_ERR, U2_ERR, and the keyword
// LIMBLAW names the law. Further columns are ignored. A file that starts as a
// FITS or gzip file does is read as FITS.
//
// Rows are sorted by wavelength. It is an error when a column is missing or a
// number is not finite, an error below zero, or the edges not
// 0 < WAVE_LO < WAVE_HI.
func Read(data []byte) (Table, error) {
	var t Table
	var err error
	if bytes.HasPrefix(data, []byte("SIMPLE  =")) || bytes.HasPrefix(data, []byte{0x1f, 0x8b}) {
		t, err = readFITS(data)
	} else {
		t, err = readCSV(data)
	}
	if err != nil {
		return Table{}, fmt.Errorf("limb-darkening table: %w", err)
	}
	return t, nil
}

// columnNames are the columns in CSV; in FITS they are in capitals. The last
// two may be missing.
var columnNames = [...]string{"wave_lo", "wave_hi", "u1", "u2", "u1_err", "u2_err"}

const required = 4

func readCSV(data []byte) (Table, error) {
	s, err := sheet.Read(data, "CSV")
	if err != nil {
		return Table{}, err
	}
	var columns [len(columnNames)][]float64
	for k, name := range columnNames {
		i, err := s.Find(name)
		if err != nil {
			if k >= required {
				continue
			}
			return Table{}, err
		}
		columns[k] = s.Column(i)
	}
	row := func(j int) string { return fmt.Sprintf("line %d", s.Line[j]) }
	return newTable(columns[0], columns[1], columns[2], columns[3], columns[4], columns[5], lawComment(data), row)
}

// lawComment finds a comment line "# law: NAME".
func lawComment(data []byte) string {
	for line := range bytes.Lines(data) {
		name, value, ok := strings.Cut(strings.TrimPrefix(string(line[:min(len(line), 200)]), "\xef\xbb\xbf"), ":")
		if ok && strings.HasPrefix(name, "#") && strings.EqualFold(strings.Trim(name, "# \t"), "law") {
			return strings.ToValidUTF8(strings.TrimSpace(value), "\ufffd")
		}
	}
	return ""
}

func readFITS(data []byte) (Table, error) {
	f, err := fits.Read(data)
	if err != nil {
		return Table{}, err
	}
	t, err := f.Table("LIMB")
	if err != nil {
		return Table{}, err
	}
	var columns [len(columnNames)][]float64
	for k, name := range columnNames {
		name = strings.ToUpper(name)
		c, err := t.Column(name)
		if err != nil && k >= required {
			continue
		}
		if err != nil {
			return Table{}, err
		}
		if k < 2 && c.Unit != "" && c.Unit != "um" {
			return Table{}, fmt.Errorf("%s: column %s is in %.40q, expected um", t.Label(), name, c.Unit)
		}
		if columns[k], err = t.Float64s(name); err != nil {
			return Table{}, err
		}
	}
	law := ""
	if t.Header().Has("LIMBLAW") {
		if law, err = t.Header().Text("LIMBLAW"); err != nil {
			return Table{}, fmt.Errorf("%s: %w", t.Label(), err)
		}
	}
	row := func(j int) string { return fmt.Sprintf("%s: row %d", t.Label(), j+1) }
	return newTable(columns[0], columns[1], columns[2], columns[3], columns[4], columns[5], law, row)
}
