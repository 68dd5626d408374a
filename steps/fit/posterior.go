package fit

import (
	"math"
	"strings"

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
		v[s.model.space.free[k]] = x
		return f(&v)
	}
	return (at(hi) - at(lo)) / (hi - lo)
}

// interval is the range of one standard deviation about a free coordinate, cut
// off at its limits.
func (s *solution) interval(k int) (lo, hi float64) {
	x, sd := s.x[k], math.Sqrt(s.cov[k][k])
	a, b := s.model.space.limits(s.model.space.free[k])
	if sd == 0 || math.IsInf(sd, 0) {
		sd = 1e-6 * max(1, math.Abs(x))
	}
	return max(a, x-sd), min(b, x+sd)
}

// quantity propagates the covariance to a function of the coordinates.
func (s *solution) quantity(name, unit, about string, f func(v *[slots]float64) float64) Quantity {
	n := len(s.model.space.free)
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
func (s *solution) posterior(setup Setup) Posterior {
	trend := setup.Trend
	space := s.model.space
	size := s.model.size()
	out := Posterior{
		Chi2: s.chi2, Dof: s.dof, Samples: len(s.model.used),
		Iterations: s.steps, Status: s.status, Warnings: s.warnings,
		Model: s.model.formula(setup), Cov: columns(size, size),
	}
	factor := make([]float64, size) // d named / d coordinate
	for k := range size {
		var value float64
		var unit string
		value, factor[k] = s.value(k)
		if k >= len(space.free) && k < s.model.leading() {
			own := s.model.own
			unit = own.prior[own.free[k-len(space.free)]].Unit
		}
		if k < len(space.free) {
			slot := space.free[k]
			if slot == slotShape || slot == slotLimb1 { // may bend within the error
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
		out.Err = append(out.Err, math.Sqrt(out.Cov[k][k]))
	}
	for slot := range slots {
		if space.isFree(slot) || slot == slotSettling && !trend.Settling || slot != slotSettling && s.model.alone {
			continue
		}
		value, _ := space.named(slot, space.value[slot])
		out.Held = append(out.Held, Prior{Name: space.name[slot], Kind: Fixed, A: value, Unit: unitOf(space.name[slot])})
	}
	if s.model.own != nil {
		out.Held = append(out.Held, s.model.own.held()...)
	}
	if !s.model.alone {
		out.Derived = s.derived()
	}
	return out
}

// formula is the model as an equation in words and symbols.
func (m *model) formula(setup Setup) string {
	const transit = "transit(t) is that of a dark sphere on a Keplerian orbit before a star with "
	trend := setup.Trend.Formula()
	if m.own == nil {
		return "flux = transit(t) × (" + trend + "); " + transit + setup.LimbLaw + " limb darkening, 1 out of transit"
	}
	own := "f(t; " + strings.Join(m.own.names, ", ") + ")"
	if m.alone {
		return "flux = " + own + " × (" + trend + "); f is a function of the recipe"
	}
	return "flux = transit(t) × " + own + " × (" + trend + "); " + transit + setup.LimbLaw +
		" limb darkening, 1 out of transit; f is a function of the recipe"
}

func unitOf(name string) string {
	p, err := findName(name)
	if err != nil {
		return ""
	}
	return p.unit
}

// derived lists what follows from the parameters of a white fit.
func (s *solution) derived() []Quantity {
	space := s.model.space
	from := func(f func(p transit.Params) float64) func(v *[slots]float64) float64 {
		return func(v *[slots]float64) float64 { return f(space.physical(v)) }
	}
	out := []Quantity{
		s.quantity("depth", "", "squared radius ratio", from(func(p transit.Params) float64 { return p.RadiusRatio * p.RadiusRatio })),
	}
	if space.name[slotMid] != "midTransit" {
		out = append(out, s.quantity("midTransit", "d", "time of mid-transit, BJD_TDB", from(func(p transit.Params) float64 { return p.Orbit.MidTransit })))
	}
	if space.name[slotShape] == "impact" {
		out = append(out, s.quantity("inclination", "deg", "of the orbit", from(func(p transit.Params) float64 { return p.Orbit.Inclination / degree })))
	} else {
		out = append(out, s.quantity("impact", "", "impact parameter, in stellar radii", from(func(p transit.Params) float64 { return p.Orbit.ImpactParameter() })))
	}
	out = append(out,
		s.quantity("duration", "h", "of the transit, first to fourth contact", from(func(p transit.Params) float64 {
			t14, _ := p.Orbit.Duration(p.RadiusRatio)
			return 24 * t14
		})),
		s.quantity("stellarDensity", "kg.m-3", "of the star, from period and axis ratio, for a planet of negligible mass", from(func(p transit.Params) float64 {
			return orbit.StellarDensity(p.Orbit.Period, p.Orbit.AxisRatio)
		})))
	if space.name[slotLimb1] == "q1" {
		out = append(out,
			s.quantity("u1", "", "first limb-darkening coefficient", from(func(p transit.Params) float64 { return p.Law.Coefficients[0] })),
			s.quantity("u2", "", "second limb-darkening coefficient", from(func(p transit.Params) float64 { return p.Law.Coefficients[1] })))
	}
	return out
}
