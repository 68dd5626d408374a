package limbtable

import (
	"fmt"
	"slices"
	"strings"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
)

// A Table holds limb-darkening coefficients of m channels.
type Table struct {
	Channels []lightcurve.Channel // length m, in order of increasing wavelength
	U1       []float64            // length m; the law's first coefficient
	U2       []float64            // length m; the second, 0 of a law without
	U3, U4   []float64            // length m; nil for laws without
	U1Err    []float64            // length m, one standard deviation; nil when the file has none
	U2Err    []float64            // length m; nil when the file has none
	U3Err    []float64            // length m; nil when the file has none
	U4Err    []float64            // length m; nil when the file has none
	Law      string               // name of the law as the file has it, for example "quadratic"; empty when it does not say
}

// minCover is the share of an interval that a table must cover for an average
// over it. A gap of up to half is bridged by what surrounds it, since
// coefficients change slowly with wavelength (common practice, no source).
const minCover = 0.5

// At returns the mean of the first two coefficients over wavelengths lo to hi,
// in um, lo < hi: each channel of the table counts in proportion to its overlap
// with the interval. The errors are averaged the same way, as errors of one model
// atmosphere are shared by all its wavelengths and do not average out; they are
// zero when the table has none. ok is false, and all numbers zero, when the
// table covers less than half of the interval or its columns differ in length.
func (t Table) At(lo, hi float64) (u1, u2, e1, e2 float64, ok bool) {
	u, e, ok := t.mean(lo, hi)
	return u[0], u[1], e[0], e[1], ok
}

// LawAt returns the law with its mean coefficients over wavelengths lo to hi, in
// um, and their errors, as [Table.At] does for two of them. It is an error when
// the table does not say which law it is for, or one that package limb does not
// know, lacks a coefficient of it, or does not reach the interval, or when the
// law with these coefficients is not valid.
func (t Table) LawAt(lo, hi float64) (law limb.Law, errs []float64, err error) {
	name := strings.ToLower(t.Law)
	n, err := limb.Count(name)
	if err != nil {
		return limb.Law{}, nil, fmt.Errorf("limb-darkening table: %w", err)
	}
	columns := t.columns()
	for k := range n {
		if columns[k] == nil {
			return limb.Law{}, nil, fmt.Errorf("limb-darkening table: no coefficient u%d, which the %s law has", k+1, name)
		}
	}
	u, e, ok := t.mean(lo, hi)
	if !ok {
		return limb.Law{}, nil, fmt.Errorf("limb-darkening table: less than half of %.6g to %.6g um is covered", lo, hi)
	}
	law, err = limb.New(name, append([]float64(nil), u[:n]...))
	if err != nil {
		return limb.Law{}, nil, fmt.Errorf("limb-darkening table: %.6g to %.6g um: %w", lo, hi, err)
	}
	return law, append([]float64(nil), e[:n]...), nil
}

func (t Table) columns() [limb.Most][]float64 { return [limb.Most][]float64{t.U1, t.U2, t.U3, t.U4} }

func (t Table) errors() [limb.Most][]float64 {
	return [limb.Most][]float64{t.U1Err, t.U2Err, t.U3Err, t.U4Err}
}

// mean averages all coefficients and errors over an interval.
func (t Table) mean(lo, hi float64) (u, e [limb.Most]float64, ok bool) {
	m := len(t.Channels)
	columns, errors := t.columns(), t.errors()
	for k := range columns {
		for _, c := range [][]float64{columns[k], errors[k]} {
			if c != nil && len(c) != m {
				return u, e, false
			}
		}
	}
	if len(t.U1) != m || len(t.U2) != m || !(lo < hi) {
		return u, e, false
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
		for k := range u {
			if columns[k] != nil {
				u[k] += overlap * columns[k][j]
			}
			if errors[k] != nil {
				e[k] += overlap * errors[k][j]
			}
		}
	}
	if !(covered >= minCover*(hi-lo)) {
		return [limb.Most]float64{}, [limb.Most]float64{}, false
	}
	for k := range u {
		u[k] /= total
		e[k] /= total
	}
	return u, e, true
}

// newTable checks columns of equal length and puts the rows in order of
// wavelength. row names a row for messages.
func newTable(lo, hi []float64, u, e [limb.Most][]float64, law string, row func(int) string) (Table, error) {
	m := len(lo)
	if m == 0 {
		return Table{}, fmt.Errorf("the table has no rows")
	}
	order := make([]lightcurve.Channel, m)
	for j := range order {
		if !(lo[j] > 0 && lo[j] < hi[j]) || !finite(hi[j]) {
			return Table{}, fmt.Errorf("%s: the channel from %g to %g um, expected 0 < WAVE_LO < WAVE_HI", row(j), lo[j], hi[j])
		}
		for k := range u {
			if u[k] != nil && !finite(u[k][j]) {
				return Table{}, fmt.Errorf("%s: coefficient u%d is %g, expected a finite number", row(j), k+1, u[k][j])
			}
			if e[k] != nil && !(e[k][j] >= 0 && finite(e[k][j])) {
				return Table{}, fmt.Errorf("%s: the error of coefficient u%d is %g, expected 0 or more", row(j), k+1, e[k][j])
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
	return Table{
		Channels: order, U1: pick(u[0]), U2: pick(u[1]), U3: pick(u[2]), U4: pick(u[3]),
		U1Err: pick(e[0]), U2Err: pick(e[1]), U3Err: pick(e[2]), U4Err: pick(e[3]), Law: law,
	}, nil
}

func finite(x float64) bool { return x-x == 0 }
