package compress

import "math"

// A range is where the radius ratio and the logarithm of the settling time are to be
// looked for, and a point to start from in free coordinates.
type extent struct {
	lo, hi       float64 // radius ratio
	tauLo, tauHi float64 // ln τ
	hook         float64 // most that the coefficient of the settling may be, in units of the error of a mean over all samples
	z            []float64
}

// locate finds roughly where the posterior is, from wide tables.
func (c *channel) locate() (extent, error) {
	priorLo, priorHi := c.radii()
	z := c.start()
	var seen []int
	var best extent
	top := math.Inf(-1)
	for k := 0; ; {
		lo, hi := rough(k, c.curve.Radius, priorLo, priorHi)
		found, value, move, err := c.within(lo, hi, z)
		if err != nil {
			return extent{}, err
		}
		if value > top {
			best, top = found, value
		}
		seen = append(seen, k)
		if lo <= priorLo && move < 0 || hi >= priorHi && move > 0 || move == 0 {
			break
		}
		k += move
		if contains(seen, k) || len(seen) > 12 {
			break
		}
		z = found.z
	}
	if math.IsInf(top, -1) {
		return extent{}, errUndetermined
	}
	return best, nil
}

func contains(list []int, x int) bool {
	for _, y := range list {
		if x == y {
			return true
		}
	}
	return false
}

// rough is interval k of overlapping ones, of which 0 is around a radius ratio, those
// above 0 lie above it and those below it below.
func rough(k int, r, priorLo, priorHi float64) (lo, hi float64) {
	switch {
	case k == 0:
		lo, hi = 0.75*r, 1.3*r
	case k == -1:
		lo, hi = 0.3*r, 0.85*r
	case k < -1:
		lo, hi = 0, 0.4*r
	default:
		f := math.Pow(1.6, float64(k-1))
		lo, hi = 1.15*r*f, 2*r*f
	}
	return math.Max(lo, math.Min(priorLo, hi/2)), math.Min(hi, math.Max(priorHi, lo*2))
}

// radii is the range that the prior of the radius ratio allows.
func (c *channel) radii() (lo, hi float64) {
	p := c.curve.Parameters.Radius
	lo, hi = p.limits()
	switch p.Kind {
	case TruncatedNormal:
		lo, hi = p.window()
	case Normal:
		lo, hi = p.A-farthest*p.B, p.A+farthest*p.B
	}
	return math.Max(lo, leastRadius), math.Min(hi, 1)
}

// leastRadius is the smallest radius ratio with any density.
const leastRadius = 1e-4

// start is where searches begin, in free coordinates.
func (c *channel) start() []float64 {
	p := &c.curve.Parameters
	x := [3]float64{c.curve.Radius, c.curve.Limb[0], c.curve.Limb[1]}
	var z []float64
	for _, k := range c.target.free {
		z = append(z, math.Max(-3, math.Min(3, p.prior(k).coordinate(x[k]))))
	}
	return z
}

// within looks for the posterior among radius ratios from lo to hi. move is the
// direction in which it lies otherwise.
func (c *channel) within(lo, hi float64, z []float64) (found extent, value float64, move int, err error) {
	e, err := c.table(lo, hi)
	if err != nil {
		return extent{}, 0, 0, err
	}
	sections := []section{c.section(e, c.columns, true)}
	lo = math.Max(lo, 0)
	z = append([]float64(nil), z...)
	c.target.parameters.at(c.target.law, c.target.free, z, false, &c.target.at)
	if r := c.target.at.r; r <= lo || r >= hi { // start inside
		z[0] = c.curve.Parameters.Radius.coordinate((lo + hi) / 2)
	}
	found = extent{z: z}
	if c.family != nil {
		found.tauLo, found.tauHi = c.family.lo, c.family.hi
	}
	var nodes []*node
	for range 8 {
		nodes = c.legendre(found.tauLo, found.tauHi, fewNodes)
		c.tabulate(nodes, sections, c.family)
		best, ok := c.scan(nodes, found.z)
		if !ok {
			return found, math.Inf(-1), 0, nil
		}
		found.z, value = append(found.z[:0], nodes[best].mode...), nodes[best].logMass
		if c.family == nil || !found.tighten(nodes) {
			break
		}
	}
	c.reach(nodes, &found)
	if c.family != nil {
		found.hook = c.settled(nodes)
	}
	mid := c.radiusOf(found.z)
	margin := math.Max((hi-lo)/50, math.Min((found.hi-found.lo)/reach, (hi-lo)/8)) // of 2 sd
	switch {
	case mid > hi-margin:
		move = 1
	case mid < lo+margin:
		move = -1
	}
	return found, value, move, nil
}

