package lightcurve

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"rimlight/steps/sheet"
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
	return OpenCSV(bytes.NewReader(series), bytes.NewReader(channels), cols)
}

// OpenCSV is [ReadCSV] of files that need not be in memory.
func OpenCSV(series, channels io.Reader, cols Columns) (Cube, []string, error) {
	if err := cols.check(); err != nil {
		return Cube{}, nil, err
	}
	edges, err := sheet.Open(channels, "channel CSV")
	if err != nil {
		return Cube{}, nil, err
	}
	rows, err := sheet.Open(series, "light-curve CSV")
	if err != nil {
		return Cube{}, nil, err
	}
	l := listing{
		row:   func(i int) string { return fmt.Sprintf("line %d", rows.Line[i]) },
		edges: func(j int) string { return fmt.Sprintf("channel %d", j) },
	}
	if l.lo, l.hi, err = channelEdges(edges, cols); err != nil {
		return Cube{}, nil, fmt.Errorf("channel CSV: %w", err)
	}
	warnings, err := fill(rows, &l, cols)
	if err != nil {
		return Cube{}, nil, fmt.Errorf("light-curve CSV: %w", err)
	}
	cube, notes, err := l.cube()
	if err != nil {
		return Cube{}, warnings, fmt.Errorf("light-curve CSV: %w", err)
	}
	return cube, append(warnings, notes...), nil
}

// channelEdges reads the channel file, in order of the channels' numbers.
func channelEdges(s *sheet.Sheet, cols Columns) (lo, hi []float64, err error) {
	edges := [2][]float64{}
	for k, role := range []string{"WAVE_LO", "WAVE_HI"} {
		c := cols.role(role)
		i, err := s.Find(fallback(c.Name, strings.ToLower(role)))
		if err != nil {
			return nil, nil, err
		}
		edges[k] = s.Column(i)
		if err := convert(edges[k], c.Unit, c.Offset, waveUnits, "wavelength"); err != nil {
			return nil, nil, fmt.Errorf("column %s: %w", s.Names[i], err)
		}
	}
	at, err := s.Find("channel")
	if err != nil {
		return edges[0], edges[1], nil // in order
	}
	m := len(s.Line)
	lo, hi = make([]float64, m), make([]float64, m)
	seen := make([]bool, m)
	for r, number := range s.Column(at) {
		if number != math.Trunc(number) || number < 0 || number >= float64(m) {
			return nil, nil, fmt.Errorf("line %d: channel %g, expected the numbers 0 to %d", s.Line[r], number, m-1)
		}
		j := int(number)
		if seen[j] {
			return nil, nil, fmt.Errorf("line %d: channel %d is there twice", s.Line[r], j)
		}
		seen[j] = true
		lo[j], hi[j] = edges[0][r], edges[1][r]
	}
	return lo, hi, nil
}

// fill sorts the columns of the series file by their roles.
func fill(s *sheet.Sheet, l *listing, cols Columns) (warnings []string, err error) {
	time := cols.role("TIME")
	timeAt, err := s.Find(fallback(time.Name, "time_bjd_tdb"))
	if err != nil {
		return nil, err
	}
	l.time = s.Column(timeAt)
	warnings = warnMJD(time.Unit, time.Offset)
	if err := convert(l.time, time.Unit, time.Offset, timeUnits, "time"); err != nil {
		return nil, fmt.Errorf("column %s: %w", s.Names[timeAt], err)
	}
	m := len(l.lo)
	flux, sigma := cols.role("FLUX"), cols.role("FLUX_ERR")
	used := make([]bool, len(s.Names))
	used[timeAt] = true
	fluxAt, err := numbered(s, fallback(flux.Name, "flux_"), m, used)
	if err != nil {
		return nil, err
	}
	l.flux = pick(s, fluxAt, flux.Offset)
	errAt, err := numbered(s, fallback(sigma.Name, "err_"), m, used)
	switch {
	case err == nil:
		l.err = pick(s, errAt, sigma.Offset)
	case !errors.Is(err, errNone) || sigma.Name != "":
		return nil, err
	}
	mapped := map[string]bool{}
	for i, name := range s.Names {
		if used[i] {
			continue
		}
		c := cols.auxiliary(name)
		if mapped[strings.ToUpper(c.Role)] {
			return nil, fmt.Errorf("the auxiliary %s is there twice; a column mapping can give one of them another name", c.Role)
		}
		mapped[strings.ToUpper(c.Role)] = true
		value := s.Column(i)
		addOffset(value, c.Offset)
		l.aux = append(l.aux, Series{Name: c.Role, Unit: c.Unit, Value: value})
	}
	for _, c := range cols {
		if !isRole(c.Role) && !mapped[strings.ToUpper(c.Role)] {
			name := fallback(c.Name, c.Role)
			if _, err := s.Find(name); err != nil {
				return nil, fmt.Errorf("auxiliary %s: %w", c.Role, err)
			}
			return nil, fmt.Errorf("auxiliary %s: the column %s has another role already", c.Role, name)
		}
	}
	return warnings, nil
}

// errNone says that there is no numbered column at all.
var errNone = errors.New("no such column")

// numbered finds the columns prefix000, prefix001, ... of m channels, marks
// them as used and returns their places.
func numbered(s *sheet.Sheet, prefix string, m int, used []bool) ([]int, error) {
	at := make([]int, m)
	found := 0
	for i, name := range s.Names {
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
			return nil, fmt.Errorf("columns %s and %s are both channel %d", s.Names[at[j]-1], name, j)
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

// pick gives some columns, with an offset added, as rows.
func pick(s *sheet.Sheet, at []int, offset float64) rows {
	return func(do func(first int, values []float64)) error {
		values := make([]float64, len(at))
		for r := range s.Line {
			row := s.Row(r)
			for k, i := range at {
				values[k] = row[i]
			}
			addOffset(values, offset)
			do(r, values)
		}
		return nil
	}
}
