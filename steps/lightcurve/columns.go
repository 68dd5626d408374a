package lightcurve

import (
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"

	"rimlight/steps/nearest"
)

// A Column says where one quantity of the light-curve table stands in a file of
// another layout. Empty fields keep the default.
//
// In FITS files, Role TIME, FLUX, FLUX_ERR, WAVE_LO and WAVE_HI default to the
// column of that name. FLUX, FLUX_ERR and auxiliaries are looked for in the HDU
// of TIME, WAVE_HI in that of WAVE_LO. An HDU that holds an image serves as a
// column without a name: fluxes with the channels along its first axis and the
// integrations along its second, times and wavelengths along its only one.
//
// In CSV files, HDU means nothing, and the Name of FLUX and FLUX_ERR is what
// stands before the channel's number: "flux_" unless said otherwise, and "err_".
type Column struct {
	Role   string  // TIME, FLUX, FLUX_ERR, WAVE_LO, WAVE_HI, or the name that an auxiliary shall have
	HDU    string  // name, "name,version" or number of the HDU
	Name   string  // column name in the file
	Unit   string  // unit in the file, in place of the one that the file gives
	Offset float64 // added to the values, in Unit: 2450000 for times stored as BJD - 2450000
}

// Columns is the mapping of a file's layout to the light-curve table; empty for
// a file that has that layout. It has at most 256 rows, and texts of at most 200
// bytes.
type Columns []Column

// Every row of a mapping may read a column of the file's size.
const (
	maxColumns = 256
	maxText    = 200 // bytes
)

// roles are the columns that every light-curve table has, FLUX_ERR excepted.
var roles = [...]string{"TIME", "FLUX", "FLUX_ERR", "WAVE_LO", "WAVE_HI"}

func isRole(role string) bool {
	for _, r := range roles {
		if strings.EqualFold(r, role) {
			return true
		}
	}
	return false
}

// check reports what makes a mapping ambiguous or meaningless.
func (cols Columns) check() error {
	if len(cols) > maxColumns {
		return fmt.Errorf("the column mapping has %d rows, expected at most %d", len(cols), maxColumns)
	}
	for i, c := range cols {
		for _, text := range []string{c.Role, c.HDU, c.Name, c.Unit} {
			if len(text) > maxText || !utf8.ValidString(text) {
				return fmt.Errorf("row %d of the column mapping: %.40q is not UTF-8 text of up to %d bytes", i+1, text, maxText)
			}
		}
		if strings.TrimSpace(c.Role) == "" {
			return fmt.Errorf("row %d of the column mapping has no role, expected %s or an auxiliary's name", i+1, strings.Join(roles[:], ", "))
		}
		if !finite(c.Offset) {
			return fmt.Errorf("column mapping of %s: the offset %g is not a number", c.Role, c.Offset)
		}
		for _, d := range cols[:i] {
			if strings.EqualFold(c.Role, d.Role) {
				return fmt.Errorf("the column mapping names the role %s twice", c.Role)
			}
		}
	}
	return nil
}

// role returns the mapping of a role, or an empty one.
func (cols Columns) role(role string) Column {
	for _, c := range cols {
		if strings.EqualFold(c.Role, role) {
			return c
		}
	}
	return Column{Role: role}
}

// auxiliary returns the mapping that gives the file's column of this name a
// role, or one that keeps the name.
func (cols Columns) auxiliary(name string) Column {
	for _, c := range cols {
		if !isRole(c.Role) && strings.EqualFold(fallback(c.Name, c.Role), name) {
			return c
		}
	}
	return Column{Role: name}
}

func fallback(value, other string) string {
	if value == "" {
		return other
	}
	return value
}

// A unit converts by times/over, of which one is 1, so that a conversion rounds
// only once.
type unit struct {
	names       []string
	times, over float64
}

// timeUnits convert to days. The names beyond the FITS standard are found in
// files; those of time scales mean days.
var timeUnits = []unit{
	{[]string{"d", "day", "days", "BJD_TDB", "BJD", "JD", "MJD"}, 1, 1},
	{[]string{"h", "hr", "hour", "hours"}, 1, 24},
	{[]string{"min", "minute", "minutes"}, 1, 1440},
	{[]string{"s", "sec", "second", "seconds"}, 1, 86400},
}

// waveUnits convert to micrometres.
var waveUnits = []unit{
	{[]string{"um", "micron", "microns", "micrometer", "micrometre"}, 1, 1},
	{[]string{"nm", "nanometer", "nanometre"}, 1, 1000},
	{[]string{"Angstrom", "Angstroms"}, 1, 10000},
	{[]string{"m"}, 1e6, 1},
}

// convert adds the offset to all values and converts them from the named unit.
// An empty name is the first unit.
func convert(values []float64, name string, offset float64, units []unit, quantity string) error {
	var known []string
	for _, u := range units {
		for _, n := range u.names {
			known = append(known, n)
			if name != "" && !strings.EqualFold(n, strings.TrimSpace(name)) {
				continue
			}
			for i := range values {
				values[i] = (values[i] + offset) * u.times / u.over
			}
			return nil
		}
	}
	return fmt.Errorf("the unit %.40q is not one of %s, expected %s%s; a column mapping can name unit and offset",
		name, quantity, strings.Join(known, ", "), nearest.Hint(name, known))
}

// warnMJD tells of times that are probably not yet barycentric Julian dates.
func warnMJD(name string, offset float64) []string {
	if strings.EqualFold(strings.TrimSpace(name), "MJD") && offset == 0 {
		return []string{"times are given as MJD and are used as they are; a column mapping with the offset 2400000.5 makes them Julian dates"}
	}
	return nil
}

func addOffset(values []float64, offset float64) {
	if offset == 0 {
		return
	}
	for i := range values {
		values[i] += offset
	}
}

// digits is how many digits number the columns of m channels in CSV.
func digits(m int) int {
	return max(3, len(strconv.Itoa(m-1)))
}
