package fit

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/systematics"
)

// Tuning of the search for a start.
const (
	// scanStep is the step of the scan in mid-transit time, in transit durations:
	// well inside the range from which the optimiser finds the minimum.
	scanStep = 1. / 16
	mostScan = 800  // steps, a bound on the work
	scanHalf = 0.05 // d, half width of the scan where the prior sets no limits
)

// search finds start values: those of the recipe's function, where there is one,
// in turns with the transit's.
func (m *objective) search() error {
	if m.own == nil {
		return m.scan()
	}
	for range 2 {
		m.own.improve(func() float64 {
			_, sum, err := m.solveTrend(&m.space.value)
			if err != nil {
				return math.NaN()
			}
			return sum
		})
		if m.own.err != nil {
			return m.own.err
		}
		if !m.own.evaluate(m.own.value, m.factor) {
			return m.own.fault()
		}
		if m.alone {
			return nil
		}
		if err := m.scan(); err != nil {
			return err
		}
	}
	return nil
}

// scan improves the start values of mid-transit time, radius ratio and settling
// time where they are free: for each trial time and settling time, the trend and
// the depth of the start's transit shape are solved for linearly, and the pair
// that fits best is kept.
func (m *objective) scan() error {
	s := m.space
	start := s.value
	shapeAt := func(v *[slots]float64) ([]float64, error) {
		flux, err := m.transit(v)
		if err != nil {
			return nil, err
		}
		for i := range flux {
			flux[i] = 1 - flux[i]
		}
		return flux, nil
	}
	offsets := m.trialOffsets()
	bestGain := 0.0
	for _, tau := range m.trialSettling() {
		v := start
		v[slotSettling] = tau
		basis, level, left := m.projectTrend(math.Exp(tau))
		for _, offset := range offsets {
			v[slotMid] = offset
			dip, err := shapeAt(&v)
			if err != nil {
				return err
			}
			// The flux is about trend - amplitude × level × dip.
			for i := range dip {
				dip[i] *= level[i] * m.weight[i]
			}
			for _, q := range basis {
				floats.AddScaled(dip, -floats.Dot(q, dip), q)
			}
			norm := floats.Dot(dip, dip)
			if !(norm > 0) {
				continue
			}
			amplitude := -floats.Dot(dip, left) / norm
			// Sum of squares explained by trend and dip together, less the same constant.
			gain := amplitude*amplitude*norm - floats.Dot(left, left)
			if amplitude > 0 && (bestGain == 0 || gain > bestGain) {
				bestGain = gain
				s.value = v
				if s.isFree(slotRadius) {
					lo, hi := s.limits(slotRadius)
					s.value[slotRadius] = inside(start[slotRadius]*math.Sqrt(amplitude), lo, hi)
				}
			}
		}
	}
	return nil
}

// trialOffsets lists the mid-transit times to try, as offsets.
func (m *objective) trialOffsets() []float64 {
	s := m.space
	if !s.isFree(slotMid) {
		return []float64{s.value[slotMid]}
	}
	lo, hi := s.limits(slotMid)
	center, half := 0.0, scanHalf
	if p := s.prior[slotMid]; p.normal() {
		center, half = s.coordinate(slotMid, p.A), min(half, 4*p.B)
	}
	lo, hi = max(lo, center-half), min(hi, center+half)
	if !(lo < hi) { // the prior lies far from the guess
		lo, hi = s.limits(slotMid)
	}
	if math.IsInf(hi-lo, 0) { // or is too narrow to step through
		return []float64{s.value[slotMid]}
	}
	t14 := 0.0
	if p, err := s.physical(&s.value); err == nil {
		t14, _ = p.Orbit.Duration(p.RadiusRatio)
	}
	if !(t14 > 0) {
		t14 = s.value[slotPeriod] / 50
	}
	steps := int(min(mostScan, math.Ceil((hi-lo)/(scanStep*t14))))
	out := make([]float64, steps+1)
	for i := range out {
		out[i] = lo + (hi-lo)*(float64(i)+0.5)/float64(steps+1)
	}
	return out
}

// trialSettling lists the settling times to try, as coordinates.
func (m *objective) trialSettling() []float64 {
	s := m.space
	if !s.isFree(slotSettling) {
		return []float64{s.value[slotSettling]}
	}
	lo, hi := s.limits(slotSettling)
	var out []float64
	for _, factor := range []float64{1, 1. / 3, 3, 1. / 10, 10} {
		out = append(out, inside(s.value[slotSettling]+math.Log(factor), lo, hi))
	}
	return out
}

// projectTrend returns an orthonormal basis of the weighted trend columns at a
// settling time, times the function's values; the trend that fits best without a
// transit; and the weighted residuals of that.
func (m *objective) projectTrend(tau float64) (basis [][]float64, level, left []float64) {
	n := len(m.used)
	left = make([]float64, n)
	floats.MulTo(left, m.flux, m.weight)
	total := append([]float64(nil), left...)
	for k, column := range m.columns {
		if k == m.design.Settling {
			column = systematics.Settle(m.times, m.design.Start, tau)
		}
		v := floats.MulTo(make([]float64, n), column, m.weight)
		if k < m.design.Added {
			floats.Mul(v, m.factor)
		}
		length := floats.Norm(v, 2)
		for range 2 {
			for _, q := range basis {
				floats.AddScaled(v, -floats.Dot(q, v), q)
			}
		}
		if norm := floats.Norm(v, 2); norm > 1e-12*length {
			floats.Scale(1/norm, v)
			basis = append(basis, v)
		}
	}
	for _, q := range basis {
		floats.AddScaled(left, -floats.Dot(q, left), q)
	}
	level = floats.SubTo(total, total, left)
	floats.Div(level, m.weight)
	return basis, level, left
}

// starts lists vectors of coordinates to start the optimiser from: the present
// one and, where the shape of the orbit is free, others of about the same
// transit duration and other impact parameters.
func (m *objective) starts() [][slots]float64 {
	s := m.space
	out := [][slots]float64{s.value}
	if !s.isFree(slotTilt) {
		return out
	}
	p, err := s.physical(&s.value)
	if err != nil {
		return out
	}
	b0, e := p.Orbit.ImpactParameter(), p.Orbit.Eccentricity
	near := (1 - e*e) / (1 + e*math.Sin(p.Orbit.Periastron)) // distance at mid-transit in semi-major axes
	chord := func(b float64) float64 { return (1+p.RadiusRatio)*(1+p.RadiusRatio) - b*b }
	for _, b := range []float64{0.15, 0.5, 0.75} {
		other := *s
		o := p.Orbit
		if s.isFree(slotSize) && chord(b0) > 0 {
			o.AxisRatio *= math.Sqrt(chord(b) / chord(b0))
		}
		o.Inclination = math.Acos(min(1, b/(o.AxisRatio*near)))
		other.setOrbit(o)
		v := s.value
		for _, slot := range []int{slotSize, slotTilt} {
			if s.isFree(slot) {
				lo, hi := s.limits(slot)
				v[slot] = inside(other.value[slot], lo, hi)
			}
		}
		out = append(out, v)
	}
	return out
}
