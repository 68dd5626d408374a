package noise

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// A Process is a model at the times of a series. It is made once and evaluated
// many times. Evaluations share working memory, so that a Process must not be used
// by several goroutines at a time; [New] is cheap.
type Process struct{ p *process }

type process struct {
	model      Model
	data       Data
	parameters []Parameter
	fast       bool
	square     []float64 // errors, squared
	work       filter    // of a fast process
	dense      *kernels  // of the others
}

var errNoProcess = errors.New("noise: this process was not made by New")

// New joins a model with data. It is an error when the model is invalid
// ([Model.Check]); when lengths differ, times decrease, or a number is not finite;
// when an input of the model is missing; or when a model that is not fast has more
// than 2000 samples. Later changes to the slices of d are not seen.
func New(m Model, d Data) (Process, error) {
	if err := m.Check(); err != nil {
		return Process{}, err
	}
	if err := d.check(m); err != nil {
		return Process{}, fmt.Errorf("noise: %w", err)
	}
	p := &process{model: m, data: d, parameters: m.parameters(d), fast: m.Fast()}
	p.data.Time = slices.Clone(d.Time)
	for _, e := range d.Err {
		p.square = append(p.square, e*e)
	}
	if !p.fast {
		p.dense = newKernels(m, d)
	}
	return Process{p}, nil
}

// Parameters lists what the process depends on, in the order of values,
// with the units of the inputs; see [Model.Parameters].
func (p Process) Parameters() []Parameter {
	if p.p == nil {
		return nil
	}
	return slices.Clone(p.p.parameters)
}

// A Gradient is the logarithm of a likelihood and its derivatives.
type Gradient struct {
	LogLikelihood float64   // natural logarithm, with the term -n/2 log 2π
	ByLog         []float64 // by the logarithm of each parameter; 0 for a jitter of 0
	ByResidual    []float64 // by each residual, minus the solved residuals -K⁻¹r
	ByVariance    []float64 // by the white variance of each sample, errors and jitter squared
}

// LogLikelihood returns the natural logarithm of the normal likelihood of
// residuals, one for each time, at the values of the parameters. It is an error
// when lengths differ, a value is not positive (a jitter may be 0), or numbers
// leave the range of arithmetic or make the covariance singular.
func (p Process) LogLikelihood(values, residual []float64) (float64, error) {
	if err := p.check(values, residual); err != nil {
		return math.NaN(), err
	}
	q := p.p
	if !q.fast {
		c, err := q.factorise(values)
		if err != nil {
			return math.NaN(), err
		}
		return c.logLikelihood(residual)
	}
	q.prepare(&q.work, values)
	return q.work.run(q.data.Time, residual, false)
}

// Gradient is [Process.LogLikelihood] with its derivatives, found by running the
// computation backwards (reverse mode; Foreman-Mackey 2018 does so for the
// factorisation of semi-separable matrices), at two to three times the cost.
func (p Process) Gradient(values, residual []float64) (Gradient, error) {
	var out Gradient
	err := p.GradientInto(&out, values, residual)
	return out, err
}

// GradientInto is [Process.Gradient] into the slices of out where these are long
// enough.
func (p Process) GradientInto(out *Gradient, values, residual []float64) error {
	if out == nil {
		return errors.New("noise gradient: the result is nil")
	}
	if err := p.check(values, residual); err != nil {
		return err
	}
	q := p.p
	out.ByLog = resized(out.ByLog, len(values))
	out.ByResidual = resized(out.ByResidual, len(residual))
	out.ByVariance = resized(out.ByVariance, len(residual))
	var err error
	if q.fast {
		q.prepare(&q.work, values)
		if out.LogLikelihood, err = q.work.run(q.data.Time, residual, true); err == nil {
			q.work.reverse(q.data.Time, out, out.ByLog[q.whiteCount():])
		}
	} else {
		err = q.denseGradient(out, values, residual)
	}
	if err != nil {
		return err
	}
	q.whiteGradient(out, values)
	for _, g := range out.ByLog {
		if !finite(g) {
			return errRange
		}
	}
	return nil
}

var errRange = errors.New("noise: the likelihood leaves the range of numbers; expected residuals and parameters of moderate size")

// whiteCount is the number of parameters of white noise.
func (q *process) whiteCount() (n int) {
	if q.model.Scale {
		n++
	}
	if q.model.Jitter {
		n++
	}
	return n
}

// whiteGradient fills the derivatives by scale and jitter from those by variance.
func (q *process) whiteGradient(out *Gradient, values []float64) {
	scaled, added := 0.0, 0.0
	for i, v := range out.ByVariance {
		scaled += v * q.square[i]
		added += v
	}
	k := 0
	if q.model.Scale {
		out.ByLog[k] = 2 * values[k] * values[k] * scaled
		k++
	}
	if q.model.Jitter {
		out.ByLog[k] = 2 * values[k] * values[k] * added
	}
}

// whiteVariance writes the variances of white noise to dst.
func (q *process) whiteVariance(dst, values []float64) {
	scale, jitter := 1.0, 0.0
	if q.model.Scale {
		scale, values = values[0]*values[0], values[1:]
	}
	if q.model.Jitter {
		jitter = values[0] * values[0]
	}
	for i, s := range q.square {
		dst[i] = scale*s + jitter
	}
}

func (p Process) check(values, residual []float64) error {
	if p.p == nil {
		return errNoProcess
	}
	if err := p.p.checkValues(values); err != nil {
		return err
	}
	return p.p.checkVector("residuals", residual)
}

func (q *process) checkValues(values []float64) error {
	if len(values) != len(q.parameters) {
		return fmt.Errorf("noise: %d values; expected one for each of %d parameters", len(values), len(q.parameters))
	}
	for k, v := range values {
		name := q.parameters[k].Name
		if v == 0 && q.model.Jitter && name == "jitter" {
			continue
		}
		if !(v > 0) || math.IsInf(v, 0) {
			return fmt.Errorf("noise: %s is %g; expected a positive number", name, v)
		}
	}
	return nil
}

func (q *process) checkVector(what string, x []float64) error {
	if len(x) != len(q.data.Time) {
		return fmt.Errorf("noise: %d %s; expected one for each of %d times", len(x), what, len(q.data.Time))
	}
	for i, v := range x {
		if !finite(v) {
			return fmt.Errorf("noise: number %d of the %s is %g; expected finite ones", i, what, v)
		}
	}
	return nil
}

// resized returns x with the length n, its elements 0.
func resized(x []float64, n int) []float64 {
	if cap(x) < n {
		return make([]float64, n)
	}
	x = x[:n]
	clear(x)
	return x
}
