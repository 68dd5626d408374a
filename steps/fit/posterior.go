package fit

import (
	"fmt"
	"math"
	"slices"

	"rimlight/steps/orbit"
	"rimlight/steps/transit"
)

// trendPrefix starts the names of the trend's coefficients in a posterior, as in
// "trend.constant". They are in units of the curve's median flux.
const trendPrefix = "trend."

// slope is the derivative of f in element k of the vector of the fit, taken
// as the secant over one standard deviation to either side, cut off at the
// limits: where f bends within the error, as the inclination does near 90 deg,
// it gives the spread of f rather than its slope at a point.
func (s *solution) slope(k int, f func(v *[slots]float64) float64) float64 {
	lo, hi := s.interval(k)
	at := func(x float64) float64 {
		v := s.v
		v[s.objective.space.free[k]] = x
		return f(&v)
	}
	return (at(hi) - at(lo)) / (hi - lo)
}

// interval is the range of one standard deviation about a free coordinate, cut
// off at its limits.
func (s *solution) interval(k int) (lo, hi float64) {
	x, sd := s.x[k], math.Sqrt(s.cov[k][k])
	a, b := s.objective.space.limits(s.objective.space.free[k])
	if sd == 0 || math.IsInf(sd, 0) {
		sd = 1e-6 * max(1, math.Abs(x))
	}
	return max(a, x-sd), min(b, x+sd)
}

// quantity propagates the covariance to a function of the coordinates.
func (s *solution) quantity(name, unit, about string, f func(v *[slots]float64) float64) Quantity {
	n := len(s.objective.space.free)
	gradient := make([]float64, n)
	for k := range gradient {
		gradient[k] = s.slope(k, f)
	}
	variance := 0.0
	for k := range n {
		for l := range n {
			variance += gradient[k] * s.cov[k][l] * gradient[l]
		}
	}
	return Quantity{Name: name, Value: f(&s.v), Err: math.Sqrt(max(0, variance)), Unit: unit, About: about}
}

// posterior writes the solution in named parameters and their units.
func (s *solution) posterior(model Model) Posterior {
	space := s.objective.space
	size := s.objective.size()
	all := size + len(space.noise)
	out := Posterior{
		Chi2: s.chi2, Dof: s.dof, Samples: len(s.objective.used),
		Iterations: s.steps, Status: s.status, Warnings: s.warnings,
		Model: model, Cov: columns(all, all),
	}
	factor := make([]float64, size) // d named / d coordinate
	for k := range size {
		var value float64
		var unit string
		value, factor[k] = s.value(k)
		if k >= len(space.free) && k < s.objective.leading() {
			own := s.objective.own
			unit = own.prior[own.free[k-len(space.free)]].Unit
		}
		if k < len(space.free) {
			slot := space.free[k]
			if slot == slotTilt || slot == slotLimb1 { // may bend within the error
				factor[k] = s.slope(k, func(v *[slots]float64) float64 {
					named, _ := space.named(slot, v[slot])
					return named
				})
			}
			unit = space.prior[slot].Unit
		}
		out.Names = append(out.Names, s.name(k))
		out.Value = append(out.Value, value)
		out.Units = append(out.Units, unit)
	}
	for k := range size {
		for l := range size {
			out.Cov[k][l] = factor[k] * s.cov[k][l] * factor[l]
		}
	}
	s.addNoise(&out)
	for k := range all {
		out.Err = append(out.Err, math.Sqrt(out.Cov[k][k]))
	}
	for slot := range slots {
		if space.isFree(slot) || !s.objective.uses(slot) || noisy(slot) && space.value[slot] == 0 || slot == slotCompanion && space.value[slot] == 0 {
			continue
		}
		value, _ := space.named(slot, space.value[slot])
		out.Held = append(out.Held, Prior{Name: space.name[slot], Kind: Fixed, A: value, Unit: unitOf(space.name[slot])})
	}
	if s.objective.own != nil {
		out.Held = append(out.Held, s.objective.own.held()...)
	}
	if !s.objective.alone {
		out.Derived = s.derived()
	}
	return out
}

