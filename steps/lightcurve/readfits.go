package lightcurve

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"strings"

	"rimlight/steps/fits"
)

// ReadFITS reads the light-curve table layout from a FITS file, gzip-compressed
// or not: a binary table LIGHTCURVES of n rows with TIME (one number per row)
// and FLUX and FLUX_ERR (one number per channel), and a table CHANNELS of m rows
// with WAVE_LO and WAVE_HI. Further columns of one number per row become
// auxiliaries in file order. cols maps other layouts to this one.
//
// Units are those of TUNITn, or days and micrometres when there is none. Times
// in d, h, min or s become days; wavelengths in um, nm, Angstrom or m become um.
// Integrations are sorted by time and channels by wavelength. Samples whose flux
// is NaN, infinite, zero or negative, or whose error is not a number above zero,
// are masked and keep their values. Without FLUX_ERR all errors are zero and
// mask nothing.
//
// The warnings tell what was found but does not stop the reading: checksums that
// do not match, sorted rows, overlapping channels, columns that were left out,
// how many samples are masked. It is an error when a column is missing or of the
// wrong shape, a time is not finite or occurs twice, or a channel's edges are not
// 0 < WAVE_LO < WAVE_HI.
func ReadFITS(data []byte, cols Columns) (Cube, []string, error) {
	return OpenFITS(bytes.NewReader(data), int64(len(data)), cols)
}

// OpenFITS is [ReadFITS] of a file of size bytes that need not be in memory:
// fluxes and errors in columns of equal rows are read a few rows at a time.
func OpenFITS(r io.ReaderAt, size int64, cols Columns) (Cube, []string, error) {
	return readFITS(r, size, cols, "LIGHTCURVES")
}

// ReadFITSComparison reads the comparison star of a light-curve table: the
// table COMPARISON with TIME, FLUX and FLUX_ERR on the channels of the table
// CHANNELS of the same file. In all else it is as [ReadFITS].
func ReadFITSComparison(data []byte, cols Columns) (Cube, []string, error) {
	return OpenFITSComparison(bytes.NewReader(data), int64(len(data)), cols)
}

// OpenFITSComparison is to [ReadFITSComparison] what [OpenFITS] is to
// [ReadFITS].
func OpenFITSComparison(r io.ReaderAt, size int64, cols Columns) (Cube, []string, error) {
	return readFITS(r, size, cols, "COMPARISON")
}

func readFITS(r io.ReaderAt, size int64, cols Columns, table string) (Cube, []string, error) {
	if err := cols.check(); err != nil {
		return Cube{}, nil, err
	}
	f, err := fits.Open(r, size)
	if err != nil {
		return Cube{}, nil, err
	}
	warnings := f.Warnings
	failed, err := f.VerifyChecksums()
	if err != nil {
		return Cube{}, nil, err
	}
	warnings = append(warnings, failed...)
	l, notes, err := listFITS(f, cols, table)
	if err != nil {
		return Cube{}, warnings, err
	}
	warnings = append(warnings, notes...)
	cube, notes, err := l.cube()
	if err != nil {
		return Cube{}, warnings, fmt.Errorf("light-curve table: %w", err)
	}
	return cube, append(warnings, notes...), nil
}

// A block is a column or an image that serves as one: rows of equal width.
type block struct {
	label  string    // for messages
	values []float64 // nil when they are read later, by each
	rows   int
	width  int
	unit   string
	table  *fits.Table // nil for an image
	index  int         // of the column
}

// listFITS collects the columns of a light-curve table.
func listFITS(f *fits.File, cols Columns, table string) (listing, []string, error) {
	var l listing
	time, err := readBlock(f, cols.role("TIME"), table)
	if err != nil {
		return l, nil, err
	}
	home := fallback(cols.role("TIME").HDU, table)
	flux, err := findBlock(f, cols.role("FLUX"), home)
	if err != nil {
		return l, nil, err
	}
	sigma, err := findErrors(f, cols.role("FLUX_ERR"), home)
	if err != nil {
		return l, nil, err
	}
	lo, err := readBlock(f, cols.role("WAVE_LO"), "CHANNELS")
	if err != nil {
		return l, nil, err
	}
	hi, err := readBlock(f, cols.role("WAVE_HI"), fallback(cols.role("WAVE_LO").HDU, "CHANNELS"))
	if err != nil {
		return l, nil, err
	}
	if err := checkShapes(time, flux, sigma, lo, hi); err != nil {
		return l, nil, err
	}
	warnings := warnMJD(time.unit, cols.role("TIME").Offset)
	if err := convert(time.values, time.unit, cols.role("TIME").Offset, timeUnits, "time"); err != nil {
		return l, nil, fmt.Errorf("%s: %w", time.label, err)
	}
	for _, w := range []*block{lo, hi} {
		role := cols.role("WAVE_LO")
		if w == hi {
			role = cols.role("WAVE_HI")
		}
		if err := convert(w.values, w.unit, role.Offset, waveUnits, "wavelength"); err != nil {
			return l, nil, fmt.Errorf("%s: %w", w.label, err)
		}
	}
	l = listing{time: time.values, flux: flux.each(cols.role("FLUX").Offset), lo: lo.values, hi: hi.values,
		row:   func(i int) string { return fmt.Sprintf("%s: row %d", time.label, i+1) },
		edges: func(j int) string { return fmt.Sprintf("%s: row %d", lo.label, j+1) }}
	if sigma != nil {
		l.err = sigma.each(cols.role("FLUX_ERR").Offset)
		if flux.unit != "" && sigma.unit != "" && flux.unit != sigma.unit {
			warnings = append(warnings, fmt.Sprintf("fluxes are in %s but their errors in %s: they are used as if the units were one", flux.unit, sigma.unit))
		}
	}
	aux, notes, err := auxFITS(f, cols, home, []*block{time, flux, sigma, lo, hi})
	l.aux = aux
	return l, append(warnings, notes...), err
}

