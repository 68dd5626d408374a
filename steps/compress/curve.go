package compress

import (
	"errors"
	"math"
	"slices"

	"gonum.org/v1/gonum/integrate/quad"
)

const (
	// reach is how many standard deviations of the radius ratio tables extend to either
	// side.
	reach = 8
	// mostError is what the error of the tables may be in units of the noise: the root of
	// the sum of squares over all samples.
	mostError = 0.03
	// roughError is the same for tables that only say where to look.
	roughError = 0.2
	// mostSections bounds how many tables cover the radius ratios of one light curve.
	mostSections = 8
	// littleMass is the logarithm of a share of the posterior that does not matter.
	littleMass = -20
	// fewNodes and manyNodes are the points of the rule of integration in the settling
	// time: for a posterior as narrow as the search makes it, and for one as wide as the
	// prior.
	fewNodes  = 16
	manyNodes = 32
	// alikeWeights is the relative difference up to which the weights of samples count as
	// equal.
	alikeWeights = 1e-9
)

// A Curve is a light curve at the times of what is shared.
type Curve struct {
	Flux       []float64
	Err        []float64
	Used       []bool  // which samples count; Flux and Err of the others are not looked at
	Factor     float64 // of the errors; 0 for 1
	Jitter     float64 // noise beside them, relative to the median flux
	Parameters Parameters
	Radius     float64    // to start from
	Limb       [2]float64 // the same, as in Parameters
}

// errUndetermined is for light curves whose mode is not found.
var errUndetermined = errors.New("no maximum of the posterior was found")

// A section is a table of deficits with the sums of a light curve over it.
type section struct {
	deficits  *Deficits
	functions int
	sums      *sums
}

// channel is a light curve at work.
type channel struct {
	*Shared
	curve    *Curve
	level    float64   // median flux
	residual []float64 // flux over level, less 1
	weight   []float64 // 0 where a sample does not count
	unused   []int
	used     int
	mean     float64 // of the weights of used samples
	alike    bool    // they are all equal
	scale    bool    // of the errors, integrated over
	priors   []Coefficient
	target   target

	square, packed []float64 // scratch
}

// newChannel prepares a light curve.
func newChannel(s *Shared, curve *Curve, scale bool) (*channel, error) {
	n := len(s.star.Times)
	c := &channel{Shared: s, curve: curve, residual: make([]float64, n), weight: make([]float64, n), scale: scale, priors: s.trend.Normal}
	var flux []float64
	for i, used := range curve.Used {
		if used {
			flux = append(flux, curve.Flux[i])
		} else {
			c.unused = append(c.unused, i)
		}
	}
	c.used = len(flux)
	if c.used == 0 {
		return nil, errors.New("no usable samples")
	}
	slices.Sort(flux)
	c.level = (flux[(len(flux)-1)/2] + flux[len(flux)/2]) / 2
	if !(c.level > 0) {
		return nil, errors.New("the median flux is not above zero; there is no starlight to fit")
	}
	factor := curve.Factor
	if factor == 0 {
		factor = 1
	}
	least, most := math.Inf(1), 0.0
	for i, used := range curve.Used {
		if !used {
			continue
		}
		c.residual[i] = curve.Flux[i]/c.level - 1
		sigma := factor * curve.Err[i] / c.level
		w := 1 / (sigma*sigma + curve.Jitter*curve.Jitter)
		c.weight[i] = w
		c.mean += w
		least, most = math.Min(least, w), math.Max(most, w)
	}
	c.mean /= float64(c.used)
	c.alike = most-least <= alikeWeights*most
	c.target = target{parameters: &curve.Parameters, law: s.star.Law, free: curve.Parameters.free()}
	if scale {
		c.target.marginal = float64(c.used - len(s.stars) + len(c.priors))
	}
	return c, nil
}

// functions is how many functions of a table matter by more than an error in units of
// the noise. Their shares are of the size of 1.
func (c *channel) functions(d *Deficits, most float64) int {
	n := 1
	for n < len(d.norm) && d.norm[n]*math.Sqrt(c.mean) > most {
		n++
	}
	return n
}

// shares reports whether sums of weight 1 that all light curves share are as good as the
// light curve's own.
func (c *channel) shares() bool { return c.alike && len(c.unused) <= len(c.weight)/4 }

