package fit

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/sample"
	"rimlight/steps/systematics"
)

// A target is the posterior density of a model, for samplers. The coefficients of
// the trend are integrated over: they enter linearly, so that the integral has a
// closed form. What is left are the free parameters, in the coordinates in which
// their priors are given: the named values, mid-transit times as offsets, and
// logarithms of those with a log-uniform prior.
type target struct {
	m        *objective
	at       []dimension
	res      []float64
	byFlux   []float64   // derivative of the density by the transit's flux
	byShape  []float64   // scratch, what the determinant of the terms adds to it
	share    [][]float64 // terms times the inverse of their products with one another
	change   []float64   // scratch
	constant float64     // what makes the likelihood one of fluxes in units of the median flux
}

// A dimension is a free parameter of a target: a slot, or else a parameter of the
// recipe's function.
type dimension struct {
	slot   int // -1 for the function's
	own    int
	name   string
	unit   string
	prior  Prior
	log    bool // its coordinate is its logarithm
	lo, hi float64
}

func newTarget(m *objective) *target {
	t := &target{m: m, res: make([]float64, m.rows())}
	scratch := columns(3, len(m.used))
	t.byFlux, t.byShape, t.change = scratch[0], scratch[1], scratch[2]
	t.share = columns(len(m.columns), m.rows())
	s := m.space
	add := func(slot int) {
		p := s.prior[slot]
		d := dimension{slot: slot, own: -1, name: s.name[slot], unit: p.Unit, prior: p, log: p.Kind == LogUniform}
		d.lo, d.hi = s.extent(slot, d.log)
		t.at = append(t.at, d)
	}
	for _, slot := range s.free {
		add(slot)
	}
	if o := m.own; o != nil {
		for _, k := range o.free {
			d := dimension{slot: -1, own: k, name: o.names[k], unit: o.prior[k].Unit, prior: o.prior[k], log: o.logarithmic(k)}
			d.lo, d.hi = o.limits(k)
			t.at = append(t.at, d)
		}
	}
	for _, slot := range s.noise {
		add(slot)
	}
	const halfLog2Pi = 0.91893853320467274178
	t.constant = halfLog2Pi * float64(len(m.columns)-len(m.used)-len(m.trended))
	for _, p := range s.trend {
		t.constant -= math.Log(p.B)
	}
	return t
}

// extent is what a slot's coordinate of a target lies between.
func (s *space) extent(slot int, log bool) (lo, hi float64) {
	a, b := s.prior[slot].limits()
	if s.name[slot] == "inclination" {
		return max(a, 0), min(b, max(90, min(b, 180)))
	}
	lo, hi = s.allowed(slot)
	if slot == slotMid {
		a, b = s.coordinate(slot, a), s.coordinate(slot, b)
	} else {
		if !math.IsInf(lo, 0) {
			lo, _ = s.named(slot, lo)
		}
		if !math.IsInf(hi, 0) {
			hi, _ = s.named(slot, hi)
		}
		if s.name[slot] == "impact" || s.name[slot] == "jitter" {
			lo = 0
		}
	}
	lo, hi = max(lo, a), min(hi, b)
	if log {
		return math.Log(lo), math.Log(hi)
	}
	return lo, hi
}

// parameters are the target's, for a sampler.
func (t *target) parameters() []sample.Parameter {
	var out []sample.Parameter
	for _, d := range t.at {
		p := sample.Parameter{Name: d.name, Unit: d.unit, Lo: d.lo, Hi: d.hi}
		if math.IsInf(d.lo, -1) && math.IsInf(d.hi, 1) {
			p.Lo, p.Hi = 0, 0
		}
		out = append(out, p)
	}
	return out
}

// value is the named value at a target's coordinate.
func (t *target) value(k int, y float64) float64 {
	d := t.at[k]
	if d.log {
		return min(max(math.Exp(y), d.prior.A), d.prior.B) // rounding may leave the range
	}
	if d.slot == slotMid {
		named, _ := t.m.space.named(d.slot, y)
		return named
	}
	if d.slot == slotTilt && d.name == "inclination" && y > 90 {
		return 180 - y
	}
	return y
}

