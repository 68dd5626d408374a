package fit

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"rimlight/steps/nearest"
	"rimlight/steps/vector"
)

const (
	// mostArguments bounds the parameters of a recipe's own function.
	mostArguments = 50
	// trialPoints is the number of points of the prior ranges that the search for a
	// start looks at: a few per parameter for the handful there usually are.
	trialPoints = 64
	// stepEffect is the change that a difference step makes in the model, as the
	// root of the change squared over the errors squared: a few hundredths of a
	// standard deviation of the parameter, over which the model is straight.
	stepEffect = 0.03
	firstStep  = 1e-4 // of the width of the prior's range
	mostStep   = 1e-2 // the same
	leastStep  = 1e-13
)

// A function is the recipe's own factor of a light curve: a Go function of
// parameters that the priors table names. Without one, f is nil and the factor
// is 1.
//
// Each parameter has a coordinate, its logarithm for a log-uniform prior and
// itself otherwise.
type function struct {
	f     func(p []float64) vector.V
	names []string
	prior []Prior   // of each parameter, Kind Fixed of those held
	value []float64 // coordinates: start of the free ones, values of the others
	white []bool    // parameters held at the white fit's value
	given []bool    // free parameters with the white fit's value as start
	free  []int     // indices of the free parameters, increasing
	step  []float64 // of differences, in the coordinate of each parameter

	length int   // integrations
	used   []int // indices of the usable samples
	err    error // a fault that no other parameters would mend
	reason error // why the function was not finite the last time
}

// newFunction takes the rows of the named parameters out of a priors table. With
// a white posterior, parameters without a row are held at its values, and free
// ones start from them.
func newFunction(names []string, f func(p []float64) vector.V, priors Priors, white *Posterior) (own *function, rest Priors, err error) {
	if f == nil {
		return nil, nil, errors.New("the function is nil; expected one that returns a column with a value for each integration")
	}
	if len(names) > mostArguments {
		return nil, nil, fmt.Errorf("the function has %d parameters; expected at most %d", len(names), mostArguments)
	}
	n := len(names)
	own = &function{f: f, names: slices.Clone(names), prior: make([]Prior, n), value: make([]float64, n),
		white: make([]bool, n), given: make([]bool, n), step: make([]float64, n)}
	for k, name := range names {
		if name == "" || strings.HasPrefix(name, trendPrefix) {
			return nil, nil, fmt.Errorf("parameter %d of the function is called %.40q; expected a name that does not start with %q", k+1, name, trendPrefix)
		}
		if slices.Contains(names[:k], name) {
			return nil, nil, fmt.Errorf("two parameters of the function are called %.40s", name)
		}
	}
	rows := make([]*Prior, n)
	for i, p := range priors {
		k := slices.Index(names, p.Name)
		if k < 0 {
			rest = append(rest, p)
			continue
		}
		if rows[k] != nil {
			return nil, nil, fmt.Errorf("parameter %.40s has two priors; give one", p.Name)
		}
		if err := p.check(); err != nil {
			return nil, nil, err
		}
		rows[k] = &priors[i]
	}
	for k, row := range rows {
		if err := own.set(k, row, white); err != nil {
			return nil, nil, err
		}
	}
	return own, rest, nil
}

// set gives a parameter its prior and its start or value.
func (o *function) set(k int, row *Prior, white *Posterior) error {
	known, found := Prior{}, false
	if white != nil {
		known, found = white.find(o.names[k])
	}
	switch {
	case row == nil && !found && white == nil:
		return fmt.Errorf("parameter %.40s of the function has no prior; add a row for it to the priors table", o.names[k])
	case row == nil && !found:
		return fmt.Errorf("parameter %.40s of the function has no prior, and the white posterior does not know it; add a row for it to the priors table", o.names[k])
	case row == nil:
		if known.A-known.A != 0 {
			return fmt.Errorf("parameter %.40s is %g in the white posterior; expected a finite number", o.names[k], known.A)
		}
		o.prior[k], o.value[k], o.white[k] = known, known.A, true
		return nil
	}
	o.prior[k] = *row
	if row.Kind == Fixed {
		o.value[k] = row.A
		return nil
	}
	o.free = append(o.free, k)
	lo, hi := o.limits(k)
	from, to := o.span(k)
	o.value[k] = from/2 + to/2
	o.step[k] = firstStep * (to - from)
	if !(o.step[k] > 0 && o.step[k] < math.Inf(1)) {
		return fmt.Errorf("the prior of %.40s leaves no room, or more than can be computed with", o.names[k])
	}
	if start := o.coordinate(k, known.A); found && start > lo && start < hi {
		o.value[k], o.given[k] = start, true
	}
	return nil
}