// readBlock is findBlock, but reads the values in any case.
func readBlock(f *fits.File, c Column, home string) (*block, error) {
	b, err := findBlock(f, c, home)
	if err == nil && b.values == nil && b.table != nil {
		if err = b.readColumn(); err != nil {
			err = fmt.Errorf("light-curve table, %s: %w", c.Role, err)
		}
	}
	return b, err
}

// findBlock finds the column that has a role. Of a column with many numbers in
// each row, the same number of them, the values are yet to be read.
func findBlock(f *fits.File, c Column, home string) (*block, error) {
	h, err := f.HDU(fallback(c.HDU, home))
	if err != nil {
		return nil, fmt.Errorf("light-curve table, %s: %w; a column mapping can name another HDU", c.Role, err)
	}
	b := &block{}
	switch {
	case h.Table != nil:
		b.table = h.Table
		column, err := h.Table.Column(fallback(c.Name, c.Role))
		if err != nil {
			return nil, fmt.Errorf("light-curve table, %s: %w", c.Role, err)
		}
		b.label = fmt.Sprintf("%s: column %s", h.Label(), column.Label())
		b.index, b.unit, b.rows = column.Index, column.Unit, h.Table.Rows
		if !column.Variable && column.Width > 1 && isNumber(column.Kind) {
			b.width = column.Width
			break
		}
		if err := b.readColumn(); err != nil {
			return nil, fmt.Errorf("light-curve table, %s: %w", c.Role, err)
		}
	case h.Image != nil && len(h.Image.Axes) > 0:
		b.label, b.unit = h.Label(), h.Image.Unit
		axes := h.Image.Axes
		if len(axes) > 2 {
			return nil, fmt.Errorf("light-curve table, %s: the image in %s has %d axes, expected 1 or 2", c.Role, b.label, len(axes))
		}
		b.width, b.rows = 1, axes[0]
		if len(axes) == 2 {
			b.width, b.rows = axes[0], axes[1]
		}
		if b.values, err = h.Image.Float64s(); err != nil {
			return nil, err
		}
	default:
		return nil, fmt.Errorf("light-curve table, %s: %s holds neither a table nor an image", c.Role, h.Label())
	}
	b.unit = fallback(c.Unit, b.unit)
	return b, nil
}

// readColumn reads the values of a table's column, whose rows must all have
// the same number of elements.
func (b *block) readColumn() error {
	v, err := b.table.ValuesAt(b.index)
	if err != nil {
		return err
	}
	if b.values, err = v.Float64s(); err != nil {
		return fmt.Errorf("%s %w", b.label, err)
	}
	for i := range b.rows {
		width := v.Offsets[i+1] - v.Offsets[i]
		if i > 0 && width != b.width {
			return fmt.Errorf("%s: row %d has %d values, but row 1 has %d", b.label, i+1, width, b.width)
		}
		b.width = width
	}
	return nil
}

// each gives the rows of a block, with an offset added, a few at a time.
func (b *block) each(offset float64) rows {
	if b.values != nil || b.table == nil {
		addOffset(b.values, offset)
		return func(do func(first int, values []float64)) error {
			do(0, b.values)
			return nil
		}
	}
	return func(do func(first int, values []float64)) error {
		const together = 4 << 20 // bytes
		step := max(1, together/8/max(1, b.width))
		for first := 0; first < b.rows; first += step {
			v, err := b.table.ValuesOf(b.index, first, min(b.rows, first+step))
			if err != nil {
				return err
			}
			values, err := v.Float64s()
			if err != nil {
				return fmt.Errorf("%s %w", b.label, err)
			}
			addOffset(values, offset)
			do(first, values)
		}
		return nil
	}
}

