package fit

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// point summarises a channel's solution. white is the space of the white fit,
// which says where the orbit comes from.
func (s *solution) point(curve lightcurve.Curve, posterior Posterior, white *space) (spectrum.Point, error) {
	m := s.objective
	k := slices.Index(m.space.free, slotRadius)
	params, err := m.space.physical(&s.v)
	if err != nil {
		return spectrum.Point{}, err
	}
	r, rErr := params.RadiusRatio, math.Sqrt(s.cov[k][k])
	out := spectrum.Point{
		Channel: curve.Channel,
		Depth:   r * r, DepthErr: 2 * r * rErr,
		RadiusRatio: r, RadiusRatioErr: rErr,
		Limb: params.Law.Coefficients,
		Chi2: s.chi2, Dof: s.dof,
		Used: len(m.used), Masked: len(curve.Time) - len(m.used),
		Scatter: s.scatter(),
	}
	for a := range out.Limb {
		u := s.quantity("", "", "", func(v *[slots]float64) float64 { return m.space.coefficients(v)[a] })
		out.LimbErr = append(out.LimbErr, u.Err)
	}
	for len(out.Limb) < 2 { // of laws without
		out.Limb, out.LimbErr = append(out.Limb, 0), append(out.LimbErr, 0)
	}
	var flags []string
	if s.status != statusConverged {
		flags = append(flags, "the fit did not converge: "+s.status)
	}
	lo, hi := m.space.limits(slotRadius)
	if s.x[k] <= lo || s.x[k] >= hi {
		flags = append(flags, fmt.Sprintf("radius ratio at the end of its range, %.4g", r))
	}
	if !s.determined[k] {
		flags = append(flags, "radius ratio not determined by the data")
		out.Depth, out.DepthErr, out.RadiusRatio, out.RadiusRatioErr = math.NaN(), math.NaN(), math.NaN(), math.NaN()
	}
	if reduced := s.chi2 / float64(s.dof); reduced > doubtfulChi2 {
		flags = append(flags, fmt.Sprintf("reduced chi-square %.2f", reduced))
	}
	out.Flag = strings.Join(flags, "; ")
	out.ShiftGeometry, err = s.shifts(posterior, white)
	return out, err
}

// shifts returns the derivative of the depth in each parameter of the white
// posterior that the channel holds, 0 for the others: the linear response
// -(JᵀWJ)⁻¹JᵀW J_g of the fit, times 2 r. J_g is the change of the model over
// one standard deviation of the parameter to either side, as in [solution.slope].
func (s *solution) shifts(posterior Posterior, white *space) ([]float64, error) {
	m := s.objective
	k := slices.Index(m.space.free, slotRadius)
	out := make([]float64, len(posterior.Names))
	change := make([]float64, m.rows())
	for g, name := range posterior.Names {
		if isTrend(name) {
			continue
		}
		own := m.own.heldFromWhite(name)
		named, err := findName(name)
		if own < 0 && (err != nil || named.slot == slotSettling && m.space.isFree(slotSettling)) {
			continue
		}
		if own < 0 && named.slot > slotShape2 && named.slot != slotSettling &&
			!(named.slot == slotRadius && white.name[slotSize] == "duration") { // a channel has its own
			continue
		}
		at := func(value float64) ([]float64, error) { return s.at(white, named.slot, value) }
		if own >= 0 {
			at = func(value float64) ([]float64, error) { return s.ownAt(own, value) }
		}
		lo, hi := posterior.Value[g]-posterior.Err[g], posterior.Value[g]+posterior.Err[g]
		if !(lo < hi) || math.IsInf(hi-lo, 0) {
			continue
		}
		lo, hi = clipNamed(name, lo, hi)
		if err := s.modelChange(at, lo, hi, change); err != nil {
			return nil, err
		}
		response := 0.0
		for l := range m.size() {
			response -= s.cov[k][l] * floats.Dot(s.jac[l], change)
		}
		out[g] = 2 * s.x[k] * response
	}
	return out, nil
}

// clipNamed cuts an interval of a named parameter to where it means something.
func clipNamed(name string, lo, hi float64) (float64, float64) {
	switch name {
	case "inclination":
		return lo, min(hi, 90)
	case "impact", "eccentricity":
		return max(lo, 0), hi
	case "axisRatio":
		return max(lo, 1), hi
	case "settlingTime", "period", "stellarDensity", "duration", "radiusRatio":
		return max(lo, hi/10), hi
	}
	return lo, hi
}

// at is the model, relative to its level, with a parameter of the white fit, of
// the transit or the settling time, at another value.
func (s *solution) at(white *space, slot int, named float64) ([]float64, error) {
	m := s.objective
	v := white.value
	v[slot] = white.coordinate(slot, named)
	o, err := white.orbit(&v)
	if err != nil {
		return nil, err
	}
	flux, err := transit.Curve(m.times, m.space.params(&s.v, o))
	if err != nil {
		return nil, err
	}
	trend := slices.Clone(m.linear)
	if k := m.design.Settling; slot == slotSettling && k >= 0 {
		c := s.x[m.leading()+k]
		floats.AddScaled(trend, c, settleChange(m, math.Exp(v[slotSettling]), math.Exp(s.v[slotSettling])))
	}
	floats.Mul(trend, m.factor)
	floats.Mul(flux, trend)
	floats.Add(flux, m.added)
	return flux, nil
}

// ownAt is the same with a parameter of the recipe's function at another value.
func (s *solution) ownAt(k int, value float64) ([]float64, error) {
	m := s.objective
	flux, err := m.transit(&s.v)
	if err != nil {
		return nil, err
	}
	own, factor := slices.Clone(s.own), make([]float64, len(m.used))
	own[k] = m.own.coordinate(k, value)
	if !m.own.evaluate(own, factor) {
		return nil, m.own.fault()
	}
	floats.Mul(flux, factor)
	floats.Mul(flux, m.linear)
	floats.Add(flux, m.added)
	return flux, nil
}

// modelChange sets change to the difference of the residuals at two values of a
// held parameter, divided by their distance.
func (s *solution) modelChange(at func(named float64) ([]float64, error), lo, hi float64, change []float64) error {
	m := s.objective
	up, err := at(hi)
	if err != nil {
		return err
	}
	down, err := at(lo)
	if err != nil {
		return err
	}
	clear(change)
	for i := range up {
		change[i] = (up[i] - down[i]) / (hi - lo) * m.weight[i]
	}
	return nil
}

// settleChange is the settling column at one settling time less that at another.
func settleChange(m *objective, tau, from float64) []float64 {
	column := systematics.Settle(m.times, m.design.Start, tau)
	floats.Sub(column, systematics.Settle(m.times, m.design.Start, from))
	return column
}
