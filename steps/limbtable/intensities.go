package limbtable

import (
	"fmt"
	"slices"
)

// Intensities are the intensities of a model atmosphere on a grid.
type Intensities struct {
	Wave  []float64   // m wavelengths, um, above 0, increasing
	Mu    []float64   // n cosines of the angle to the normal, 0 to 1, increasing
	Value [][]float64 // m rows of n: energy per unit of wavelength, area, solid angle and time; in any unit, ≥ 0
}

// Throughput is the share of the light that telescope, instrument and detector
// let through, by wavelength, 0 outside of its range. Between its points it is
// linear. Without points it is the same at all wavelengths.
type Throughput struct {
	Wave  []float64 // um, above 0, increasing
	Value []float64 // as many, ≥ 0, in any unit
}

// ReadIntensities reads the intensity table layout: one row for each wavelength
// and mu of a grid, in any order. In CSV, the columns are wave in um, mu and
// intensity; in FITS, the binary table INTENSITY has the columns WAVE, MU and
// INTENSITY. Other things are as with [Read].
//
// It is an error when a column is missing, a number is out of its range, or the
// rows do not fill a grid, each place once.
func ReadIntensities(data []byte) (Intensities, error) {
	t, err := readIntensities(data)
	if err != nil {
		return Intensities{}, fmt.Errorf("intensity table: %w", err)
	}
	return t, nil
}

func readIntensities(data []byte) (Intensities, error) {
	s, err := open(data, "INTENSITY")
	if err != nil {
		return Intensities{}, err
	}
	var columns [3][]float64
	for k, name := range []string{"wave", "mu", "intensity"} {
		if columns[k], err = s.column(name, []string{"um", "", ""}[k]); err != nil {
			return Intensities{}, err
		}
	}
	wave, mu, value := columns[0], columns[1], columns[2]
	if len(wave) == 0 {
		return Intensities{}, fmt.Errorf("the table has no rows")
	}
	for j := range wave {
		switch {
		case !(wave[j] > 0) || !finite(wave[j]):
			return Intensities{}, fmt.Errorf("%s: wavelength %g um, expected a number above 0", s.row(j), wave[j])
		case !(mu[j] >= 0 && mu[j] <= 1):
			return Intensities{}, fmt.Errorf("%s: mu is %g, expected 0 to 1", s.row(j), mu[j])
		case !(value[j] >= 0) || !finite(value[j]):
			return Intensities{}, fmt.Errorf("%s: intensity %g, expected a finite number, not negative", s.row(j), value[j])
		}
	}
	t := Intensities{Wave: distinct(wave), Mu: distinct(mu)}
	m, n := len(t.Wave), len(t.Mu)
	if len(wave) != m*n {
		return Intensities{}, fmt.Errorf("%d rows for %d wavelengths and %d values of mu, expected %d rows, one for each pair", len(wave), m, n, m*n)
	}
	all := make([]float64, m*n)
	from := make([]int, m*n) // row that each place was filled from, from 1
	for j := range wave {
		a, _ := slices.BinarySearch(t.Wave, wave[j])
		b, _ := slices.BinarySearch(t.Mu, mu[j])
		at := a*n + b
		if from[at] > 0 {
			return Intensities{}, fmt.Errorf("%s: wavelength %g um and mu %g again, as in %s", s.row(j), wave[j], mu[j], s.row(from[at]-1))
		}
		all[at], from[at] = value[j], j+1
	}
	for a := range m {
		t.Value = append(t.Value, all[a*n:(a+1)*n:(a+1)*n])
	}
	return t, nil
}

// distinct returns the values in increasing order, each once.
func distinct(values []float64) []float64 {
	sorted := slices.Clone(values)
	slices.Sort(sorted)
	return slices.Clip(slices.Compact(sorted))
}

