package lightcurve

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"rimlight/steps/nearest"
)

// ReadCSV reads the light-curve table layout from two CSV files (RFC 4180, with
// comment lines that start with #). series has one row per integration and the
// columns time_bjd_tdb, auxiliaries, flux_000, flux_001, ... and err_000,
// err_001, ...; channels has one row per channel and the columns channel (its
// number from 0, may be left out when the rows are in order), wave_lo and
// wave_hi. Names are compared without regard to letter case. An empty cell and
// "nan" are NaN. Units are days and micrometres unless cols names others.
//
// Order, masks, warnings and errors are as with [ReadFITS]; errors name line
// and column.
func ReadCSV(series, channels []byte, cols Columns) (Cube, []string, error) {
	if err := cols.check(); err != nil {
		return Cube{}, nil, err
	}
	edges, err := readSheet(channels, "channel CSV")
	if err != nil {
		return Cube{}, nil, err
	}
	rows, err := readSheet(series, "light-curve CSV")
	if err != nil {
		return Cube{}, nil, err
	}
	l := listing{
		row:   func(i int) string { return fmt.Sprintf("line %d", rows.line[i]) },
		edges: func(j int) string { return fmt.Sprintf("channel %d", j) },
	}
	if l.lo, l.hi, err = edges.channelEdges(cols); err != nil {
		return Cube{}, nil, fmt.Errorf("channel CSV: %w", err)
	}
	warnings, err := rows.fill(&l, cols)
	if err != nil {
		return Cube{}, nil, fmt.Errorf("light-curve CSV: %w", err)
	}
	cube, notes, err := l.cube()
	if err != nil {
		return Cube{}, warnings, fmt.Errorf("light-curve CSV: %w", err)
	}
	return cube, append(warnings, notes...), nil
}

// A sheet is a CSV file of numbers under a line of names.
type sheet struct {
	names []string
	cells []float64 // rows of len(names)
	line  []int     // line number of each row
}

// maxCSVColumns is far above any spectrograph's channels, twice (fluxes and
// errors); it keeps the table of names small.
const maxCSVColumns = 1 << 16

// readSheet parses a file. Memory stays within a multiple of its size: rows are
// kept only when they have as many cells as there are names.
func readSheet(data []byte, what string) (*sheet, error) {
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf")) // byte order mark
	r := csv.NewReader(bytes.NewReader(data))
	r.Comment = '#'
	r.FieldsPerRecord = -1
	r.ReuseRecord = true
	r.TrimLeadingSpace = true
	header, err := r.Read()
	if err == io.EOF {
		return nil, fmt.Errorf("%s: the file is empty, expected a line of column names", what)
	}
	if err != nil {
		return nil, csvError(what, err)
	}
	if len(header) > maxCSVColumns {
		return nil, fmt.Errorf("%s: the first line names %d columns, expected at most %d", what, len(header), maxCSVColumns)
	}
	s := &sheet{}
	seen := make(map[string]bool, min(len(header), 1000))
	for i, name := range header {
		name = strings.TrimSpace(name)
		line, column := r.FieldPos(i)
		switch {
		case name == "":
			return nil, fmt.Errorf("%s: line %d, column %d: a column without a name", what, line, column)
		case seen[strings.ToUpper(name)]:
			return nil, fmt.Errorf("%s: line %d, column %d: the column name %.40q stands there twice", what, line, column, name)
		}
		seen[strings.ToUpper(name)] = true
		s.names = append(s.names, name)
	}
	for {
		record, err := r.Read()
		if err == io.EOF {
			return s, nil
		}
		if err != nil {
			return nil, csvError(what, err)
		}
		line, _ := r.FieldPos(0)
		if len(record) != len(s.names) {
			return nil, fmt.Errorf("%s: line %d has %d cells, but the header names %d columns", what, line, len(record), len(s.names))
		}
		for i, cell := range record {
			x, err := parseCell(cell)
			if err != nil {
				line, column := r.FieldPos(i)
				return nil, fmt.Errorf("%s: line %d, column %d (%.40s): %w", what, line, column, s.names[i], err)
			}
			s.cells = append(s.cells, x)
		}
		s.line = append(s.line, line)
	}
}

func csvError(what string, err error) error {
	var p *csv.ParseError
	if errors.As(err, &p) {
		return fmt.Errorf("%s: line %d, column %d: %w", what, p.Line, p.Column, p.Err)
	}
	return fmt.Errorf("%s: %w", what, err)
}

// parseCell reads a decimal number; an empty cell is NaN.
func parseCell(cell string) (float64, error) {
	cell = strings.TrimSpace(cell)
	if cell == "" {
		return math.NaN(), nil
	}
	x, err := strconv.ParseFloat(cell, 64)
	if err != nil || strings.ContainsAny(cell, "xX_") {
		if errors.Is(err, strconv.ErrRange) {
			return 0, fmt.Errorf("the number %.40q is out of range", cell)
		}
		return 0, fmt.Errorf("%.40q is not a number; leave the cell empty or write nan for a missing value", cell)
	}
	return x, nil
}

// find returns the place of a column.
func (s *sheet) find(name string) (int, error) {
	for i, n := range s.names {
		if strings.EqualFold(n, name) {
			return i, nil
		}
	}
	list := s.names
	if len(list) > 20 {
		list = append(append([]string{}, list[:20]...), "...")
	}
	return 0, fmt.Errorf("no column %q, but %s%s", name, strings.Join(list, ", "), nearest.Hint(name, s.names))
}

