package systematics

import (
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/lightcurve"
)

// Limits on how far one term may be a combination of the others.
const (
	// collinear is the relative length of what is left of a column after the
	// columns before it are projected out, below which it counts as their
	// combination: its coefficient would be rounding error.
	collinear = 1e-6
	// alike is the correlation of two columns above which a warning is given: the
	// errors of their coefficients are then at least five times those without
	// the other.
	alike = 0.98
)

// A Design is the matrix of a trend's terms for one light curve of n
// integrations.
type Design struct {
	Names    []string    // one per term, as in "constant", "time", "time^2", "settling", "X", "added.X"
	Columns  [][]float64 // one per term, each of length n; NaN where a regressor has no finite value
	Settling int         // which term is the settling one; -1 without
	Added    int         // the first of the terms that are added, which come last; the number of terms without
	Start    float64     // time from which settling counts, BJD_TDB, days
	Warnings []string    // pairs of terms that are hard to tell apart
}

// Design builds the columns of the trend for a curve: a constant 1, powers of
// time scaled to run from -1 to 1 over the curve, exp(-(t-t0)/SettlingTime) with
// t0 the first time, and each regressor less its mean, divided by its standard
// deviation, both over the usable samples. Added terms are made like regressors.
//
// Errors: settings out of range; a regressor that the curve does not have (the
// message lists those it has), that is constant, or that is a linear combination
// of the terms before it.
func (t Trend) Design(curve lightcurve.Curve) (Design, error) {
	if err := t.check(); err != nil {
		return Design{}, err
	}
	n := len(curve.Time)
	if n == 0 || len(curve.Mask) != n {
		return Design{}, fmt.Errorf("systematics: %d times and %d flags; expected one flag for each of at least one time", n, len(curve.Mask))
	}
	d := Design{Settling: -1, Start: curve.Time[0]}
	add := func(name string, column []float64) {
		d.Names = append(d.Names, name)
		d.Columns = append(d.Columns, column)
	}
	one := make([]float64, n)
	for i := range one {
		one[i] = 1
	}
	add("constant", one)
	if t.Polynomial > 0 {
		x := scaledTime(curve.Time)
		power := one
		for k := 1; k <= t.Polynomial; k++ {
			power = floats.MulTo(make([]float64, n), power, x)
			name := "time"
			if k > 1 {
				name = fmt.Sprintf("time^%d", k)
			}
			add(name, power)
		}
	}
	if t.Settling {
		d.Settling = len(d.Columns)
		add("settling", nil)
		d.Columns[d.Settling] = Settle(curve.Time, d.Start, t.SettlingTime)
	}
	usable := usableSamples(curve.Mask)
	regress := func(prefix string, names []string) error {
		for _, name := range names {
			value, err := aux(curve, name)
			if err != nil {
				return err
			}
			column, err := standardise(value, usable)
			if err != nil {
				return fmt.Errorf("systematics: regressor %.40s %w", name, err)
			}
			add(prefix+name, column)
		}
		return nil
	}
	if err := regress("", t.Regressors); err != nil {
		return Design{}, err
	}
	d.Added = len(d.Columns)
	if err := regress("added.", t.Added); err != nil {
		return Design{}, err
	}
	multiplied, added := d.part(0, d.Added), d.part(d.Added, len(d.Columns))
	for _, part := range []*Design{&multiplied, &added} {
		if err := part.compare(usable); err != nil {
			return Design{}, err
		}
		d.Warnings = append(d.Warnings, part.Warnings...)
	}
	return d, nil
}

// part is the design of the terms from one to before another.
func (d *Design) part(from, to int) Design {
	return Design{Names: d.Names[from:to], Columns: d.Columns[from:to]}
}

// Settle returns exp(-(t-start)/tau) for each time; tau > 0 and times in days.
// Before start it is held at 1.
func Settle(times []float64, start, tau float64) []float64 {
	out := make([]float64, len(times))
	for i, t := range times {
		out[i] = math.Exp(-max(0, t-start) / tau)
	}
	return out
}