// coordinate is a slot's coordinate at that of the target, and its derivative.
func (t *target) coordinate(k int, y float64) (x, slope float64) {
	d, s := t.at[k], t.m.space
	if d.slot == slotMid {
		return y, 1
	}
	named, byY := y, 1.0
	if d.log {
		named = math.Exp(y)
		byY = named
	}
	x = s.coordinate(d.slot, named)
	if d.name == "inclination" {
		return x, -math.Sin(2*named*degree) * degree
	}
	_, byX := s.named(d.slot, x)
	return x, byY / byX
}

// from is the target's coordinate at the solution.
func (t *target) from(s *solution) []float64 {
	out := make([]float64, len(t.at))
	leading := t.m.leading()
	for k, d := range t.at {
		switch {
		case d.slot < 0:
			out[k] = s.own[d.own]
			continue
		case d.slot == slotMid:
			out[k] = s.v[d.slot]
			continue
		case k < leading:
			out[k], _ = t.m.space.named(d.slot, s.x[k])
		default:
			out[k], _ = t.m.space.named(d.slot, t.m.space.value[d.slot])
		}
		if d.log {
			out[k] = math.Log(out[k])
		}
	}
	return out
}

// place evaluates the model at coordinates y, with its best coefficients. ok is
// false where there is no density.
func (t *target) place(y []float64, gradient bool) (v *[slots]float64, own, coefficients []float64, ok bool) {
	m := t.m
	m.coords = m.space.value
	if m.own != nil {
		own = append([]float64(nil), m.own.value...)
	}
	for k, d := range t.at {
		if d.slot < 0 {
			own[d.own] = y[k]
		} else {
			m.coords[d.slot], _ = t.coordinate(k, y[k])
		}
	}
	v = &m.coords
	if len(m.space.noise) > 0 {
		m.setNoise(m.space.noiseOf(v))
	}
	if !m.evaluate(v, own, gradient) {
		return v, own, nil, false
	}
	coefficients, ok = m.coefficientsNow()
	if ok {
		m.combine(coefficients)
		m.fillResiduals(v, own, coefficients, t.res)
	}
	return v, own, coefficients, ok
}

// likelihood is the logarithm of the likelihood at coordinates y, the trend's
// coefficients integrated over with their priors: normal ones, or 1.
func (t *target) likelihood(y []float64) float64 {
	if _, _, _, ok := t.place(y, false); !ok {
		return math.Inf(-1)
	}
	return t.logLikelihood()
}

// logLikelihood is likelihood where the model was placed.
func (t *target) logLikelihood() float64 {
	sum := t.constant - t.m.terms.logDeterminant()/2
	for _, w := range t.m.weight {
		sum += math.Log(w)
	}
	for i, r := range t.res {
		if i < len(t.m.used) || i >= t.m.firstTrended() {
			sum -= r * r / 2
		}
	}
	return sum
}

// prior is the logarithm of the prior density at y, up to a constant, and its
// derivative is added to the gradient if that is not nil.
func (t *target) prior(y, gradient []float64) float64 {
	sum := 0.0
	for k, d := range t.at {
		if !d.prior.normal() {
			continue
		}
		mean := d.prior.A
		if d.slot == slotMid {
			mean = t.m.space.coordinate(slotMid, mean)
		}
		z := (y[k] - mean) / d.prior.B
		sum -= z * z / 2
		if gradient != nil {
			gradient[k] -= z / d.prior.B
		}
	}
	return sum
}

// density is the logarithm of the posterior density at y, and its derivatives
// unless gradient is nil.
func (t *target) density(y, gradient []float64) float64 {
	v, own, coefficients, ok := t.place(y, gradient != nil)
	if !ok {
		return math.Inf(-1)
	}
	sum := t.logLikelihood()
	if gradient != nil {
		clear(gradient)
		if !t.slope(y, v, own, coefficients, gradient) {
			return math.Inf(-1)
		}
	}
	return sum + t.prior(y, gradient)
}