// find returns the parameter of that name as one held at its value.
func (p *Posterior) find(name string) (held Prior, ok bool) {
	for _, h := range p.Held {
		if h.Name == name {
			return h, true
		}
	}
	k := slices.Index(p.Names, name)
	if k < 0 || k >= len(p.Value) {
		return Prior{}, false
	}
	held = Prior{Name: name, Kind: Fixed, A: p.Value[k]}
	if k < len(p.Units) {
		held.Unit = p.Units[k]
	}
	return held, true
}

// bind tells the function for which samples of the curve it is wanted.
func (o *function) bind(length int, used []int) { o.length, o.used = length, used }

// logarithmic reports whether the coordinate of a parameter is its logarithm.
func (o *function) logarithmic(k int) bool { return o.prior[k].Kind == LogUniform }

func (o *function) coordinate(k int, named float64) float64 {
	if o.logarithmic(k) {
		return math.Log(named)
	}
	return named
}

// named turns a coordinate into the parameter, and gives its derivative.
func (o *function) named(k int, x float64) (value, slope float64) {
	if o.logarithmic(k) {
		value = math.Exp(x)
		return min(max(value, o.prior[k].A), o.prior[k].B), value // rounding may leave the range
	}
	return x, 1
}

// limits is the range of a free coordinate.
func (o *function) limits(k int) (lo, hi float64) {
	lo, hi = o.prior[k].limits()
	return o.coordinate(k, lo), o.coordinate(k, hi)
}

// span is the range of a free coordinate in which a start is looked for.
func (o *function) span(k int) (from, to float64) {
	from, to = o.limits(k)
	if p := o.prior[k]; p.normal() {
		near, far := max(from, p.A-2*p.B), min(to, p.A+2*p.B)
		if near < far {
			return near, far
		}
		if math.IsInf(to-from, 0) { // a mean outside limits that are open on one side
			return 0, 0
		}
	}
	return from, to
}

// with returns all coordinates, those of the free parameters being x.
func (o *function) with(x []float64) []float64 {
	all := slices.Clone(o.value)
	for i, k := range o.free {
		all[k] = x[i]
	}
	return all
}

// at returns the coordinates of the free parameters in value.
func (o *function) at() []float64 {
	x := make([]float64, len(o.free))
	for i, k := range o.free {
		x[i] = o.value[k]
	}
	return x
}

// whole calls the function and returns its values at every integration; nil
// when it has none.
func (o *function) whole(coordinates []float64) []float64 {
	x := o.f(o.parameters(coordinates))
	switch {
	case x.Fault != "":
		o.err = fmt.Errorf("the function of the recipe failed at %s: %.300s", o.told(coordinates), x.Fault)
		return nil
	case len(x.X) != o.length:
		o.err = fmt.Errorf("the function of the recipe gave %d values at %s; expected one for each of %d integrations", len(x.X), o.told(coordinates), o.length)
		return nil
	}
	return x.X
}

// parameters turns coordinates into what the function is called with.
func (o *function) parameters(coordinates []float64) []float64 {
	p := make([]float64, len(coordinates))
	for k, x := range coordinates {
		p[k], _ = o.named(k, x)
	}
	return p
}

// evaluate sets out to the function's values at the usable samples, and reports
// whether all are finite.
func (o *function) evaluate(coordinates, out []float64) bool {
	x := o.whole(coordinates)
	if x == nil && o.length > 0 {
		return false
	}
	for r, i := range o.used {
		if x[i]-x[i] != 0 {
			o.reason = fmt.Errorf("the function of the recipe is %g at integration %d for %s; expected a finite number", x[i], i, o.told(coordinates))
			return false
		}
		out[r] = x[i]
	}
	return true
}

// told lists parameters with their values, for messages.
func (o *function) told(coordinates []float64) string {
	p := o.parameters(coordinates)
	if len(p) == 0 {
		return "no parameters"
	}
	var parts []string
	for k, name := range o.names {
		if k == 6 {
			parts = append(parts, "…")
			break
		}
		parts = append(parts, fmt.Sprintf("%.40s = %.6g", name, p[k]))
	}
	return strings.Join(parts, ", ")
}