// uses reports whether the model has a slot's parameter.
func (m *objective) uses(slot int) bool {
	switch {
	case slot == slotSettling:
		return m.design.Settling >= 0
	case noisy(slot):
		return true
	}
	return !m.alone && m.space.exists(slot)
}

// addNoise appends the parameters of the noise. What is near zero may bend within
// the error, so that slopes are secants.
func (s *solution) addNoise(out *Posterior) {
	space := s.objective.space
	first := len(out.Names)
	slope := make([]float64, len(space.noise))
	for a, slot := range space.noise {
		x, sd := space.value[slot], math.Sqrt(s.noiseCov[a][a])
		lo, hi := space.limits(slot)
		lo, hi = max(lo, x-sd), min(hi, x+sd)
		value, tangent := space.named(slot, x)
		if slope[a] = tangent; hi > lo {
			up, _ := space.named(slot, hi)
			down, _ := space.named(slot, lo)
			slope[a] = (up - down) / (hi - lo)
		}
		out.Names, out.Value, out.Units = append(out.Names, space.name[slot]), append(out.Value, value), append(out.Units, "")
	}
	for a := range slope {
		for b := range slope {
			out.Cov[first+a][first+b] = slope[a] * s.noiseCov[a][b] * slope[b]
		}
	}
}

func unitOf(name string) string {
	p, err := findName(name)
	if err != nil {
		return ""
	}
	return p.unit
}

// A derivation is a quantity that follows from the parameters of a transit.
type derivation struct {
	name, unit, about string
	f                 func(p transit.Params) float64
}

// derivations lists those of a white fit that are not parameters of it.
func (s *space) derivations() []derivation {
	out := []derivation{{"depth", "", "squared radius ratio", func(p transit.Params) float64 { return p.RadiusRatio * p.RadiusRatio }}}
	add := func(name, about string, f func(p transit.Params) float64) {
		if !slices.Contains(s.name[:], name) {
			out = append(out, derivation{name, unitOf(name), about, f})
		}
	}
	add("midTransit", "time of mid-transit, BJD_TDB", func(p transit.Params) float64 { return p.Orbit.MidTransit })
	add("axisRatio", "semi-major axis in stellar radii", func(p transit.Params) float64 { return p.Orbit.AxisRatio })
	add("inclination", "of the orbit", func(p transit.Params) float64 { return p.Orbit.Inclination / degree })
	add("impact", "impact parameter, in stellar radii", func(p transit.Params) float64 { return p.Orbit.ImpactParameter() })
	add("duration", "of the transit, first to fourth contact", func(p transit.Params) float64 {
		t14, _ := p.Orbit.Duration(p.RadiusRatio)
		return hoursPerDay * t14
	})
	add("stellarDensity", "of the star, from period and axis ratio, for a planet of negligible mass", func(p transit.Params) float64 {
		return orbit.StellarDensity(p.Orbit.Period, p.Orbit.AxisRatio)
	})
	add("eccentricity", "of the orbit", func(p transit.Params) float64 { return p.Orbit.Eccentricity })
	add("periastron", "argument of periastron", func(p transit.Params) float64 { return p.Orbit.Periastron / degree })
	for k := range s.limbs {
		add(fmt.Sprintf("u%d", k+1), [...]string{"first", "second", "third", "fourth"}[k]+" limb-darkening coefficient",
			func(p transit.Params) float64 { return p.Law.Coefficients[k] })
	}
	return out
}

// derived lists what follows from the parameters of a white fit.
func (s *solution) derived() []Quantity {
	var out []Quantity
	for _, d := range s.objective.space.derivations() {
		out = append(out, s.quantity(d.name, d.unit, d.about, func(v *[slots]float64) float64 {
			p, err := s.objective.space.physical(v)
			if err != nil {
				return math.NaN()
			}
			return d.f(p)
		}))
	}
	return out
}

// derivedAt are the values of [solution.derived] at other coordinates.
func (s *solution) derivedAt(v *[slots]float64) []float64 {
	p, err := s.objective.space.physical(v)
	var out []float64
	for _, d := range s.objective.space.derivations() {
		if err != nil {
			out = append(out, math.NaN())
		} else {
			out = append(out, d.f(p))
		}
	}
	return out
}
