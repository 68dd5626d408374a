package spectrum

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"rimlight/steps/table"
)

// A field is one column of a written spectrum: how it is described, how it is
// taken from a point (whose error with the shared part is sigma), and how it is
// put back. One of number and text is set.
type field struct {
	name, unit, about string
	kind              string // ECSV datatype
	number            func(p *Point, sigma float64) float64
	setNumber         func(p *Point, x float64)
	text              func(p *Point) string
	setText           func(p *Point, x string)
}

// required is the number of leading fields that a file must have to be read.
const required = 4

// fields returns the columns in the order in which they are written.
func fields() []field {
	float := func(name, unit, about string, at func(p *Point) *float64) field {
		return field{name, unit, about, "float64",
			func(p *Point, _ float64) float64 { return *at(p) },
			func(p *Point, x float64) { *at(p) = x }, nil, nil}
	}
	count := func(name, about string, at func(p *Point) *int) field {
		return field{name, "", about, "int64",
			func(p *Point, _ float64) float64 { return float64(*at(p)) },
			func(p *Point, x float64) { *at(p) = int(x) }, nil, nil}
	}
	limb := func(name, about string, k int, of func(p *Point) *[]float64) field {
		return field{name, "", about, "float64",
			func(p *Point, _ float64) float64 {
				if k < len(*of(p)) {
					return (*of(p))[k]
				}
				return math.NaN()
			},
			func(p *Point, x float64) {
				if math.IsNaN(x) {
					return
				}
				for len(*of(p)) < k {
					*of(p) = append(*of(p), math.NaN())
				}
				*of(p) = append((*of(p))[:k:k], x)
			}, nil, nil}
	}
	value := func(p *Point) *[]float64 { return &p.Limb }
	spread := func(p *Point) *[]float64 { return &p.LimbErr }
	return []field{
		float("wave_lo", "um", "lower edge of the channel", func(p *Point) *float64 { return &p.Channel.Lo }),
		float("wave_hi", "um", "upper edge of the channel", func(p *Point) *float64 { return &p.Channel.Hi }),
		float("depth", "", "transit depth, (planet radius / stellar radius)^2", func(p *Point) *float64 { return &p.Depth }),
		{"depth_err", "", "one standard deviation of depth, what the channels share included", "float64",
			func(_ *Point, sigma float64) float64 { return sigma },
			func(p *Point, x float64) { p.DepthErr = x }, nil, nil},
		float("radius_ratio", "", "planet radius / stellar radius", func(p *Point) *float64 { return &p.RadiusRatio }),
		float("radius_ratio_err", "", "one standard deviation of radius_ratio in the fit of this channel", func(p *Point) *float64 { return &p.RadiusRatioErr }),
		limb("u1", "first limb-darkening coefficient", 0, value),
		limb("u1_err", "one standard deviation of u1, 0 where held", 0, spread),
		limb("u2", "second limb-darkening coefficient", 1, value),
		limb("u2_err", "one standard deviation of u2, 0 where held", 1, spread),
		{"chi2_reduced", "", "chi-square per degree of freedom of the fit", "float64",
			func(p *Point, _ float64) float64 { return p.ReducedChi2() },
			func(p *Point, x float64) {
				if !math.IsNaN(x) {
					p.Chi2, p.Dof = x, 1
				}
			}, nil, nil},
		float("scatter", "", "standard deviation of the relative residuals of one integration", func(p *Point) *float64 { return &p.Scatter }),
		count("samples_used", "integrations fitted", func(p *Point) *int { return &p.Used }),
		count("samples_masked", "integrations left out", func(p *Point) *int { return &p.Masked }),
		count("channel", "position of the channel in the input, from 0", func(p *Point) *int { return &p.Channel.Index }),
		{"flag", "", "why there is no depth, or what is doubtful; empty when good", "string", nil, nil,
			func(p *Point) string { return p.Flag },
			func(p *Point, x string) { p.Flag = x }},
	}
}

// CSV writes a spectrum as comma-separated values, one row per channel, with the
// columns
//
//	wave_lo,wave_hi,depth,depth_err,radius_ratio,radius_ratio_err,u1,u1_err,u2,u2_err,
//	chi2_reduced,scatter,samples_used,samples_masked,channel,flag
//
// Wavelengths are in um; depths are fractions. depth_err includes what the
// channels share ([Spectrum.Errors]), the other errors are those of the channel's
// own fit. A channel without a depth keeps its row with nan. Numbers have the
// fewest digits that read back to the same float64. Limb-darkening coefficients
// beyond the second, and the covariance, are not part of it.
func CSV(s Spectrum) []byte {
	var out bytes.Buffer
	w := csv.NewWriter(&out)
	all := fields()
	record := make([]string, len(all))
	for k, f := range all {
		record[k] = f.name
	}
	write := func() { _ = w.Write(record) } // a bytes.Buffer does not fail
	write()
	sigma := s.Errors()
	for i := range s.Points {
		for k, f := range all {
			record[k] = f.cell(&s.Points[i], sigma[i])
		}
		write()
	}
	w.Flush()
	return out.Bytes()
}

