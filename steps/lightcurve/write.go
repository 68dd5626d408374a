package lightcurve

import (
	"bytes"
	"fmt"
	"strconv"

	"rimlight/steps/fits"
)

// WriteFITS writes a cube in the light-curve table layout that [ReadFITS]
// reads. All samples are written as they are: reasons for masking beyond those
// that reading finds again (Outlier, Excluded) are not kept. Channels are
// written in the order of the cube. Times and wavelengths come back exactly.
func WriteFITS(cube Cube) ([]byte, error) {
	var w fits.Writer
	if err := writeTables(&w, cube); err != nil {
		return nil, err
	}
	return w.Bytes(), nil
}

// WriteFITSComparison is [WriteFITS] with the light curves of a comparison star
// on the same channels; its times may be others.
func WriteFITSComparison(cube, comparison Cube) ([]byte, error) {
	if len(comparison.Channels) != len(cube.Channels) {
		return nil, fmt.Errorf("write light curves: the comparison star has %d channels, but the star has %d", len(comparison.Channels), len(cube.Channels))
	}
	for j, c := range cube.Channels {
		if d := comparison.Channels[j]; c.Lo != d.Lo || c.Hi != d.Hi {
			return nil, fmt.Errorf("write light curves: channel %d of the comparison star is %g to %g um, but that of the star %g to %g", j, d.Lo, d.Hi, c.Lo, c.Hi)
		}
	}
	var w fits.Writer
	if err := writeTables(&w, cube); err != nil {
		return nil, err
	}
	if err := writeSeries(&w, "COMPARISON", comparison); err != nil {
		return nil, err
	}
	return w.Bytes(), nil
}

func writeTables(w *fits.Writer, cube Cube) error {
	if err := writeSeries(w, "LIGHTCURVES", cube); err != nil {
		return err
	}
	lo, hi := make([]float64, len(cube.Channels)), make([]float64, len(cube.Channels))
	for j, c := range cube.Channels {
		lo[j], hi[j] = c.Lo, c.Hi
	}
	return w.Table("CHANNELS", []fits.NewColumn{
		{Name: "WAVE_LO", Unit: "um", About: "lower edge of the channel", Values: lo},
		{Name: "WAVE_HI", Unit: "um", About: "upper edge of the channel", Values: hi},
	})
}

func writeSeries(w *fits.Writer, name string, cube Cube) error {
	if err := cube.checkShape("write light curves"); err != nil {
		return err
	}
	n, m := len(cube.Time), len(cube.Channels)
	if n == 0 || m == 0 {
		return fmt.Errorf("write light curves: %d integrations of %d channels, expected at least one of each", n, m)
	}
	flux, sigma := make([]float64, n*m), make([]float64, n*m)
	for j := range m {
		for i := range n {
			flux[i*m+j], sigma[i*m+j] = cube.Flux[j][i], cube.Err[j][i]
		}
	}
	columns := []fits.NewColumn{
		{Name: "TIME", Unit: "d", About: "BJD_TDB, mid-integration", Values: cube.Time},
		{Name: "FLUX", About: "one element per channel", Values: flux, Width: m},
	}
	if writesErrors(cube) {
		columns = append(columns, fits.NewColumn{Name: "FLUX_ERR", About: "one standard deviation", Values: sigma, Width: m})
	}
	for _, s := range cube.Aux {
		columns = append(columns, fits.NewColumn{Name: s.Name, Unit: s.Unit, Values: s.Value})
	}
	if err := w.Table(name, columns); err != nil {
		return fmt.Errorf("write light curves: %w", err)
	}
	return nil
}

// writesErrors reports whether any error is not zero; a cube without errors is
// written without the column.
func writesErrors(cube Cube) bool {
	for _, sigma := range cube.Err {
		for _, e := range sigma {
			if e != 0 {
				return true
			}
		}
	}
	return false
}

// WriteCSV writes a cube as the two files that [ReadCSV] reads: the series and
// the channels. Units of auxiliaries are not kept; in all else it is as
// [WriteFITS].
func WriteCSV(cube Cube) (series, channels []byte, err error) {
	if err := cube.checkShape("write light curves"); err != nil {
		return nil, nil, err
	}
	m := len(cube.Channels)
	if len(cube.Time) == 0 || m == 0 {
		return nil, nil, fmt.Errorf("write light curves: %d integrations of %d channels, expected at least one of each", len(cube.Time), m)
	}
	number := digits(m)
	columns := [][]float64{cube.Time}
	var b bytes.Buffer
	b.WriteString("time_bjd_tdb")
	for _, s := range cube.Aux {
		if !isPlain(s.Name) {
			return nil, nil, fmt.Errorf("write light curves: the auxiliary name %.40q cannot be written, expected letters, digits, _ and -", s.Name)
		}
		b.WriteString("," + s.Name)
		columns = append(columns, s.Value)
	}
	for j := range m {
		fmt.Fprintf(&b, ",flux_%0*d", number, j)
		columns = append(columns, cube.Flux[j])
	}
	if writesErrors(cube) {
		for j := range m {
			fmt.Fprintf(&b, ",err_%0*d", number, j)
			columns = append(columns, cube.Err[j])
		}
	}
	b.WriteByte('\n')
	line := []byte{}
	for i := range cube.Time {
		line = line[:0]
		for k, c := range columns {
			if k > 0 {
				line = append(line, ',')
			}
			line = appendCell(line, c[i])
		}
		b.Write(append(line, '\n'))
	}
	var edges bytes.Buffer
	edges.WriteString("channel,wave_lo,wave_hi\n")
	for j, c := range cube.Channels {
		line = strconv.AppendInt(line[:0], int64(j), 10)
		line = appendCell(append(line, ','), c.Lo)
		line = appendCell(append(line, ','), c.Hi)
		edges.Write(append(line, '\n'))
	}
	return b.Bytes(), edges.Bytes(), nil
}

// appendCell writes the shortest digits that read back as the same number.
func appendCell(b []byte, x float64) []byte {
	if x != x {
		return append(b, "nan"...)
	}
	return strconv.AppendFloat(b, x, 'g', -1, 64)
}

func isPlain(name string) bool {
	for i := 0; i < len(name); i++ {
		c := name[i] | 0x20
		if !(c >= 'a' && c <= 'z' || name[i] >= '0' && name[i] <= '9' || name[i] == '_' || name[i] == '-') {
			return false
		}
	}
	return name != ""
}
