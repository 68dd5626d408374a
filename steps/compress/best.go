package compress

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/limb"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
)

// best describes the mode, and the response of the radius ratio to wrong geometry.
func (c *channel) best(out *Posterior, f *fitted, directions [][7]float64) error {
	top := f.nodes[0]
	for _, n := range f.nodes {
		if n.logMass > top.logMass {
			top = n
		}
	}
	c.target.parameters.at(c.target.law, c.target.free, top.mode, true, &c.target.at)
	out.Radius, out.Limb, out.Settling = c.target.at.r, c.target.at.u, math.NaN()
	out.Free = len(c.target.free) + len(c.stars)
	if f.family != nil {
		out.Settling = math.Exp(top.logTau)
		out.Free++
	}
	flux, gradient, err := transit.CurveGradient(c.star.Times, c.params(out.Radius, out.Limb))
	if err != nil {
		return err
	}
	columns := c.design(top.logTau)
	trend, err := c.solve(out, flux, columns)
	if err != nil {
		return err
	}
	if len(directions) == 0 {
		return nil
	}
	return c.respond(out, flux, gradient, columns, trend, directions)
}

// params are the arguments of the light curve.
func (c *channel) params(r float64, u [2]float64) transit.Params {
	law := limb.Law{Name: c.law.name, Coefficients: append([]float64(nil), u[:c.law.count]...)}
	return transit.Params{Orbit: c.star.Orbit, RadiusRatio: r, Law: law, Exposure: c.star.Exposure, Companion: c.star.Companion}
}

// solve finds the coefficients of the trend, and returns what multiplies the flux of the
// transit.
func (c *channel) solve(out *Posterior, flux []float64, columns [][]float64) (multiplied []float64, err error) {
	p := len(columns)
	g := c.products(flux, columns)
	if _, _, ok := factorise(g, p); !ok {
		return nil, errIndefinite
	}
	out.Coefficients = make([]float64, p)
	solved(g, p, out.Coefficients, nil)
	out.Coefficients[0]++
	multiplied = make([]float64, len(flux))
	model := make([]float64, len(flux))
	for j, column := range columns {
		if c.stars[j] {
			floats.AddScaled(multiplied, out.Coefficients[j], column)
		} else {
			floats.AddScaled(model, out.Coefficients[j], column)
		}
	}
	for i, w := range c.weight {
		if w == 0 {
			continue
		}
		x := c.residual[i] + 1 - model[i] - multiplied[i]*flux[i]
		out.Chi2 += w * x * x
		out.Scatter += x * x
	}
	out.Scatter = math.Sqrt(out.Scatter/float64(max(1, c.used-out.Free))) / out.Coefficients[0]
	return multiplied, nil
}

// respond computes how the radius ratio of the best fit moves, to first order, when the
// geometry it is fitted with does: -(JᵀWJ + P)⁻¹ JᵀW J_g, J the derivatives of the model
// in all that is free, P the precisions of priors, J_g those in the geometry.
func (c *channel) respond(out *Posterior, flux []float64, gradient, columns [][]float64, trend []float64, directions [][7]float64) error {
	const orbital = 6
	n := len(flux)
	var jacobian [][]float64
	var precision []float64
	add := func(column []float64, prior float64) {
		jacobian, precision = append(jacobian, column), append(precision, prior)
	}
	multiply := func(a, b []float64) []float64 { return floats.MulTo(make([]float64, n), a, b) }
	at := &c.target.at
	for _, k := range c.target.free {
		// In coordinates, whose prior is standard normal.
		column := make([]float64, n)
		if k == 0 {
			floats.AddScaled(column, at.byZ[0], gradient[orbital])
		} else {
			for i := range c.law.count {
				floats.AddScaled(column, at.mix[i][k-1]*at.byZ[k], gradient[orbital+1+i])
			}
		}
		add(multiply(column, trend), 1+at.bend[k])
	}
	var slope []float64 // of the model in the settling time
	held := c.trend.Settling && c.family == nil
	if c.trend.Settling {
		tau := out.Settling
		if held {
			tau, _ = c.trend.settlingRange()
		}
		slope = systematics.SettleDerivative(c.star.Times, c.trend.Start, tau)
		last := len(columns) - 1
		floats.Scale(out.Coefficients[last], slope)
		if c.stars[last] {
			floats.Mul(slope, flux)
		}
		if !held {
			scaled := append([]float64(nil), slope...)
			floats.Scale(tau, scaled)
			lo, hi := c.trend.settlingRange()
			width := math.Log(hi / lo)
			add(scaled, 12/(width*width))
		}
	}
	given := make([]float64, len(columns))
	for _, prior := range c.priors {
		given[prior.Column] = 1 / (prior.SD * prior.SD)
	}
	for j, column := range columns {
		if c.stars[j] {
			column = multiply(column, flux)
		}
		add(column, given[j])
	}
	m := len(jacobian)
	matrix, weighted := make([]float64, pairs(m)), make([]float64, n)
	for j := range m {
		floats.MulTo(weighted, jacobian[j], c.weight)
		for k := range j + 1 {
			matrix[pairs(j)+k] = floats.Dot(weighted, jacobian[k])
		}
		matrix[pairs(j)+j] += precision[j]
	}
	factor, right := make([]float64, pairs(m)), make([]float64, m)
	if damped(factor, matrix, 0, m) != nil {
		return errIndefinite
	}
	change := make([]float64, n)
	for _, direction := range directions {
		clear(change)
		for k := range orbital {
			if direction[k] != 0 {
				floats.AddScaled(change, direction[k], gradient[k])
			}
		}
		floats.Mul(change, trend)
		if held {
			floats.AddScaled(change, direction[orbital], slope)
		}
		floats.MulTo(weighted, change, c.weight)
		for j := range m {
			right[j] = -floats.Dot(weighted, jacobian[j])
		}
		solveLower(factor, m, right, right)
		solveUpper(factor, m, right)
		out.Shift = append(out.Shift, right[0]*at.byZ[0])
	}
	return nil
}

// Model is a light curve at given parameters: the flux of the transit, and what
// multiplies it and adds to it that goes best with that, relative to level.
func (s *Shared) Model(curve *Curve, radius float64, u [2]float64, settling float64) (flux, trend, added []float64, level float64, err error) {
	c, err := newChannel(s, curve, false)
	if err != nil {
		return nil, nil, nil, 0, err
	}
	if flux, err = transit.Curve(s.star.Times, c.params(radius, u)); err != nil {
		return nil, nil, nil, 0, err
	}
	columns := c.design(math.Log(settling))
	out := &Posterior{}
	if _, err := c.solve(out, flux, columns); err != nil {
		return nil, nil, nil, 0, err
	}
	trend, added = make([]float64, len(flux)), make([]float64, len(flux))
	for j, column := range columns {
		to := added
		if s.stars[j] {
			to = trend
		}
		floats.AddScaled(to, out.Coefficients[j]/out.Coefficients[0], column)
	}
	return flux, trend, added, c.level * out.Coefficients[0], nil
}