// derivative sets out to the derivative of the function in the coordinate of a
// free parameter, by central differences, or one-sided ones at the end of its
// range or of the function's domain. weight[i] times the factor's change is the change of residual i; the
// step is chosen for an effect of stepEffect. It reports whether all is finite.
func (o *function) derivative(k int, coordinates, weight, out []float64) bool {
	lo, hi := o.limits(k)
	from, to := o.span(k)
	least, most := leastStep*math.Abs(coordinates[k]), mostStep*(to-from)
	at, below := slices.Clone(coordinates), make([]float64, len(out))
	// evaluate, or move to the middle, where the function is finite.
	side := func(x float64, out []float64) float64 {
		at[k] = x
		if !o.evaluate(at, out) && x != coordinates[k] {
			at[k] = coordinates[k]
			o.evaluate(at, out)
		}
		return at[k]
	}
	for try := range 6 {
		h := max(o.step[k], least, math.SmallestNonzeroFloat64)
		up := side(min(coordinates[k]+h, hi), out)
		down := side(max(coordinates[k]-h, lo), below)
		if o.err != nil {
			return false
		}
		if !(up > down) { // finite at this point alone, as far as one can see
			o.step[k] = h / 100
			continue
		}
		change := 0.0
		for i := range out {
			out[i] -= below[i]
			change += out[i] * out[i] * weight[i] * weight[i]
			out[i] /= up - down
		}
		change = math.Sqrt(change) / 2
		wanted := h * min(stepEffect/change, 1e6) // a change of 0 gives the greatest step
		wanted = max(min(wanted, most), least)
		if wanted < 4*h && wanted > h/4 || try == 5 {
			return true
		}
		o.step[k] = wanted
	}
	o.err = o.reason
	return false
}

// improve looks for a start at points spread over the priors' ranges, unless the
// white fit gave it: the coordinates with the least cost, which is NaN where the
// function has no values. The points are multiples of roots of primes, modulo 1
// (Weyl 1916), which fill the ranges evenly whatever their number.
func (o *function) improve(cost func() float64) {
	var search []int
	for _, k := range o.free {
		if !o.given[k] {
			search = append(search, k)
		}
	}
	start := slices.Clone(o.value)
	least := cost()
	if len(search) == 0 && least-least == 0 {
		return
	}
	if len(search) == 0 {
		search = o.free
	}
	best := start
	for point := 1; point <= trialPoints && o.err == nil && len(search) > 0; point++ {
		o.value = slices.Clone(start)
		for i, k := range search {
			_, share := math.Modf(0.5 + float64(point)*math.Sqrt(float64(primes[i])))
			from, to := o.span(k)
			o.value[k] = from + share*(to-from)
		}
		if c := cost(); c < least || c-c == 0 && least-least != 0 {
			best, least = o.value, c
		}
	}
	o.value = best
}

var primes = [mostArguments]int{2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37, 41, 43, 47, 53, 59, 61, 67, 71, 73, 79, 83, 89, 97,
	101, 103, 107, 109, 113, 127, 131, 137, 139, 149, 151, 157, 163, 167, 173, 179, 181, 191, 193, 197, 199, 211, 223, 227, 229}

// fault is what keeps the function from being fitted, nil when there is nothing.
func (o *function) fault() error {
	if o.err != nil {
		return o.err
	}
	return o.reason
}

// strange is the error for a row of a priors table that is neither a parameter
// of the fit nor of the function.
func (o *function) strange(name string, known []string) error {
	known = append(slices.Clone(known), o.names...)
	return fmt.Errorf("unknown parameter %.40q%s; expected one of %.300s", name, nearest.Hint(name, known), strings.Join(known, ", "))
}

// normal lists the free parameters with Gaussian priors.
func (o *function) normal() []int {
	var out []int
	for _, k := range o.free {
		if o.prior[k].normal() {
			out = append(out, k)
		}
	}
	return out
}

// held lists the parameters that are not free, at their values.
func (o *function) held() Priors {
	var out Priors
	for k, p := range o.prior {
		if !slices.Contains(o.free, k) {
			out = append(out, Prior{Name: o.names[k], Kind: Fixed, A: o.value[k], Unit: p.Unit})
		}
	}
	return out
}

// heldFromWhite returns the index of the parameter of that name if it is held at
// the white fit's value, -1 otherwise.
func (o *function) heldFromWhite(name string) int {
	if o == nil {
		return -1
	}
	if k := slices.Index(o.names, name); k >= 0 && o.white[k] {
		return k
	}
	return -1
}

// midTransit is the parameter of that name, NaN when there is none.
func (o *function) midTransit(coordinates []float64) float64 {
	k := slices.Index(o.names, "midTransit")
	if k < 0 {
		return math.NaN()
	}
	value, _ := o.named(k, coordinates[k])
	return value
}