// cell writes the field of one point. Carriage returns are dropped from text:
// readers of CSV take them for a part of the line's end.
func (f field) cell(p *Point, sigma float64) string {
	switch {
	case f.text != nil:
		return strings.ReplaceAll(f.text(p), "\r", "")
	case f.kind == "int64":
		return strconv.Itoa(int(f.number(p, sigma)))
	}
	return table.FormatNumber(f.number(p, sigma))
}

// ReadCSV reads what [CSV] wrote. The columns wave_lo, wave_hi, depth and
// depth_err are required, in any order; other columns of [CSV] are read where
// they are present, and unknown ones ignored. The errors become the diagonal of
// the covariance and the points' own DepthErr, shared part included; Chi2 is per
// degree of freedom with Dof 1. Rows must be in order of wavelength. Errors name
// the line.
func ReadCSV(data []byte) (Spectrum, error) {
	r := csv.NewReader(bytes.NewReader(data))
	r.ReuseRecord = true
	header, err := r.Read()
	if errors.Is(err, io.EOF) {
		return Spectrum{}, fmt.Errorf("read spectrum: the file is empty; expected a line of column names")
	}
	if err != nil {
		return Spectrum{}, fmt.Errorf("read spectrum: %w", err)
	}
	all := fields()
	at := make([]int, len(all)) // position of each field in the file, -1 when absent
	for k, f := range all {
		at[k] = -1
		for j, name := range header {
			if strings.TrimPrefix(strings.TrimSpace(name), "\ufeff") != f.name {
				continue
			}
			if at[k] >= 0 {
				return Spectrum{}, fmt.Errorf("read spectrum: line 1: two columns are named %s; expected one", f.name)
			}
			at[k] = j
		}
		if at[k] < 0 && k < required {
			return Spectrum{}, fmt.Errorf("read spectrum: line 1: no column %s; expected wave_lo, wave_hi, depth and depth_err", f.name)
		}
	}
	var points []Point
	for {
		record, err := r.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return Spectrum{}, fmt.Errorf("read spectrum: %w", err)
		}
		p := unmeasured(len(points))
		for k, f := range all {
			if at[k] < 0 {
				continue
			}
			if err := f.read(&p, record[at[k]]); err != nil {
				line, _ := r.FieldPos(at[k])
				return Spectrum{}, fmt.Errorf("read spectrum: line %d: column %s: %w", line, f.name, err)
			}
		}
		if n := len(points); n > 0 && p.Channel.Lo < points[n-1].Channel.Lo {
			line, _ := r.FieldPos(0)
			return Spectrum{}, fmt.Errorf("read spectrum: line %d: wave_lo %g is below that of the row before; expected rows in order of wavelength", line, p.Channel.Lo)
		}
		if points = append(points, p); len(points) > MaxPoints {
			return Spectrum{}, fmt.Errorf("read spectrum: more than %d rows; expected a row for each channel", MaxPoints)
		}
	}
	out, err := Assemble(points, nil)
	if err != nil {
		return Spectrum{}, fmt.Errorf("read spectrum: %w", err)
	}
	return out, nil
}

// unmeasured is the point of a row before any of its cells is read.
func unmeasured(index int) Point {
	nan := math.NaN()
	p := Point{Depth: nan, DepthErr: nan, RadiusRatio: nan, RadiusRatioErr: nan, Scatter: nan}
	p.Channel.Index = index
	return p
}

// read puts one cell into p.
func (f field) read(p *Point, cell string) error {
	if f.setText != nil {
		if !utf8.ValidString(cell) {
			return fmt.Errorf("%.40q; expected UTF-8 text", cell)
		}
		f.setText(p, cell)
		return nil
	}
	cell = strings.TrimSpace(cell)
	if f.kind == "int64" {
		n, err := strconv.ParseInt(cell, 10, 53)
		if err != nil {
			return fmt.Errorf("%.40q; expected a whole number", cell)
		}
		f.setNumber(p, float64(n))
		return nil
	}
	x, err := strconv.ParseFloat(cell, 64)
	if err != nil {
		return fmt.Errorf("%.40q; expected a number or nan", cell)
	}
	f.setNumber(p, x)
	return nil
}