// section makes the sums over a table. Rough ones are with weights as if all were equal.
func (c *channel) section(e *entry, columns [][]float64, rough bool) section {
	d := e.deficits
	most := mostError / 6
	if rough {
		most = roughError
	}
	out := section{deficits: d, functions: c.functions(d, most)}
	weight := c.weight
	if len(columns) != len(c.columns) || !c.shares() && !rough || len(c.unused) > len(c.weight)/4 {
		out.sums = newSums(len(columns), out.functions)
		out.sums.addSquares(weight, columns, d)
	} else {
		out.sums = c.unit(e).scaled(out.functions, c.unused, columns, d, c.mean)
		if !c.alike {
			weight = make([]float64, len(c.weight))
			for i, w := range c.weight {
				if w > 0 {
					weight[i] = c.mean
				}
			}
		}
	}
	out.sums.addCrosses(weight, c.residual, columns, d)
	return out
}

// err is the error of a table in units of the noise.
func (c *channel) err(d *Deficits) float64 {
	sum := 0.0
	d.eachRun(func(first, until, offset int) {
		for i := first; i < until; i++ {
			x := d.error[offset+i-first]
			sum += c.weight[i] * x * x
		}
	})
	return math.Sqrt(sum)
}

// cover lists tables for radius ratios from lo to hi, as narrow as their errors ask for.
// The error is that of the worst.
func (c *channel) cover(lo, hi float64) (out []*entry, worst float64, err error) {
	var add func(from, to float64, most int) error
	add = func(from, to float64, most int) error {
		if to <= lo || from >= hi {
			return nil
		}
		e, err := c.table(from, to)
		if err != nil {
			return err
		}
		found := c.err(e.deficits)
		if found > mostError && most > 1 {
			middle := (from + to) / 2
			if err := add(from, middle, most/2); err != nil {
				return err
			}
			return add(middle, to, most/2)
		}
		worst = math.Max(worst, found)
		out = append(out, e)
		return nil
	}
	from, to := around(lo, hi)
	err = add(math.Max(from, 0), to, mostSections)
	return out, worst, err
}

// legendre are the nodes of the rule of integration for ln τ between two values; without
// a settling time to find, one node.
func (c *channel) legendre(lo, hi float64, count int) []*node {
	if c.family == nil {
		return []*node{{}}
	}
	x, w := make([]float64, count), make([]float64, count)
	quad.Legendre{}.FixedLocations(x, w, lo, hi)
	if x[0] > x[count-1] {
		slices.Reverse(x)
		slices.Reverse(w)
	}
	nodes := make([]*node, count)
	for i := range nodes {
		tau := math.Exp(x[i])
		nodes[i] = &node{logTau: x[i], logWeight: math.Log(w[i]) + c.trend.Settle.logDensity(tau) + x[i]}
	}
	return nodes
}

// tabulate gives nodes their tables.
func (c *channel) tabulate(nodes []*node, sections []section, f *family) {
	for _, n := range nodes {
		m := c.mixing(n.logTau, f)
		if len(n.pieces) != len(sections) {
			n.pieces = make([]tables, len(sections))
		}
		for k, s := range sections {
			n.pieces[k].set(s.sums, s.deficits, m)
		}
		if f != nil {
			n.logWeight += c.jeffreys(sections[0].sums, m)
		}
	}
}

func (c *channel) mixing(logTau float64, f *family) *mixing {
	m := &mixing{fixed: c.fixed, star: c.stars, priors: c.priors}
	if f != nil {
		m.combine = make([]float64, len(f.columns))
		f.combine(logTau, m.combine)
	}
	return m
}

// jeffreys is half the logarithm of the determinant of the columns whose coefficients
// have no prior of their own, out of transit and in: see the package comment.
func (c *channel) jeffreys(s *sums, m *mixing) float64 {
	p := m.size()
	c.square = resized(c.square, pairs(p))
	m.mixSquare(s.block(0), c.square)
	flat := make([]int, 0, 80)
	for j := range p {
		if !slices.ContainsFunc(c.priors, func(prior Coefficient) bool { return prior.Column == j }) {
			flat = append(flat, j)
		}
	}
	c.packed = resized(c.packed, pairs(len(flat)+1))
	for a, j := range flat {
		for b, k := range flat[:a+1] {
			c.packed[pairs(a)+b] = c.square[packed(j, k)]
		}
	}
	_, logDet, _ := factorise(c.packed, len(flat))
	return logDet / 2
}

// scan finds the modes of nodes, each from that of the one before, and the largest
// density in ln τ; ok is false when no node has a mode.
func (c *channel) scan(nodes []*node, z []float64) (best int, ok bool) {
	best = -1
	start := z
	for i, n := range nodes {
		if !c.target.search(n, start) {
			n.logMass = math.Inf(-1)
			continue
		}
		start = n.mode
		if best < 0 || n.logMass > nodes[best].logMass {
			best = i
		}
	}
	return best, best >= 0
}