// findErrors reads FLUX_ERR, which may be missing unless the mapping names it.
func findErrors(f *fits.File, c Column, home string) (*block, error) {
	if c.HDU == "" && c.Name == "" {
		h, err := f.HDU(home)
		if err != nil {
			return nil, nil
		}
		if h.Table == nil {
			return nil, nil
		}
		if _, err := h.Table.Column(c.Role); err != nil {
			return nil, nil
		}
	}
	return findBlock(f, c, home)
}

// checkShapes compares the lengths of the columns with each other. Times and
// edges may also stand in one row.
func checkShapes(time, flux, sigma, lo, hi *block) error {
	for _, b := range []*block{time, lo, hi} {
		if b.rows == 1 {
			b.rows, b.width = b.width, 1
		}
		if b.width != 1 && b.rows > 0 {
			return fmt.Errorf("%s has %d values in each row, expected one", b.label, b.width)
		}
	}
	switch {
	case flux.rows != time.rows:
		return fmt.Errorf("%s has %d rows, but %s has %d", flux.label, flux.rows, time.label, time.rows)
	case lo.rows != hi.rows:
		return fmt.Errorf("%s has %d rows, but %s has %d", lo.label, lo.rows, hi.label, hi.rows)
	case flux.rows > 0 && flux.width != lo.rows:
		return fmt.Errorf("%s has %d values in each row, but %s lists %d channels", flux.label, flux.width, lo.label, lo.rows)
	case sigma != nil && (sigma.rows != flux.rows || sigma.width != flux.width):
		return fmt.Errorf("%s has %d rows of %d values, but %s has %d of %d", sigma.label, sigma.rows, sigma.width, flux.label, flux.rows, flux.width)
	}
	return nil
}

// auxFITS reads the auxiliaries: the further columns of one number per row of
// the table with the times, then those that the mapping takes from other HDUs.
func auxFITS(f *fits.File, cols Columns, home string, used []*block) ([]Series, []string, error) {
	var aux []Series
	var leftOut []string
	taken := map[string]bool{}
	add := func(b *block, c Column) error {
		name := strings.ToUpper(c.Role)
		if taken[name] {
			return fmt.Errorf("%s: the auxiliary %s is there twice; a column mapping can give one of them another name", b.label, c.Role)
		}
		taken[name] = true
		addOffset(b.values, c.Offset)
		aux = append(aux, Series{Name: c.Role, Unit: fallback(c.Unit, b.unit), Value: b.values})
		return nil
	}
	time := used[0]
	found := map[string]bool{}
	if t := time.table; t != nil {
		for i := range t.Columns {
			column := &t.Columns[i]
			if isUsed(used, t, column.Index) {
				continue
			}
			if column.Name == "" || !column.Scalar() || !isNumber(column.Kind) {
				leftOut = append(leftOut, column.Label())
				continue
			}
			b := &block{label: fmt.Sprintf("%s: column %s", t.Label(), column.Label()), table: t, index: column.Index, unit: column.Unit, rows: t.Rows}
			if err := b.readColumn(); err != nil {
				return nil, nil, err
			}
			c := cols.auxiliary(column.Name)
			if c.HDU != "" && !sameHDU(f, c.HDU, home) {
				c = Column{Role: column.Name}
			}
			found[strings.ToUpper(c.Role)] = true
			if err := add(b, c); err != nil {
				return nil, nil, err
			}
		}
	}
	for _, c := range cols {
		if isRole(c.Role) || found[strings.ToUpper(c.Role)] {
			continue
		}
		b, err := readBlock(f, c, home)
		if err != nil {
			return nil, nil, err
		}
		if b.rows == 1 {
			b.rows, b.width = b.width, 1
		}
		if b.rows != time.rows || b.width != 1 {
			return nil, nil, fmt.Errorf("%s has %d rows of %d values, expected one value for each of %d integrations", b.label, b.rows, b.width, time.rows)
		}
		if err := add(b, c); err != nil {
			return nil, nil, err
		}
	}
	var warnings []string
	if len(leftOut) > 0 {
		if len(leftOut) > 10 {
			leftOut = append(leftOut[:10], "...")
		}
		warnings = append(warnings, fmt.Sprintf("%s: left out because they do not hold one number per row: %s", time.table.Label(), strings.Join(leftOut, ", ")))
	}
	return aux, warnings, nil
}

func isUsed(used []*block, t *fits.Table, index int) bool {
	for _, b := range used {
		if b != nil && b.table == t && b.index == index {
			return true
		}
	}
	return false
}

func isNumber(k fits.Kind) bool {
	return k == fits.Integer || k == fits.Unsigned || k == fits.Real
}

func sameHDU(f *fits.File, a, b string) bool {
	x, errX := f.HDU(a)
	y, errY := f.HDU(b)
	return errors.Join(errX, errY) == nil && x == y
}
