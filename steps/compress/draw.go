package compress

import (
	"math"
	"math/rand/v2"

	"rimlight/steps/chain"
)

const (
	degrees = 5 // of freedom of proposals
	// mostK is k-hat above which proposals are fitted again, and then walkers take over.
	mostK = 0.5
	// refits bounds how often.
	refits = 3
	// mostDraws bounds the draws of one light curve.
	mostDraws = 30_000
	// wider is by how much a part of the draws is spread more where proposals are fitted
	// again, and wideShare how large that part is.
	wider     = 2
	wideShare = 0.3
	// leastShare is the share of the posterior below which a node gets no draws.
	leastShare = 1e-6
)

// draws are of a posterior.
type draws struct {
	m       int
	node    []int
	z       []float64 // m coordinates each
	base    []float64 // log density of target over proposal, without the node's share of draws
	density []float64 // log density of the target, in coordinates and ln τ
	counts  []int     // of each node

	logWeight []float64
	k         float64 // k-hat
	size      float64 // effective
}

// proposal is a t distribution at each node: the mode and the factor of the inverse of
// its scale.
type proposal struct {
	center [][]float64
	factor [][]float64
	share  []float64 // of the draws
	wide   float64   // share of those that are from a distribution twice as wide
}

// propose is that of the modes.
func propose(nodes []*node) *proposal {
	p := &proposal{}
	top := math.Inf(-1)
	for _, n := range nodes {
		top = math.Max(top, n.logMass)
	}
	sum := 0.0
	for _, n := range nodes {
		share := math.Exp(n.logMass - top)
		p.center, p.factor = append(p.center, n.mode), append(p.factor, n.factor)
		p.share = append(p.share, share)
		sum += share
	}
	p.tidy(sum)
	return p
}

// tidy makes shares sum to 1, nodes that matter having some draws at least.
func (p *proposal) tidy(sum float64) {
	total := 0.0
	for g := range p.share {
		p.share[g] /= sum
		if p.share[g] < leastShare || p.center[g] == nil || len(p.factor[g]) == 0 {
			p.share[g] = 0
			continue
		}
		p.share[g] = math.Max(p.share[g], 2e-3)
		total += p.share[g]
	}
	for g := range p.share {
		p.share[g] /= total
	}
}

// sample adds n draws.
func (c *channel) sample(d *draws, nodes []*node, p *proposal, n int, rng *rand.Rand) {
	m := d.m
	xi := make([]float64, m)
	taken, sum := 0, 0.0
	for g, node := range nodes {
		sum += p.share[g]
		until := int(math.Round(sum * float64(n)))
		if g == len(nodes)-1 {
			until = n
		}
		if p.share[g] == 0 {
			continue
		}
		logQ := 0.0
		for k := range m {
			logQ += math.Log(p.factor[g][pairs(k)+k])
		}
		for ; taken < until; taken++ {
			square, chi := 0.0, 0.0
			for k := range xi {
				xi[k] = rng.NormFloat64()
			}
			for range degrees {
				x := rng.NormFloat64()
				chi += x * x
			}
			stretch := math.Sqrt(degrees / math.Max(chi, math.SmallestNonzeroFloat64))
			for k := range xi {
				xi[k] *= stretch
				square += xi[k] * xi[k]
			}
			if rng.Float64() < p.wide {
				for k := range xi {
					xi[k] *= wider
				}
				square *= wider * wider
			}
			solveUpper(p.factor[g], m, xi)
			at := len(d.z)
			for k, x := range xi {
				d.z = append(d.z, p.center[g][k]+x)
			}
			value := c.target.value(node, d.z[at:]) + node.logWeight
			d.node = append(d.node, g)
			d.density = append(d.density, value)
			d.base = append(d.base, value-logQ-p.spread(square, m))
			d.counts[g]++
		}
	}
}

// spread is the logarithm of the density at a distance from the center whose square is
// given in units of the scale, up to a constant.
func (p *proposal) spread(square float64, m int) float64 {
	power := -float64(degrees+m) / 2
	narrow := power * math.Log1p(square/degrees)
	if p.wide == 0 {
		return narrow
	}
	wide := power*math.Log1p(square/(wider*wider*degrees)) - float64(m)*math.Log(wider)
	return math.Log((1-p.wide)*math.Exp(narrow) + p.wide*math.Exp(wide))
}

