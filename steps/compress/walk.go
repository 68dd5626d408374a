package compress

import (
	"math"
	"math/rand/v2"
	"slices"

	"rimlight/steps/chain"
	"rimlight/steps/sample"
)

const (
	walkers    = 40
	walkWarmUp = 500
	walkDraws  = 3000
	walkThin   = 2
	mostRHat   = 1.02 // of walkers that have met
)

// walk samples the posterior by an ensemble of walkers that begin at draws of importance
// sampling. A settling time is anywhere in the cell of a node, whose density it has.
func (c *channel) walk(d *draws, at *fitted, seed uint64, stream int) (*draws, float64, error) {
	m, nodes, x, f := d.m, at.nodes, &at.extent, at.family
	parameters := make([]sample.Parameter, 0, m+1)
	for k := range m {
		parameters = append(parameters, sample.Parameter{Name: string(rune('a' + k))})
	}
	if f != nil {
		parameters = append(parameters, sample.Parameter{Name: "tau", Lo: x.tauLo, Hi: x.tauHi})
	}
	edges := cells(at)
	value := func(p []float64) float64 {
		if f == nil {
			return c.target.value(nodes[0], p)
		}
		g := cell(edges, p[m])
		return c.target.value(nodes[g], p[:m]) + nodes[g].logWeight - math.Log(edges[g+1]-edges[g])
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
				g := d.node[i]
				p = append(p, edges[g]+(edges[g+1]-edges[g])*(0.01+0.98*rng.Float64()))
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
			g = cell(edges, p[m])
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

// cell is the one that ln τ lies in.
func cell(edges []float64, logTau float64) int {
	g, _ := slices.BinarySearch(edges, logTau)
	return min(max(g-1, 0), len(edges)-2)
}

// walkStream is part of the seed of the walkers' starts.
const walkStream = 0x77616c6b
