package noise

import (
	"math"
	"testing"
)

// Colour undoes Whiten, L Lᵀ is K by definition, and Draw gives the same numbers for
// the same seed.
func TestColour(t *testing.T) {
	data, residual := irregular(300)
	for _, m := range benchModels {
		for _, dense := range []bool{false, true} {
			c, err := newProcess(t, m.model, data, dense).At(m.values)
			if err != nil {
				t.Fatal(err)
			}
			white, err := c.Whiten([][]float64{residual, data.Err})
			if err != nil {
				t.Fatal(err)
			}
			back, err := c.Colour(white)
			if err != nil {
				t.Fatal(err)
			}
			for i := range residual {
				near(t, m.name, back[0][i], residual[i], 1e-4, 1e-12)
				near(t, m.name, back[1][i], data.Err[i], 1e-4, 1e-12)
			}
			one, _ := c.Draw(5)
			two, _ := c.Draw(5)
			three, _ := c.Draw(6)
			if one[7] != two[7] || one[7] == three[7] {
				t.Error("seeds do not tell draws apart")
			}
		}
	}
}

// The fast and the dense way agree with each other for random parameters over many
// decades, gradients included.
func TestFastAgainstDense(t *testing.T) {
	data, residual := irregular(120)
	rng := newRand()
	for trial := range 200 {
		m := benchModels[trial%len(benchModels)]
		values := append([]float64(nil), m.values...)
		for k := range values {
			values[k] *= math.Exp(1.5 * rng.NormFloat64())
		}
		fast, err := newProcess(t, m.model, data, false).Gradient(values, residual)
		if err != nil {
			t.Fatal(err)
		}
		dense, err := newProcess(t, m.model, data, true).Gradient(values, residual)
		if err != nil {
			t.Fatal(err)
		}
		near(t, m.name, fast.LogLikelihood, dense.LogLikelihood, 1, 1e-10)
		for k := range values {
			near(t, m.name+", gradient", fast.ByLog[k], dense.ByLog[k], 1, 1e-8)
		}
		most := 0.0
		for _, x := range dense.ByVariance {
			most = math.Max(most, math.Abs(x))
		}
		for i := range residual {
			near(t, m.name+", by variance", fast.ByVariance[i], dense.ByVariance[i], most, 1e-9)
		}
	}
}

// Nothing depends on how often, or in which order, working memory was used before.
func TestSameTwice(t *testing.T) {
	data, residual := irregular(200)
	p := newProcess(t, benchModels[4].model, data, false)
	a, err := p.Gradient(benchModels[4].values, residual)
	if err != nil {
		t.Fatal(err)
	}
	other := append([]float64(nil), benchModels[4].values...)
	other[3] *= 2
	if _, err := p.Gradient(other, residual); err != nil {
		t.Fatal(err)
	}
	var b Gradient
	if err := p.GradientInto(&b, benchModels[4].values, residual); err != nil {
		t.Fatal(err)
	}
	for k := range a.ByLog {
		if a.ByLog[k] != b.ByLog[k] {
			t.Errorf("%g, then %g", a.ByLog[k], b.ByLog[k])
		}
	}
}

// Least squares on white noise of unit variance are the ordinary ones; by hand.
func TestLeastSquares(t *testing.T) {
	c, err := newProcess(t, Model{}, Data{Time: even(4), Err: ones(4)}, false).At(nil)
	if err != nil {
		t.Fatal(err)
	}
	f, err := c.LeastSquares([][]float64{{1, 1, 1, 1}, {0, 1, 2, 3}}, []float64{1, 3, 4, 8})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "level", f.Value[0], 0.7, 1, 1e-14)
	near(t, "slope", f.Value[1], 2.2, 1, 1e-14)
	near(t, "variance of the level", f.Cov[0][0], 0.7, 1, 1e-14)
	near(t, "covariance", f.Cov[0][1], -0.3, 1, 1e-14)
	near(t, "variance of the slope", f.Cov[1][1], 0.2, 1, 1e-14)
	near(t, "χ²", f.Chi2, 1.8, 1, 1e-13)
	if f.Dof != 2 {
		t.Error(f.Dof)
	}
	if _, err := c.LeastSquares([][]float64{{1, 1, 1, 1}, {2, 2, 2, 2}}, []float64{1, 3, 4, 8}); err == nil {
		t.Error("columns that are alike were taken")
	}
}