// weigh computes the weights.
func (d *draws) weigh() error {
	n := len(d.base)
	ratio := make([]float64, n)
	logCount := make([]float64, len(d.counts))
	for g, count := range d.counts {
		logCount[g] = math.Log(float64(count) / float64(n))
	}
	for i, b := range d.base {
		ratio[i] = b - logCount[d.node[i]]
	}
	var err error
	if d.logWeight, d.k, err = chain.ParetoSmooth(ratio); err != nil {
		return err
	}
	d.size, err = chain.WeightESS(d.logWeight)
	return err
}

// importance draws from the posterior until the draws are worth as many as wanted, with
// proposals fitted again where they are unlike it. What was best is returned.
func (c *channel) importance(nodes []*node, wanted int, rng *rand.Rand) (*draws, int, error) {
	p := propose(nodes)
	var best *draws
	round := 0
	for ; ; round++ {
		d := &draws{m: len(c.target.free), counts: make([]int, len(nodes))}
		n := wanted + wanted*(3+2*d.m)/20
		for n > 0 {
			c.sample(d, nodes, p, n, rng)
			if err := d.weigh(); err != nil {
				return nil, round, err
			}
			if d.k > mostK {
				break
			}
			short := float64(wanted)/d.size - 1
			n = int(math.Ceil(1.1 * short * float64(len(d.base))))
			n = min(n, mostDraws-len(d.base))
		}
		if best == nil || d.k < best.k {
			best = d
		}
		if best.k <= mostK || round == refits {
			return best, round, nil
		}
		p = d.refit(nodes, p)
		if p == nil {
			return best, round, nil
		}
	}
}

// refit is a proposal with the mean and covariance of the draws, relative to those of
// the proposal's parts; nil when they have none.
func (d *draws) refit(nodes []*node, old *proposal) *proposal {
	m := d.m
	mean, covariance := make([]float64, m), make([]float64, pairs(m))
	share := make([]float64, len(nodes))
	white := make([]float64, m*len(d.base))
	for i, lw := range d.logWeight {
		g, w := d.node[i], math.Exp(lw)
		share[g] += w
		x := white[i*m : (i+1)*m]
		for k := range m { // Lᵀ (z - center)
			for l := k; l < m; l++ {
				x[k] += old.factor[g][pairs(l)+k] * (d.z[i*m+l] - old.center[g][l])
			}
			mean[k] += w * x[k]
		}
	}
	for i, lw := range d.logWeight {
		w := math.Exp(lw)
		for k := range m {
			for l := range k + 1 {
				covariance[pairs(k)+l] += w * (white[i*m+k] - mean[k]) * (white[i*m+l] - mean[l])
			}
		}
	}
	inverse, ok := invert(covariance, m)
	if !ok {
		return nil
	}
	p := &proposal{share: share, wide: wideShare}
	offset := make([]float64, m)
	for g := range nodes {
		if old.share[g] == 0 {
			p.center, p.factor = append(p.center, nil), append(p.factor, nil)
			continue
		}
		// Precision L S⁻¹ Lᵀ, with L that of the old factor.
		precision := make([]float64, pairs(m))
		for a := range m {
			for b := range a + 1 {
				sum := 0.0
				for k := range a + 1 {
					for l := range b + 1 {
						sum += old.factor[g][pairs(a)+k] * inverse[packed(k, l)] * old.factor[g][pairs(b)+l]
					}
				}
				precision[pairs(a)+b] = sum
			}
		}
		factor, center := make([]float64, pairs(m)), make([]float64, m)
		if damped(factor, precision, 0, m) != nil {
			return nil
		}
		copy(offset, mean)
		solveUpper(old.factor[g], m, offset)
		for k := range center {
			center[k] = old.center[g][k] + offset[k]
		}
		p.center, p.factor = append(p.center, center), append(p.factor, factor)
	}
	p.tidy(1)
	return p
}

// invert gives the inverse of a packed positive definite matrix.
func invert(matrix []float64, m int) (inverse []float64, ok bool) {
	factor := make([]float64, pairs(m))
	if damped(factor, matrix, 0, m) != nil {
		return nil, false
	}
	inverse = make([]float64, pairs(m))
	column := make([]float64, m)
	for k := range m {
		clear(column)
		column[k] = 1
		solveLower(factor, m, column, column)
		solveUpper(factor, m, column)
		for l := k; l < m; l++ {
			inverse[pairs(l)+k] = column[l]
		}
	}
	return inverse, true
}
