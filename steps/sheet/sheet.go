// Package sheet reads CSV files of numbers under a line of column names, as
// RFC 4180 defines them, with comment lines that start with #.
package sheet

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"rimlight/steps/nearest"
)

// A Sheet is a table of numbers with named columns.
type Sheet struct {
	Names []string    // of the columns; no two are alike but for letter case
	Line  []int       // number of the line that each row starts on, from 1
	rows  [][]float64 // each with a cell for each name
}

// maxColumns is far above twice the channels of any spectrograph (fluxes and
// errors); it keeps the table of names small.
const maxColumns = 1 << 16

// maxName is the length in bytes of the longest column name.
const maxName = 200

// Read parses a file. A cell holds a decimal number, or nothing or "nan" for NaN;
// every row must have as many cells as there are names, and no two names may be
// alike. Names are UTF-8 text of up to 200 bytes. Errors start with what and name line and column. Memory stays within a
// multiple of the file's size.
func Read(data []byte, what string) (*Sheet, error) {
	return Open(bytes.NewReader(data), what)
}

// Open is [Read] of a file that need not be in memory.
func Open(file io.Reader, what string) (*Sheet, error) {
	text := bufio.NewReaderSize(file, 64<<10)
	if mark, _ := text.Peek(3); string(mark) == "\xef\xbb\xbf" { // byte order mark
		text.Discard(3)
	}
	r := csv.NewReader(text)
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
	if len(header) > maxColumns {
		return nil, fmt.Errorf("%s: the first line names %d columns, expected at most %d", what, len(header), maxColumns)
	}
	s := &Sheet{}
	seen := make(map[string]bool, min(len(header), 1000))
	for i, name := range header {
		name = strings.TrimSpace(name)
		line, column := r.FieldPos(i)
		switch {
		case len(name) > maxName || !utf8.ValidString(name):
			return nil, fmt.Errorf("%s: line %d, column %d: the column name %.40q is not UTF-8 text of up to %d bytes", what, line, column, name, maxName)
		case name == "":
			return nil, fmt.Errorf("%s: line %d, column %d: a column without a name", what, line, column)
		case seen[strings.ToUpper(name)]:
			return nil, fmt.Errorf("%s: line %d, column %d: the column name %.40q stands there twice", what, line, column, name)
		}
		seen[strings.ToUpper(name)] = true
		s.Names = append(s.Names, name)
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
		if len(record) != len(s.Names) {
			return nil, fmt.Errorf("%s: line %d has %d cells, but the header names %d columns", what, line, len(record), len(s.Names))
		}
		row := make([]float64, len(record))
		for i, cell := range record {
			x, err := parseCell(cell)
			if err != nil {
				line, column := r.FieldPos(i)
				return nil, fmt.Errorf("%s: line %d, column %d (%.40s): %w", what, line, column, s.Names[i], err)
			}
			row[i] = x
		}
		s.rows = append(s.rows, row)
		s.Line = append(s.Line, line)
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

// Find returns the place of a column, from 0; letter case does not count. The
// error lists the columns that there are.
func (s *Sheet) Find(name string) (int, error) {
	for i, n := range s.Names {
		if strings.EqualFold(n, name) {
			return i, nil
		}
	}
	list := s.Names
	if len(list) > 20 {
		list = append(append([]string{}, list[:20]...), "...")
	}
	return 0, fmt.Errorf("no column %.40q, but %s%s", name, strings.Join(list, ", "), nearest.Hint(name, s.Names))
}

// Row is a view of one row.
func (s *Sheet) Row(r int) []float64 { return s.rows[r] }

// Column copies the column at a place.
func (s *Sheet) Column(i int) []float64 {
	out := make([]float64, len(s.Line))
	for r := range out {
		out[r] = s.rows[r][i]
	}
	return out
}
