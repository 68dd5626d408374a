package noise

import (
	"fmt"
	"math"

	"rimlight/steps/lightcurve"
)

const (
	mostSamples = 1 << 21
	mostDense   = 2000
)

// Data is where and how well a series was measured, whatever it was.
type Data struct {
	Time   []float64           // days, in increasing order; equal times are allowed
	Err    []float64           // standard deviations of white noise, in the unit of the residuals; length of Time
	Inputs []lightcurve.Series // further inputs of kernels, each of the length of Time
}

// FromCurve returns the data of the usable samples of a light curve, and their
// indices. Errors are divided by level, to match residuals in units of it; the
// inputs are the curve's further quantities. It is an error when slices differ in
// length or no sample is usable.
func FromCurve(curve lightcurve.Curve, level float64) (Data, []int, error) {
	n := len(curve.Time)
	if len(curve.Err) != n || len(curve.Mask) != n {
		return Data{}, nil, fmt.Errorf("noise of a curve: %d times, %d errors and %d flags; expected equal numbers", n, len(curve.Err), len(curve.Mask))
	}
	if !(level > 0) || math.IsInf(level, 0) {
		return Data{}, nil, fmt.Errorf("noise of a curve: level %g; expected a positive number", level)
	}
	var d Data
	var used []int
	for i, flag := range curve.Mask {
		if flag == 0 {
			used = append(used, i)
			d.Time, d.Err = append(d.Time, curve.Time[i]), append(d.Err, curve.Err[i]/level)
		}
	}
	if len(used) == 0 {
		return Data{}, nil, fmt.Errorf("noise of a curve: none of %d samples is usable", n)
	}
	for _, aux := range curve.Aux {
		if len(aux.Value) != n {
			return Data{}, nil, fmt.Errorf("noise of a curve: %d values of %.40q for %d times", len(aux.Value), aux.Name, n)
		}
		s := lightcurve.Series{Name: aux.Name, Unit: aux.Unit}
		for _, i := range used {
			s.Value = append(s.Value, aux.Value[i])
		}
		d.Inputs = append(d.Inputs, s)
	}
	return d, used, nil
}

// check is the error for data that a model cannot be applied to.
func (d Data) check(m Model) error {
	n := len(d.Time)
	if n == 0 || n > mostSamples {
		return fmt.Errorf("%d times; expected 1 to %d", n, mostSamples)
	}
	if len(d.Err) != n {
		return fmt.Errorf("%d errors for %d times; expected as many", len(d.Err), n)
	}
	for i, e := range d.Err {
		if !(e >= 0) || math.IsInf(e, 0) {
			return fmt.Errorf("the error of sample %d is %g; expected a number of at least 0", i, e)
		}
	}
	return d.checkInputs(m)
}

// checkInputs checks where a model is to be evaluated.
func (d Data) checkInputs(m Model) error {
	n := len(d.Time)
	for i, t := range d.Time {
		if !finite(t) {
			return fmt.Errorf("time %d is %g; expected a number", i, t)
		}
	}
	if m.Fast() {
		for i := 1; i < n; i++ {
			if d.Time[i] < d.Time[i-1] {
				return fmt.Errorf("time %d, %.10g, lies before the one ahead of it; expected increasing times", i, d.Time[i])
			}
		}
		return nil
	}
	if n > mostDense {
		return fmt.Errorf("%d samples; kernels other than exponential, matern32 and oscillator in time take at most %d", n, mostDense)
	}
	for _, t := range m.Terms {
		for _, f := range t.Factors {
			for _, name := range f.inputs() {
				if _, err := d.input(name); err != nil {
					return err
				}
			}
		}
	}
	return nil
}

// unit returns the unit of an input, empty when there is none.
func (d Data) unit(name string) string {
	if name == Time {
		return "d"
	}
	for _, s := range d.Inputs {
		if s.Name == name {
			return s.Unit
		}
	}
	return ""
}

// input returns the values of an input.
func (d Data) input(name string) ([]float64, error) {
	if name == Time {
		return d.Time, nil
	}
	for _, s := range d.Inputs {
		if s.Name != name {
			continue
		}
		if len(s.Value) != len(d.Time) {
			return nil, fmt.Errorf("%d values of %s for %d times; expected as many", len(s.Value), name, len(d.Time))
		}
		for i, x := range s.Value {
			if !finite(x) {
				return nil, fmt.Errorf("value %d of %s is %g; expected a number", i, name, x)
			}
		}
		return s.Value, nil
	}
	return nil, fmt.Errorf("the data have no input %s", name)
}

func finite(x float64) bool { return x-x == 0 }
