package compress

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// design is the columns of the trend at a settling time.
func (c *channel) design(logTau float64) [][]float64 {
	columns := append([][]float64(nil), c.columns[:c.fixed]...)
	if c.family != nil {
		columns = append(columns, systematics.Settle(c.star.Times, c.trend.Start, math.Exp(logTau)))
	}
	return columns
}

// products is the packed matrix of the model's columns and the residual, computed from
// all samples without tables.
func (c *channel) products(flux []float64, columns [][]float64) []float64 {
	p, n := len(columns), len(flux)
	all := make([][]float64, p+1)
	for j, column := range columns {
		all[j] = column
		if c.stars[j] {
			all[j] = floats.MulTo(make([]float64, n), column, flux)
		}
	}
	residual := make([]float64, n)
	for i := range residual {
		residual[i] = c.residual[i] + (1-flux[i])*columns[0][i]
	}
	all[p] = residual
	g := make([]float64, pairs(p+1))
	weighted := make([]float64, n)
	for j := range all {
		floats.MulTo(weighted, all[j], c.weight)
		for k := range j + 1 {
			g[pairs(j)+k] = floats.Dot(weighted, all[k])
		}
	}
	last := pairs(p)
	for _, prior := range c.priors {
		j, w, mean := prior.Column, 1/(prior.SD*prior.SD), prior.Mean
		if j == 0 {
			mean--
		}
		g[pairs(j)+j] += w
		g[last+j] += w * mean
		g[last+p] += w * mean * mean
	}
	return g
}

// exact is the log density of draw i, without tables.
func (c *channel) exact(n *node, z []float64) (float64, error) {
	c.target.parameters.at(c.target.law, c.target.free, z, false, &c.target.at)
	at := c.target.at
	flux, err := transit.Curve(c.star.Times, c.params(at.r, at.u))
	if err != nil {
		return math.Inf(-1), nil // a star without light
	}
	columns := c.design(n.logTau)
	chi2, logDet, ok := factorise(c.products(flux, columns), len(columns))
	if !ok {
		return math.Inf(-1), nil
	}
	return c.target.density(chi2, logDet, z), nil
}

// A Comparison holds draws against the likelihood without tables.
type Comparison struct {
	Draws int     // looked at
	SD    float64 // standard deviation of the difference of log likelihoods
	Shift float64 // by which the exact likelihood moves the mean radius ratio, in its standard deviations
	Ratio float64 // by which it multiplies that standard deviation
}

// compare evaluates the exact likelihood at some draws, spread over all by their weight.
func (c *channel) compare(d *draws, nodes []*node, count int) (Comparison, error) {
	var diff, r []float64
	cumulative, next := 0.0, 0.5
	for i, lw := range d.logWeight {
		cumulative += math.Exp(lw) * float64(count)
		if !(cumulative > next) {
			continue
		}
		next = math.Floor(cumulative-0.5) + 1.5
		n, z := nodes[d.node[i]], d.z[i*d.m:(i+1)*d.m]
		exact, err := c.exact(n, z)
		if err != nil {
			return Comparison{}, err
		}
		r = append(r, c.target.at.r)
		diff = append(diff, exact-c.target.value(n, z))
	}
	out := Comparison{Draws: len(diff)}
	mean := floats.Sum(diff) / float64(len(diff))
	var weight, sum, square, plainSum, plainSquare float64
	for i, x := range diff {
		out.SD += (x - mean) * (x - mean) / float64(len(diff))
		w := math.Exp(x - mean)
		weight += w
		sum += w * r[i]
		plainSum += r[i] / float64(len(diff))
	}
	for i, x := range diff {
		w := math.Exp(x-mean) / weight
		square += w * (r[i] - sum/weight) * (r[i] - sum/weight)
		plainSquare += (r[i] - plainSum) * (r[i] - plainSum) / float64(len(diff))
	}
	out.SD = math.Sqrt(out.SD)
	out.Shift = (sum/weight - plainSum) / math.Sqrt(plainSquare)
	out.Ratio = math.Sqrt(square / plainSquare)
	return out, nil
}