// settled is the size of the coefficient of the settling, at most, in units of the error
// of a mean over all samples.
func (c *channel) settled(nodes []*node) float64 {
	most := 0.0
	top := math.Inf(-1)
	for _, n := range nodes {
		top = math.Max(top, n.logMass)
	}
	m := len(c.target.free)
	gradient, curvature := make([]float64, m), make([]float64, pairs(m))
	for _, n := range nodes {
		if !(n.logMass > top-12) {
			continue
		}
		c.target.slopes(n, n.mode, gradient, curvature)
		last := len(c.target.s) - 1
		most = math.Max(most, math.Abs(c.target.s[last])+4*math.Sqrt(c.target.inverse[packed(last, last)]))
	}
	return most * math.Sqrt(c.mean*float64(c.used))
}

// radiusOf is the radius ratio at a point.
func (c *channel) radiusOf(z []float64) float64 {
	c.target.parameters.at(c.target.law, c.target.free, z, false, &c.target.at)
	return c.target.at.r
}

// tighten narrows the range of ln τ to where the posterior is, and reports whether that
// is much less than it was.
func (x *extent) tighten(nodes []*node) bool {
	lo, hi, ok := x.massive(nodes)
	if !ok || hi-lo > 0.7*(x.tauHi-x.tauLo) {
		return false
	}
	x.tauLo, x.tauHi = lo, hi
	return true
}

// massive is the range of ln τ that has more than little of the posterior, a node more
// on either side.
func (x *extent) massive(nodes []*node) (lo, hi float64, ok bool) {
	top := math.Inf(-1)
	for _, n := range nodes {
		top = math.Max(top, n.logMass)
	}
	first, last := -1, -1
	for i, n := range nodes {
		if n.logMass > top+littleMass {
			if first < 0 {
				first = i
			}
			last = i
		}
	}
	if first < 0 {
		return 0, 0, false
	}
	lo, hi = x.tauLo, x.tauHi
	if first > 0 {
		lo = nodes[first-1].logTau
	}
	if last+1 < len(nodes) {
		hi = nodes[last+1].logTau
	}
	return lo, hi, true
}

// reach sets the range of radius ratios to that of all nodes of some mass, as many
// standard deviations to either side as tables extend.
func (c *channel) reach(nodes []*node, x *extent) {
	x.lo, x.hi = math.Inf(1), math.Inf(-1)
	top := math.Inf(-1)
	for _, n := range nodes {
		top = math.Max(top, n.logMass)
	}
	z := make([]float64, len(x.z))
	for _, n := range nodes {
		if !(n.logMass > top-12) {
			continue
		}
		copy(z, n.mode)
		sd := math.Sqrt(n.variance[0])
		z[0] = n.mode[0] - reach*sd
		x.lo = math.Min(x.lo, c.radiusOf(z))
		z[0] = n.mode[0] + reach*sd
		x.hi = math.Max(x.hi, c.radiusOf(z))
	}
	lo, hi := c.radii()
	x.lo, x.hi = math.Max(x.lo, lo), math.Min(x.hi, hi)
}
