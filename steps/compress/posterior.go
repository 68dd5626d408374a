package compress

import (
	"cmp"
	"math"
	"math/rand/v2"
	"slices"
)

// How a posterior was sampled.
const (
	ByImportance = "importance sampling"
	ByWalkers    = "ensemble of walkers"
)

// Settings say how to sample.
type Settings struct {
	Effective int    // draws that the weighted ones are to be worth
	Scale     bool   // whether to integrate over a common factor of the errors, with the prior 1/factor
	Compare   int    // draws to compare with the exact likelihood; 0 for none
	Quick     bool   // do without walkers: what importance sampling gives, however bad
	Seed      uint64 // of all random numbers
	Stream    int    // of the light curve
	// Directions are ways in which the geometry that light curves share may be wrong, each
	// the change of the orbit's parameters in the order of transit.Params.Arguments, and
	// of a held settling time, days.
	Directions [][7]float64
}

// A Marginal summarises the posterior of one quantity.
type Marginal struct {
	Name      string
	Mean, SD  float64
	Quantiles [5]float64 // at Levels
}

// Levels are the probabilities of quantiles.
func Levels() [5]float64 { return [5]float64{0.025, 0.16, 0.5, 0.84, 0.975} }

// A Posterior is that of one light curve.
type Posterior struct {
	Marginals []Marginal // radiusRatio, depth, u1 and u2 as far as the law has them, settlingTime where it is found
	Draws     int
	Effective float64
	K         float64 // k-hat; NaN where walkers sampled
	By        string  // how it was sampled
	Refits    int     // of the proposal
	RHat      float64 // of walkers, otherwise NaN
	Mixed     bool    // whether draws can be relied on
	Tables    int     // that cover the radius ratio
	Error     float64 // of the tables, in units of the noise
	Edge      float64 // share of the posterior at the ends of the tables
	Compared  Comparison

	Radius       float64    // at the mode
	Limb         [2]float64 // coefficients at the mode
	Settling     float64    // time at the mode, days; NaN without one
	Chi2         float64    // at the mode, all samples
	Level        float64    // median flux
	Coefficients []float64  // of the trend at the mode, relative to Level
	Samples      int
	Scatter      float64   // root mean square of the relative residuals, by degrees of freedom
	Free         int       // parameters, with those of the trend
	Shift        []float64 // of the radius ratio, for each of the directions
}

// Posterior samples the posterior of a light curve. Errors: those of the light curve,
// which must have samples and light, and a posterior without a mode.
func (s *Shared) Posterior(curve *Curve, settings Settings) (*Posterior, error) {
	c, err := newChannel(s, curve, settings.Scale)
	if err != nil {
		return nil, err
	}
	out := &Posterior{RHat: math.NaN(), By: ByImportance, Level: c.level, Samples: c.used}
	f, d, err := c.draw(settings, out)
	if err != nil {
		return nil, err
	}
	out.Draws, out.Effective = len(d.node), d.size
	out.Tables, out.Error = len(f.sections), f.error
	out.Marginals = c.marginals(d, f)
	if settings.Compare > 0 {
		if out.Compared, err = c.compare(d, f.nodes, settings.Compare); err != nil {
			return nil, err
		}
	}
	return out, c.best(out, f, settings.Directions)
}

// draw samples the posterior, and says in out how.
func (c *channel) draw(settings Settings, out *Posterior) (f *fitted, d *draws, err error) {
	x, err := c.locate()
	if err != nil {
		return nil, nil, err
	}
	rng := rand.New(rand.NewPCG(settings.Seed, uint64(settings.Stream)))
	for round := 0; ; round++ {
		if f, err = c.refine(x); err != nil {
			return nil, nil, err
		}
		if d, out.Refits, err = c.importance(f.nodes, settings.Effective, rng); err != nil {
			return nil, nil, err
		}
		if out.Edge = c.edge(d, f); out.Edge < mostEdge || round == 3 {
			break
		}
		x = f.extent
		half := (x.hi - x.lo) / 2
		lo, hi := c.radii()
		x.lo, x.hi = math.Max(lo, x.lo-half), math.Min(hi, x.hi+half)
	}
	out.K, out.Mixed = d.k, d.k <= mostK
	if !out.Mixed && !settings.Quick {
		w, rhat, err := c.walk(d, f, settings.Seed, settings.Stream)
		if err == nil {
			d, out.RHat, out.By = w, rhat, ByWalkers
			out.Mixed = rhat <= mostRHat
		}
	}
	return f, d, nil
}

const (
	// edgeWidth is the part of a table's range at either end that should be empty, and
	// mostEdge how much of the posterior may be there.
	edgeWidth = 0.03
	mostEdge  = 1e-3
)