// SettleDerivative returns the derivative of [Settle] in tau, per day.
func SettleDerivative(times []float64, start, tau float64) []float64 {
	out := make([]float64, len(times))
	for i, t := range times {
		x := max(0, t-start) / tau
		out[i] = math.Exp(-x) * x / tau
	}
	return out
}

// scaledTime maps times to [-1, 1].
func scaledTime(times []float64) []float64 {
	lo, hi := floats.Min(times), floats.Max(times)
	x := make([]float64, len(times))
	if hi == lo {
		return x
	}
	for i, t := range times {
		x[i] = 2*(t-lo)/(hi-lo) - 1
	}
	return x
}

func usableSamples(mask []lightcurve.Flag) []int {
	var usable []int
	for i, flag := range mask {
		if flag == 0 {
			usable = append(usable, i)
		}
	}
	return usable
}

// standardise returns (value - mean)/sd, mean and standard deviation over the
// finite values of the usable samples.
func standardise(value []float64, usable []int) ([]float64, error) {
	var sum, largest float64
	count := 0
	for _, i := range usable {
		if v := value[i]; v-v == 0 {
			sum += v
			largest = max(largest, math.Abs(v))
			count++
		}
	}
	mean := sum / float64(count)
	sumSq := 0.0
	for _, i := range usable {
		if v := value[i]; v-v == 0 {
			sumSq += (v - mean) * (v - mean)
		}
	}
	sd := math.Sqrt(sumSq / float64(count))
	if count < 2 {
		return nil, fmt.Errorf("has %d finite values at usable samples; expected one each, or take it off the list", count)
	}
	if !(sd > 1e-12*largest) {
		return nil, fmt.Errorf("is constant, %g, over the usable samples; take it off the list", mean)
	}
	out := make([]float64, len(value))
	for i, v := range value {
		out[i] = (v - mean) / sd
		if v-v != 0 {
			out[i] = math.NaN()
		}
	}
	return out, nil
}

// compare looks for terms that are combinations of others, over the usable
// samples where every term is finite.
func (d *Design) compare(usable []int) error {
	rows := make([]int, 0, len(usable))
	for _, i := range usable {
		if d.finiteAt(i) {
			rows = append(rows, i)
		}
	}
	if len(rows) == 0 {
		return nil // nothing can be fitted; the fit says so
	}
	var ortho [][]float64 // Gram-Schmidt
	var unit [][]float64  // columns less their mean, of unit length
	for k, column := range d.Columns {
		v := make([]float64, len(rows))
		for r, i := range rows {
			v[r] = column[i]
		}
		length := floats.Norm(v, 2)
		u := append([]float64(nil), v...)
		for range 2 { // twice is enough
			for _, q := range ortho {
				floats.AddScaled(v, -floats.Dot(q, v), q)
			}
		}
		left := floats.Norm(v, 2)
		if !(left > collinear*length) {
			return fmt.Errorf("systematics: over the %d usable samples the term %.40s is a combination of the terms before it (%.200s); take one of them out",
				len(rows), d.Names[k], strings.Join(d.Names[:k], ", "))
		}
		floats.Scale(1/left, v)
		ortho = append(ortho, v)

		floats.AddConst(-floats.Sum(u)/float64(len(u)), u)
		if norm := floats.Norm(u, 2); norm > 0 {
			floats.Scale(1/norm, u)
		}
		for j := range k {
			if r := floats.Dot(unit[j], u); math.Abs(r) > alike {
				d.Warnings = append(d.Warnings, fmt.Sprintf("systematics terms %s and %s have correlation %.4f: their coefficients are hard to tell apart", d.Names[j], d.Names[k], r))
			}
		}
		unit = append(unit, u)
	}
	return nil
}

// finiteAt reports whether every term has a finite value at integration i.
func (d *Design) finiteAt(i int) bool {
	for _, column := range d.Columns {
		if v := column[i]; v-v != 0 {
			return false
		}
	}
	return true
}
