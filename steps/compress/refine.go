package compress

import "math"

// A fitted is a posterior with tables that hold it.
type fitted struct {
	extent
	nodes    []*node
	sections []section
	family   *family
	error    float64 // of the tables, in units of the noise
}

// refine makes tables of the range of a posterior and finds its modes in them. The range
// is moved or widened until it holds the posterior.
func (c *channel) refine(x extent) (*fitted, error) {
	const rounds = 6
	for round := 1; ; round++ {
		out := &fitted{extent: x, family: c.family}
		entries, worst, err := c.cover(x.lo, x.hi)
		if err != nil {
			return nil, err
		}
		out.error = worst
		columns := c.columns
		if c.family != nil && !c.shares() {
			out.family = c.family.narrow(x.tauLo, x.tauHi, math.Min(1e-4, math.Max(rare, mostError/3/x.hook)))
			columns = append(append([][]float64(nil), c.columns[:c.fixed]...), out.family.columns...)
		}
		for _, e := range entries {
			out.sections = append(out.sections, c.section(e, columns, false))
		}
		out.cut()
		if err := c.integrate(out); err != nil {
			return nil, err
		}
		x = out.extent
		if c.holds(out.nodes, &x) || round == rounds {
			return out, nil
		}
	}
}

// cut limits the range of radius ratios to that of tables.
func (f *fitted) cut() {
	f.lo = math.Max(f.lo, f.sections[0].deficits.Lo)
	f.hi = math.Min(f.hi, f.sections[len(f.sections)-1].deficits.Hi)
}

// integrate finds the modes at the nodes of a rule that suits the width of the posterior
// in ln τ.
func (c *channel) integrate(f *fitted) error {
	count := fewNodes
	if f.tauHi-f.tauLo > 1 {
		count = manyNodes
	}
	f.nodes = c.legendre(f.tauLo, f.tauHi, count)
	c.tabulate(f.nodes, f.sections, f.family)
	best, ok := c.scan(f.nodes, f.z)
	if !ok {
		return errUndetermined
	}
	f.z = append([]float64(nil), f.nodes[best].mode...)
	return nil
}

// holds reports whether tables hold the posterior, or else sets the range that should.
func (c *channel) holds(nodes []*node, x *extent) bool {
	const enough = 6 // standard deviations
	wanted := *x
	c.reach(nodes, &wanted)
	mid := c.radiusOf(x.z)
	sd := math.Max(wanted.hi-mid, mid-wanted.lo) / reach
	lo, hi := c.radii()
	held := true
	if x.lo > lo && x.lo > wanted.lo+(reach-enough)*sd || x.hi < hi && x.hi < wanted.hi-(reach-enough)*sd ||
		wanted.hi-wanted.lo < (x.hi-x.lo)/8 {
		x.lo, x.hi = wanted.lo, wanted.hi
		held = false
	}
	if c.family == nil {
		return held
	}
	// The density in ln τ at the ends, which are those of the prior or negligible.
	top := math.Inf(-1)
	for _, n := range nodes {
		top = math.Max(top, n.logMass)
	}
	wide := (x.tauHi - x.tauLo) / 2
	if x.tauLo > c.family.lo && nodes[0].logMass > top+littleMass/2 {
		x.tauLo, held = math.Max(c.family.lo, x.tauLo-wide), false
	}
	if x.tauHi < c.family.hi && nodes[len(nodes)-1].logMass > top+littleMass/2 {
		x.tauHi, held = math.Min(c.family.hi, x.tauHi+wide), false
	}
	return held
}