// edge is the share of the posterior near ends of the tables where the prior does not
// end.
func (c *channel) edge(d *draws, f *fitted) float64 {
	lo, hi := c.radii()
	first, last := f.sections[0].deficits.Lo, f.sections[len(f.sections)-1].deficits.Hi
	width := edgeWidth * (last - first)
	sum := 0.0
	for i, lw := range d.logWeight {
		r := c.radiusOf(d.z[i*d.m : (i+1)*d.m])
		if r < first+width && first > lo || r > last-width && last < hi {
			sum += math.Exp(lw)
		}
	}
	return sum
}

// marginals summarises the draws.
func (c *channel) marginals(d *draws, f *fitted) []Marginal {
	n := len(d.node)
	weight := make([]float64, n)
	all := [3][]draw{}
	for k := range 1 + c.law.count {
		all[k] = make([]draw, n)
	}
	for i, lw := range d.logWeight {
		w := math.Exp(lw)
		weight[i] = w
		c.target.parameters.at(c.target.law, c.target.free, d.z[i*d.m:(i+1)*d.m], false, &c.target.at)
		all[0][i] = draw{c.target.at.r, w}
		for k := range c.law.count {
			all[1+k][i] = draw{c.target.at.u[k], w}
		}
	}
	radius := summarise("radiusRatio", all[0])
	for i := range all[0] { // in order still, radius ratios being above 0
		all[0][i].x *= all[0][i].x
	}
	out := []Marginal{radius, summarise("depth", all[0])}
	for k, name := range []string{"u1", "u2"}[:c.law.count] {
		out = append(out, summarise(name, all[1+k]))
	}
	if f.family != nil {
		out = append(out, settling(d, f, weight))
	}
	return out
}

// A draw is one number with its weight.
type draw struct{ x, weight float64 }

// summarise is the summary of weighted draws, which it sorts. Quantiles are those of
// chain.WeightedQuantile.
func summarise(name string, all []draw) Marginal {
	m := Marginal{Name: name}
	for _, d := range all {
		m.Mean += d.weight * d.x
	}
	for _, d := range all {
		m.SD += d.weight * (d.x - m.Mean) * (d.x - m.Mean)
	}
	m.SD = math.Sqrt(m.SD)
	slices.SortFunc(all, func(a, b draw) int {
		switch {
		case a.x < b.x:
			return -1
		case a.x > b.x:
			return 1
		}
		return cmp.Compare(a.weight, b.weight)
	})
	levels := Levels()
	next, sum, last, lastAt := 0, 0.0, math.NaN(), 0.0
	for _, d := range all {
		if !(d.weight > 0) {
			continue
		}
		at := sum + d.weight/2
		for next < len(levels) && levels[next] <= at {
			m.Quantiles[next] = d.x
			if last == last {
				share := (levels[next] - lastAt) / (at - lastAt)
				m.Quantiles[next] = last*(1-share) + d.x*share
			}
			next++
		}
		sum += d.weight
		last, lastAt = d.x, at
	}
	for ; next < len(levels); next++ {
		m.Quantiles[next] = last
	}
	return m
}

// settling summarises the settling time, whose values are those of the nodes. For
// quantiles, its logarithm is spread evenly over cells that end half-way between nodes.
func settling(d *draws, f *fitted, weight []float64) Marginal {
	m := Marginal{Name: "settlingTime"}
	mass := make([]float64, len(f.nodes))
	for i, w := range weight {
		mass[d.node[i]] += w
	}
	sum := 0.0
	for g, n := range f.nodes {
		m.Mean += mass[g] * math.Exp(n.logTau)
		sum += mass[g]
	}
	for g, n := range f.nodes {
		x := math.Exp(n.logTau) - m.Mean
		m.SD += mass[g] * x * x
	}
	m.SD = math.Sqrt(m.SD)
	edges := cells(f)
	for k, level := range Levels() {
		below := 0.0
		for g := range f.nodes {
			if below+mass[g] >= level*sum && mass[g] > 0 {
				share := (level*sum - below) / mass[g]
				m.Quantiles[k] = math.Exp(edges[g]*(1-share) + edges[g+1]*share)
				break
			}
			below += mass[g]
		}
	}
	return m
}

// cells are the ends of the cells of nodes in ln τ.
func cells(f *fitted) []float64 {
	out := []float64{f.tauLo}
	for g := range f.nodes[1:] {
		out = append(out, (f.nodes[g].logTau+f.nodes[g+1].logTau)/2)
	}
	return append(out, f.tauHi)
}