// check reports intensities that are not as the type says.
func (t Intensities) check() error {
	if len(t.Wave) < 1 || len(t.Mu) < 2 || len(t.Value) != len(t.Wave) {
		return fmt.Errorf("%d wavelengths, %d values of mu and %d rows of intensities; expected at least 1 and 2, and a row for each wavelength", len(t.Wave), len(t.Mu), len(t.Value))
	}
	if err := increasing("Wave", t.Wave); err != nil {
		return err
	}
	if t.Mu[0] != 0 {
		if err := increasing("Mu", t.Mu); err != nil {
			return err
		}
	} else if err := increasing("Mu", t.Mu[1:]); err != nil {
		return err
	}
	if last := t.Mu[len(t.Mu)-1]; last != 1 {
		return fmt.Errorf("the largest mu is %g, expected 1: intensities are relative to those at the centre of the disc", last)
	}
	for a, row := range t.Value {
		if len(row) != len(t.Mu) {
			return fmt.Errorf("%d intensities at wavelength %g um, expected %d", len(row), t.Wave[a], len(t.Mu))
		}
		for b, v := range row {
			if !(v >= 0) || !finite(v) {
				return fmt.Errorf("intensity %g at wavelength %g um and mu %g, expected a finite number, not negative", v, t.Wave[a], t.Mu[b])
			}
		}
	}
	return nil
}

// increasing reports numbers that are not above 0, finite and increasing.
func increasing(name string, x []float64) error {
	before := 0.0
	for i, v := range x {
		if !(v > before) || !finite(v) {
			return fmt.Errorf("%s[%d] is %g after %g, expected finite numbers above 0, increasing", name, i, v, before)
		}
		before = v
	}
	return nil
}

// ReadThroughput reads the throughput curve layout. In CSV, the columns are wave
// in um and throughput; in FITS, the binary table THROUGHPUT has the columns WAVE
// and THROUGHPUT. Rows are sorted by wavelength. Other things are as with [Read].
//
// It is an error when a column is missing, a number is out of its range, a
// wavelength comes twice, or nothing is let through.
func ReadThroughput(data []byte) (Throughput, error) {
	t, err := readThroughput(data)
	if err != nil {
		return Throughput{}, fmt.Errorf("throughput curve: %w", err)
	}
	return t, nil
}

func readThroughput(data []byte) (Throughput, error) {
	s, err := open(data, "THROUGHPUT")
	if err != nil {
		return Throughput{}, err
	}
	wave, err := s.column("wave", "um")
	if err != nil {
		return Throughput{}, err
	}
	value, err := s.column("throughput", "")
	if err != nil {
		return Throughput{}, err
	}
	order := make([]int, len(wave))
	for j := range order {
		order[j] = j
		if !(wave[j] > 0) || !finite(wave[j]) || !(value[j] >= 0) || !finite(value[j]) {
			return Throughput{}, fmt.Errorf("%s: throughput %g at %g um, expected finite numbers, not negative and above 0", s.row(j), value[j], wave[j])
		}
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case wave[a] < wave[b]:
			return -1
		case wave[a] > wave[b]:
			return 1
		}
		return 0
	})
	var t Throughput
	for i, j := range order {
		if i > 0 && wave[j] == wave[order[i-1]] {
			return Throughput{}, fmt.Errorf("%s: wavelength %g um again, as in %s", s.row(j), wave[j], s.row(order[i-1]))
		}
		t.Wave, t.Value = append(t.Wave, wave[j]), append(t.Value, value[j])
	}
	if len(t.Wave) < 2 {
		return Throughput{}, fmt.Errorf("%d rows, expected at least 2", len(t.Wave))
	}
	return t, t.check()
}

// check reports a curve that is not as the type says.
func (t Throughput) check() error {
	if len(t.Value) != len(t.Wave) {
		return fmt.Errorf("throughput: %d values for %d wavelengths, expected as many", len(t.Value), len(t.Wave))
	}
	if len(t.Wave) == 0 {
		return nil
	}
	if err := increasing("throughput: Wave", t.Wave); err != nil {
		return err
	}
	some := false
	for i, v := range t.Value {
		if !(v >= 0) || !finite(v) {
			return fmt.Errorf("throughput: Value[%d] is %g, expected a finite number, not negative", i, v)
		}
		some = some || v > 0
	}
	if !some || len(t.Wave) < 2 {
		return fmt.Errorf("throughput: nothing is let through at any wavelength")
	}
	return nil
}

// at returns the throughput at a wavelength.
func (t Throughput) at(wave float64) float64 {
	n := len(t.Wave)
	if n == 0 {
		return 1
	}
	if !(wave >= t.Wave[0] && wave <= t.Wave[n-1]) {
		return 0
	}
	i, exact := slices.BinarySearch(t.Wave, wave)
	if exact {
		return t.Value[i]
	}
	f := (wave - t.Wave[i-1]) / (t.Wave[i] - t.Wave[i-1])
	return t.Value[i-1] + f*(t.Value[i]-t.Value[i-1])
}