// column copies one column.
func (s *sheet) column(i int) []float64 {
	out := make([]float64, len(s.line))
	for r := range out {
		out[r] = s.cells[r*len(s.names)+i]
	}
	return out
}

// channelEdges reads the channel file, in order of the channels' numbers.
func (s *sheet) channelEdges(cols Columns) (lo, hi []float64, err error) {
	edges := [2][]float64{}
	for k, role := range []string{"WAVE_LO", "WAVE_HI"} {
		c := cols.role(role)
		i, err := s.find(fallback(c.Name, strings.ToLower(role)))
		if err != nil {
			return nil, nil, err
		}
		edges[k] = s.column(i)
		if err := convert(edges[k], c.Unit, c.Offset, waveUnits, "wavelength"); err != nil {
			return nil, nil, fmt.Errorf("column %s: %w", s.names[i], err)
		}
	}
	at, err := s.find("channel")
	if err != nil {
		return edges[0], edges[1], nil // in order
	}
	m := len(s.line)
	lo, hi = make([]float64, m), make([]float64, m)
	seen := make([]bool, m)
	for r, number := range s.column(at) {
		if number != math.Trunc(number) || number < 0 || number >= float64(m) {
			return nil, nil, fmt.Errorf("line %d: channel %g, expected the numbers 0 to %d", s.line[r], number, m-1)
		}
		j := int(number)
		if seen[j] {
			return nil, nil, fmt.Errorf("line %d: channel %d is there twice", s.line[r], j)
		}
		seen[j] = true
		lo[j], hi[j] = edges[0][r], edges[1][r]
	}
	return lo, hi, nil
}

// fill sorts the columns of the series file by their roles.
func (s *sheet) fill(l *listing, cols Columns) (warnings []string, err error) {
	time := cols.role("TIME")
	timeAt, err := s.find(fallback(time.Name, "time_bjd_tdb"))
	if err != nil {
		return nil, err
	}
	l.time = s.column(timeAt)
	warnings = warnMJD(time.Unit, time.Offset)
	if err := convert(l.time, time.Unit, time.Offset, timeUnits, "time"); err != nil {
		return nil, fmt.Errorf("column %s: %w", s.names[timeAt], err)
	}
	m := len(l.lo)
	flux, sigma := cols.role("FLUX"), cols.role("FLUX_ERR")
	used := make([]bool, len(s.names))
	used[timeAt] = true
	fluxAt, err := s.numbered(fallback(flux.Name, "flux_"), m, used)
	if err != nil {
		return nil, err
	}
	l.flux = s.gather(fluxAt, flux.Offset)
	errAt, err := s.numbered(fallback(sigma.Name, "err_"), m, used)
	switch {
	case err == nil:
		l.err = s.gather(errAt, sigma.Offset)
	case !errors.Is(err, errNone) || sigma.Name != "":
		return nil, err
	}
	mapped := map[string]bool{}
	for i, name := range s.names {
		if used[i] {
			continue
		}
		c := cols.auxiliary(name)
		if mapped[strings.ToUpper(c.Role)] {
			return nil, fmt.Errorf("the auxiliary %s is there twice; a column mapping can give one of them another name", c.Role)
		}
		mapped[strings.ToUpper(c.Role)] = true
		value := s.column(i)
		addOffset(value, c.Offset)
		l.aux = append(l.aux, Series{Name: c.Role, Unit: c.Unit, Value: value})
	}
	for _, c := range cols {
		if !isRole(c.Role) && !mapped[strings.ToUpper(c.Role)] {
			_, err := s.find(fallback(c.Name, c.Role))
			return nil, fmt.Errorf("auxiliary %s: %w", c.Role, err)
		}
	}
	return warnings, nil
}

// errNone says that there is no numbered column at all.
var errNone = errors.New("no such column")

// numbered finds the columns prefix000, prefix001, ... of m channels, marks
// them as used and returns their places.
func (s *sheet) numbered(prefix string, m int, used []bool) ([]int, error) {
	at := make([]int, m)
	found := 0
	for i, name := range s.names {
		if used[i] || len(name) <= len(prefix) || !strings.EqualFold(name[:len(prefix)], prefix) {
			continue
		}
		number := name[len(prefix):]
		if strings.Trim(number, "0123456789") != "" {
			continue
		}
		j, err := strconv.Atoi(number)
		if err != nil || j >= m {
			return nil, fmt.Errorf("column %.40s, but the channel CSV lists %d channels, numbered from 0", name, m)
		}
		if at[j] > 0 {
			return nil, fmt.Errorf("columns %s and %s are both channel %d", s.names[at[j]-1], name, j)
		}
		at[j] = i + 1 // 0 means not found yet
		used[i] = true
		found++
	}
	if found == 0 && m > 0 {
		return nil, fmt.Errorf("%w: %s%0*d, for the first of %d channels", errNone, prefix, digits(m), 0, m)
	}
	for j := range at {
		if at[j] == 0 {
			return nil, fmt.Errorf("no column %s%0*d, but %d others: the channel CSV lists %d channels", prefix, digits(m), j, found, m)
		}
		at[j]--
	}
	return at, nil
}

// gather copies columns into rows.
func (s *sheet) gather(at []int, offset float64) []float64 {
	out := make([]float64, 0, len(s.line)*len(at))
	for r := range s.line {
		row := s.cells[r*len(s.names):]
		for _, i := range at {
			out = append(out, row[i])
		}
	}
	addOffset(out, offset)
	return out
}