// slope adds the derivatives of the likelihood where the model was placed. That
// of the determinant of AᵀA, A the terms over the errors, is 2 tr((AᵀA)⁻¹Aᵀ dA).
func (t *target) slope(y []float64, v *[slots]float64, own, coefficients, gradient []float64) bool {
	m := t.m
	samples := len(m.used)
	t.setShare()
	clear(t.byShape)
	for k, column := range m.columns[:m.design.Added] {
		for i, w := range m.weight {
			t.byShape[i] -= t.share[k][i] * w * column[i]
		}
	}
	for i, w := range m.weight {
		t.byFlux[i] = -t.res[i]*w*m.trend[i] + t.byShape[i]*m.factor[i]
	}
	var byArgument [arguments]float64
	for a, g := range m.gradient {
		byArgument[a] = floats.Dot(t.byFlux, g)
	}
	for k, d := range t.at {
		switch {
		case d.slot < 0:
			weight := make([]float64, samples)
			for i, w := range m.weight {
				weight[i] = m.dip[i] * m.linear[i] * w
			}
			if !m.own.derivative(d.own, own, weight, t.change) {
				return false
			}
			for i, w := range weight {
				gradient[k] += t.change[i] * (-t.res[i]*w + t.byShape[i]*m.dip[i])
			}
			continue
		case noisy(d.slot):
			gradient[k] += t.noiseSlope(d.slot, v)
		case d.slot == slotSettling:
			gradient[k] += t.settlingSlope(v, coefficients)
		default:
			for a, w := range m.chain[d.slot] {
				if w != 0 {
					gradient[k] += w * byArgument[a]
				}
			}
		}
		_, slope := t.coordinate(k, y[k])
		gradient[k] *= slope
	}
	return true
}

// setShare makes A (AᵀA)⁻¹ from the projection.
func (t *target) setShare() {
	p := t.m.terms
	for k := range t.share {
		// Column k is the basis times row k of the inverse of the triangle.
		unit := make([]float64, len(t.share))
		unit[k] = 1
		clear(t.share[k])
		row := solveTransposed(p.r, unit)
		for j, c := range row {
			if c != 0 {
				floats.AddScaled(t.share[k], c, p.basis[j])
			}
		}
	}
}

// solveTransposed returns x with xᵀ r = bᵀ, r the upper triangle of the terms: its
// result is row k of r⁻¹ when b is the unit vector k.
func solveTransposed(r [][]float64, b []float64) []float64 {
	x := append([]float64(nil), b...)
	for j := range x {
		for l := range j {
			x[j] -= x[l] * r[l][j]
		}
		x[j] /= r[j][j]
	}
	return x
}

// settlingSlope is the derivative by the logarithm of the settling time.
func (t *target) settlingSlope(v *[slots]float64, coefficients []float64) float64 {
	m := t.m
	term := m.design.Settling
	tau := math.Exp(v[slotSettling])
	sum := 0.0
	for i, d := range systematics.SettleDerivative(m.times, m.design.Start, tau) {
		sum -= (t.res[i]*coefficients[term] + t.share[term][i]) * m.weight[i] * m.dip[i] * m.factor[i] * d
	}
	return sum * tau
}

// noiseSlope is the derivative by the coordinate of a parameter of the noise.
func (t *target) noiseSlope(slot int, v *[slots]float64) float64 {
	m := t.m
	scale, _ := m.space.noiseOf(v)
	sum := 0.0
	for i, w := range m.weight {
		by := w * w // of the logarithm of the variance
		if slot == slotErrorScale {
			by *= 2 * scale * scale * m.sigma[i] * m.sigma[i]
		}
		leverage := 0.0
		for _, q := range m.terms.basis {
			leverage += q[i] * q[i]
		}
		sum += by * (t.res[i]*t.res[i] - 1 + leverage) / 2
	}
	return sum
}

// unit turns numbers between 0 and 1 into coordinates: quantiles of the priors.
func (t *target) unit(u []float64) []float64 {
	y := make([]float64, len(u))
	for k, d := range t.at {
		switch {
		case d.prior.normal():
			mean := d.prior.A
			if d.slot == slotMid {
				mean = t.m.space.coordinate(slotMid, mean)
			}
			y[k] = sample.TruncatedNormalQuantile(u[k], mean, d.prior.B, d.lo, d.hi)
		default:
			y[k] = sample.UniformQuantile(u[k], d.lo, d.hi)
		}
	}
	return y
}
