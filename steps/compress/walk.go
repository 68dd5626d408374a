package compress

import (
	"math"
	"math/rand/v2"

	"rimlight/steps/chain"
	"rimlight/steps/sample"
)

const (
	walkers    = 40
	walkWarmUp = 500
	walkDraws  = 1500
	walkThin   = 2
	mostRHat   = 1.02 // of walkers that have met
)

// walk samples the posterior by an ensemble of walkers that begin at draws of importance
// sampling. Settling times lie anywhere between the ends.
func (c *channel) walk(d *draws, at *fitted, seed uint64, stream int) (*draws, float64, error) {
	m, nodes, x, f := d.m, at.nodes, &at.extent, at.family
	parameters := make([]sample.Parameter, 0, m+1)
	for k := range m {
		parameters = append(parameters, sample.Parameter{Name: string(rune('a' + k))})
	}
	if f != nil {
		parameters = append(parameters, sample.Parameter{Name: "tau", Lo: x.tauLo, Hi: x.tauHi})
	}
	n := node{}
	last := math.Inf(-1)
	value := func(p []float64) float64 {
		if f == nil {
			return c.target.value(nodes[0], p)
		}
		if logTau := p[m]; logTau != last {
			last = logTau
			n.logTau, n.logWeight = logTau, c.trend.Settle.logDensity(math.Exp(logTau))+logTau
			c.tabulate([]*node{&n}, at.sections, f)
		}
		return c.target.value(&n, p[:m]) + n.logWeight
	}
	rng := rand.New(rand.NewPCG(seed, uint64(stream)^walkStream))
	var start [][]float64
	cumulative := 0.0
	next := rng.Float64()
	for i, lw := range d.logWeight {
		cumulative += math.Exp(lw) * walkers
		for len(start) < walkers && cumulative > next {
			p := append([]float64(nil), d.z[i*m:(i+1)*m]...)
			for k := range p {
				p[k] += 1e-3 * rng.NormFloat64() * math.Sqrt(nodes[d.node[i]].variance[k])
			}
			if f != nil {
				cell := (x.tauHi - x.tauLo) / float64(len(nodes))
				p = append(p, math.Min(x.tauHi-1e-9*cell, math.Max(x.tauLo+1e-9*cell, nodes[d.node[i]].logTau+cell*(rng.Float64()-0.5))))
			}
			if v := value(p); !math.IsInf(v, -1) {
				start = append(start, p)
			}
			next++
		}
	}
	for len(start)%2 != 0 || len(start) > walkers {
		start = start[:len(start)-1]
	}
	w, err := sample.Ensemble(parameters, value, start, sample.EnsembleSettings{
		Seed: seed, Stream: stream, WarmUp: walkWarmUp, Draws: walkDraws, Thin: walkThin, Differential: 0.3})
	if err != nil {
		return nil, 0, err
	}
	summaries, err := chain.Summaries(w)
	if err != nil {
		return nil, 0, err
	}
	out := &draws{m: m, k: math.NaN(), size: math.Inf(1)}
	worst := 0.0
	for _, s := range summaries {
		out.size = math.Min(out.size, s.BulkESS)
		worst = math.Max(worst, s.RHat)
	}
	total := w.Chains * w.Length
	every := max(1, total/20_000)
	for i := 0; i < total; i += every {
		p := w.X[i*len(parameters) : (i+1)*len(parameters)]
		out.z = append(out.z, p[:m]...)
		g := 0
		if f != nil {
			for g+1 < len(nodes) && p[m] > (nodes[g].logTau+nodes[g+1].logTau)/2 {
				g++
			}
		}
		out.node = append(out.node, g)
		out.density = append(out.density, w.LogDensity[i])
	}
	out.logWeight = make([]float64, len(out.node))
	for i := range out.logWeight {
		out.logWeight[i] = -math.Log(float64(len(out.node)))
	}
	return out, worst, nil
}

// walkStream is part of the seed of the walkers' starts.
const walkStream = 0x77616c6b
