package limbtable

import (
	"bytes"
	"fmt"
	"strings"

	"rimlight/steps/fits"
	"rimlight/steps/limb"
	"rimlight/steps/sheet"
)

// Read reads the limb-darkening table layout.
//
// In CSV, the columns are wave_lo and wave_hi in um, u1, u2 and so on, and
// optionally u1_err, u2_err and so on; a comment line "# law: quadratic" names the
// law, see package limb, which says how many coefficients there are. Without the
// name of a known law there are two; the linear law may lack u2. In FITS,
// gzip-compressed or not, the binary table LIMB has the columns WAVE_LO, WAVE_HI
// (with TUNITn um or none), U1, U2 ..., and optionally U1_ERR, U2_ERR ..., and the
// keyword LIMBLAW names the law. Further columns are ignored. A file that starts
// as a FITS or gzip file does is read as FITS.
//
// Rows are sorted by wavelength. It is an error when a column is missing or a
// number is not finite, an error below zero, or the edges not
// 0 < WAVE_LO < WAVE_HI.
func Read(data []byte) (Table, error) {
	s, err := open(data, "LIMB")
	if err != nil {
		return Table{}, fmt.Errorf("limb-darkening table: %w", err)
	}
	t, err := readTable(s)
	if err != nil {
		return Table{}, fmt.Errorf("limb-darkening table: %w", err)
	}
	return t, nil
}

func readTable(s source) (Table, error) {
	law, err := s.law()
	if err != nil {
		return Table{}, err
	}
	count := 2
	if n, err := limb.Count(strings.ToLower(law)); err == nil {
		count = max(n, 1)
	}
	var lo, hi []float64
	if lo, err = s.column("wave_lo", "um"); err != nil {
		return Table{}, err
	}
	if hi, err = s.column("wave_hi", "um"); err != nil {
		return Table{}, err
	}
	var u, e [limb.Most][]float64
	for k := range u {
		name := fmt.Sprintf("u%d", k+1)
		if u[k], err = s.column(name, ""); err != nil {
			if k < count {
				return Table{}, err
			}
			if k >= 2 {
				break
			}
			u[k] = make([]float64, len(lo)) // the linear law
		} else if k >= max(count, 2) {
			u[k] = nil
			break
		}
		if e[k], err = s.column(name+"_err", ""); err != nil {
			e[k] = nil // optional
		}
	}
	return newTable(lo, hi, u, e, law, s.row)
}

// A source is a table in a file.
type source struct {
	sheet  *sheet.Sheet // of a CSV file
	data   []byte
	binary *fits.Table // of a FITS file
}

// open opens a CSV file, or the named table of a FITS file.
func open(data []byte, table string) (source, error) {
	if bytes.HasPrefix(data, []byte("SIMPLE  =")) || bytes.HasPrefix(data, []byte{0x1f, 0x8b}) {
		f, err := fits.Read(data)
		if err != nil {
			return source{}, err
		}
		t, err := f.Table(table)
		return source{binary: t}, err
	}
	s, err := sheet.Read(data, "CSV")
	return source{sheet: s, data: data}, err
}

// column returns the numbers of a column. In FITS its name is in capitals and
// its unit, where given, must be that.
func (s source) column(name, unit string) ([]float64, error) {
	if s.binary == nil {
		i, err := s.sheet.Find(name)
		if err != nil {
			return nil, err
		}
		return s.sheet.Column(i), nil
	}
	name = strings.ToUpper(name)
	c, err := s.binary.Column(name)
	if err != nil {
		return nil, err
	}
	if unit != "" && c.Unit != "" && c.Unit != unit {
		return nil, fmt.Errorf("%s: column %s is in %.40q, expected %s", s.binary.Label(), name, c.Unit, unit)
	}
	return s.binary.Float64s(name)
}

// row names a row for messages.
func (s source) row(j int) string {
	if s.binary == nil {
		return fmt.Sprintf("line %d", s.sheet.Line[j])
	}
	return fmt.Sprintf("%s: row %d", s.binary.Label(), j+1)
}

// law returns the name of the law: of a comment line "# law: NAME" or the keyword
// LIMBLAW, "" without one.
func (s source) law() (string, error) {
	if s.binary == nil {
		for line := range bytes.Lines(s.data) {
			name, value, ok := strings.Cut(strings.TrimPrefix(string(line[:min(len(line), 200)]), "\xef\xbb\xbf"), ":")
			if ok && strings.HasPrefix(name, "#") && strings.EqualFold(strings.Trim(name, "# \t"), "law") {
				return strings.ToValidUTF8(strings.TrimSpace(value), "\ufffd"), nil
			}
		}
		return "", nil
	}
	if !s.binary.Header().Has("LIMBLAW") {
		return "", nil
	}
	law, err := s.binary.Header().Text("LIMBLAW")
	if err != nil {
		return "", fmt.Errorf("%s: %w", s.binary.Label(), err)
	}
	return law, nil
}
