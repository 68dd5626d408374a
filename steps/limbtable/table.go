package limbtable

import (
	"fmt"
	"slices"

	"rimlight/steps/lightcurve"
)

// A Table holds limb-darkening coefficients of m channels.
type Table struct {
	Channels []lightcurve.Channel // length m, in order of increasing wavelength
	U1       []float64            // length m; the law's first coefficient
	U2       []float64            // length m; the second
	U1Err    []float64            // length m, one standard deviation; nil when the file has none
	U2Err    []float64            // length m; nil when the file has none
	Law      string               // name of the law as the file has it, for example "quadratic"; empty when it does not say
}

// minCover is the share of an interval that a table must cover for an average
// over it. A gap of up to half is bridged by what surrounds it, since
// coefficients change slowly with wavelength (common practice, no source).
const minCover = 0.5

// At returns the mean coefficients over wavelengths lo to hi, in um, lo < hi:
// each channel of the table counts in proportion to its overlap with the
// interval. The errors are averaged the same way, as errors of one model
// atmosphere are shared by all its wavelengths and do not average out; they are
// zero when the table has none. ok is false, and all numbers zero, when the
// table covers less than half of the interval or its columns differ in length.
func (t Table) At(lo, hi float64) (u1, u2, e1, e2 float64, ok bool) {
	m := len(t.Channels)
	fits := len(t.U1) == m && len(t.U2) == m && (t.U1Err == nil || len(t.U1Err) == m) && (t.U2Err == nil || len(t.U2Err) == m)
	if !fits || !(lo < hi) {
		return 0, 0, 0, 0, false
	}
	total, covered, reached := 0.0, 0.0, lo
	for j, c := range t.Channels {
		overlap := min(c.Hi, hi) - max(c.Lo, lo)
		if !(overlap > 0) {
			continue
		}
		total += overlap
		if end := min(c.Hi, hi); end > reached { // channels may overlap each other
			covered += end - max(c.Lo, reached)
			reached = end
		}
		u1 += overlap * t.U1[j]
		u2 += overlap * t.U2[j]
		if t.U1Err != nil {
			e1 += overlap * t.U1Err[j]
		}
		if t.U2Err != nil {
			e2 += overlap * t.U2Err[j]
		}
	}
	if !(covered >= minCover*(hi-lo)) {
		return 0, 0, 0, 0, false
	}
	return u1 / total, u2 / total, e1 / total, e2 / total, true
}

// newTable checks columns of equal length and puts the rows in order of
// wavelength. row names a row for messages.
func newTable(lo, hi, u1, u2, e1, e2 []float64, law string, row func(int) string) (Table, error) {
	m := len(lo)
	if m == 0 {
		return Table{}, fmt.Errorf("the table has no rows")
	}
	order := make([]lightcurve.Channel, m)
	for j := range order {
		if !(lo[j] > 0 && lo[j] < hi[j]) || !finite(hi[j]) {
			return Table{}, fmt.Errorf("%s: the channel from %g to %g um, expected 0 < WAVE_LO < WAVE_HI", row(j), lo[j], hi[j])
		}
		if !finite(u1[j]) || !finite(u2[j]) {
			return Table{}, fmt.Errorf("%s: the coefficients are %g and %g, expected finite numbers", row(j), u1[j], u2[j])
		}
		for _, e := range [][]float64{e1, e2} {
			if e != nil && !(e[j] >= 0 && finite(e[j])) {
				return Table{}, fmt.Errorf("%s: the error of a coefficient is %g, expected 0 or more", row(j), e[j])
			}
		}
		order[j] = lightcurve.Channel{Index: j, Lo: lo[j], Hi: hi[j]}
	}
	slices.SortStableFunc(order, func(a, b lightcurve.Channel) int {
		switch {
		case a.Lo < b.Lo:
			return -1
		case a.Lo > b.Lo:
			return 1
		}
		return 0
	})
	pick := func(values []float64) []float64 {
		if values == nil {
			return nil
		}
		out := make([]float64, m)
		for j, c := range order {
			out[j] = values[c.Index]
		}
		return out
	}
	return Table{Channels: order, U1: pick(u1), U2: pick(u2), U1Err: pick(e1), U2Err: pick(e2), Law: law}, nil
}

func finite(x float64) bool { return x-x == 0 }
