package compress

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"rimlight/steps/chain"
	"rimlight/steps/systematics"
)

// TestSlopes holds derivatives of the log density against differences of it.
func TestSlopes(t *testing.T) {
	for _, name := range []string{"plain", "added", "unequal", "given", "root", "logarithm", "linear", "eccentric"} {
		for _, scale := range []bool{false, true} {
			s := scenes()[name]
			s.n = 500
			if name == "given" {
				s.parameters.Radius = Prior{Kind: TruncatedNormal, A: 0.1, B: 0.01, Lo: 0, Hi: 0.2}
				s.parameters.Limb = [2]Prior{{Kind: Normal, A: 0.3, B: 0.1}, {Kind: LogUniform, A: 0.01, B: 1}}
			}
			shared, curve := s.make(t, 0)
			c, err := newChannel(shared, curve, scale)
			if err != nil {
				t.Fatal(err)
			}
			x, err := c.locate()
			if err != nil {
				t.Fatal(err)
			}
			f, err := c.refine(x)
			if err != nil {
				t.Fatal(err)
			}
			n := f.nodes[0]
			m := len(c.target.free)
			z := append([]float64(nil), n.mode...)
			gradient, curvature := make([]float64, m), make([]float64, pairs(m))
			for k := range z { // off the mode by a part of a standard deviation
				z[k] += 0.3 * math.Sqrt(n.variance[k]) * float64(1-2*(k%2))
			}
			value := c.target.slopes(n, z, gradient, curvature)
			if again := c.target.value(n, z); again != value {
				t.Errorf("%s: value %.17g beside slopes, %.17g alone", name, value, again)
			}
			for k := range z {
				h := 1e-3 * math.Sqrt(n.variance[k])
				at := z[k]
				z[k] = at + h
				up := c.target.value(n, z)
				z[k] = at - h
				down := c.target.value(n, z)
				z[k] = at
				sd := math.Sqrt(n.variance[k])
				if got, want := gradient[k]*sd, (up-down)/(2*h)*sd; math.Abs(got-want) > 1e-4*(1+math.Abs(want)) {
					t.Errorf("%s, scale %v: slope %d is %g per standard deviation, want %g", name, scale, k, got, want)
				}
				if bend := (up + down - 2*value) / (h * h) * sd * sd; math.Abs(curvature[packed(k, k)]*sd*sd+bend) > 0.1*math.Abs(bend)+0.1 {
					t.Errorf("%s, scale %v: curvature %d is %g, want %g", name, scale, k, curvature[packed(k, k)]*sd*sd, -bend)
				}
			}
		}
	}
}

// TestFactorise compares with a general library.
func TestFactorise(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const p = 4
	a := mat.NewDense(9, p+1, nil)
	for i := range 9 {
		for j := range p + 1 {
			a.Set(i, j, rng.NormFloat64())
		}
	}
	var full mat.Dense
	full.Mul(a.T(), a)
	g := make([]float64, pairs(p+1))
	square := mat.NewSymDense(p, nil)
	right := mat.NewVecDense(p, nil)
	for j := range p + 1 {
		for k := range j + 1 {
			g[pairs(j)+k] = full.At(j, k)
			if j < p {
				square.SetSym(j, k, full.At(j, k))
			}
		}
	}
	for j := range p {
		right.SetVec(j, full.At(p, j))
	}
	var chol mat.Cholesky
	if !chol.Factorize(square) {
		t.Fatal("not positive definite")
	}
	var x mat.VecDense
	if err := chol.SolveVecTo(&x, right); err != nil {
		t.Fatal(err)
	}
	var inverse mat.SymDense
	if err := chol.InverseTo(&inverse); err != nil {
		t.Fatal(err)
	}
	chi2, logDet, ok := factorise(g, p)
	if !ok || math.Abs(chi2-(full.At(p, p)-mat.Dot(&x, right))) > 1e-12 || math.Abs(logDet-chol.LogDet()) > 1e-12 {
		t.Errorf("chi-square %g, log determinant %g, want %g, %g", chi2, logDet, full.At(p, p)-mat.Dot(&x, right), chol.LogDet())
	}
	s, packedInverse := make([]float64, p), make([]float64, pairs(p))
	solved(g, p, s, packedInverse)
	for j := range p {
		if math.Abs(s[j]-x.AtVec(j)) > 1e-12 {
			t.Errorf("solution %d is %g, want %g", j, s[j], x.AtVec(j))
		}
		for k := range j + 1 {
			if math.Abs(packedInverse[pairs(j)+k]-inverse.At(j, k)) > 1e-12 {
				t.Errorf("inverse (%d, %d) is %g, want %g", j, k, packedInverse[pairs(j)+k], inverse.At(j, k))
			}
		}
	}
	if _, _, ok := factorise([]float64{0, 1, 1}, 1); ok {
		t.Error("a matrix that is not positive definite was factorised")
	}
}

// TestFamily holds exponentials against what a family makes of them.
func TestFamily(t *testing.T) {
	times := make([]float64, 400)
	for i := range times {
		times[i] = 7 + 0.25*float64(i)/400
	}
	whole := newFamily(times, 7, math.Log(0.002), math.Log(0.2))
	part := whole.narrow(math.Log(0.015), math.Log(0.03), rare)
	if len(part.columns) >= len(whole.columns) || len(whole.columns) > 20 {
		t.Errorf("%d columns of %d", len(part.columns), len(whole.columns))
	}
	for _, test := range []struct {
		f   *family
		tau float64
	}{{whole, 0.002}, {whole, 0.0051}, {whole, 0.033}, {whole, 0.2}, {part, 0.0151}, {part, 0.02}, {part, 0.03}} {
		c := make([]float64, len(test.f.columns))
		test.f.combine(math.Log(test.tau), c)
		for i, want := range systematics.Settle(times, 7, test.tau) {
			got := 0.0
			for m, column := range test.f.columns {
				got += c[m] * column[i]
			}
			if math.Abs(got-want) > 1e-4 {
				t.Fatalf("tau %g, time %d: %g, want %g", test.tau, i, got, want)
			}
		}
	}
}

// TestSummarise compares with package chain.
func TestSummarise(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 1))
	var all []draw
	var x, logWeight []float64
	sum := 0.0
	for range 500 {
		w := rng.Float64()
		all = append(all, draw{rng.NormFloat64(), w})
		sum += w
	}
	for i := range all {
		all[i].weight /= sum
		x, logWeight = append(x, all[i].x), append(logWeight, math.Log(all[i].weight))
	}
	m := summarise("x", all)
	for k, p := range Levels() {
		want, err := chain.WeightedQuantile(x, logWeight, p)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(m.Quantiles[k]-want) > 1e-12 {
			t.Errorf("quantile at %g is %g, want %g", p, m.Quantiles[k], want)
		}
	}
}

// TestPriors holds coordinates against their inverse, and derivatives against differences.
func TestPriors(t *testing.T) {
	for _, p := range []Prior{{Kind: Uniform, A: -1, B: 3}, {Kind: LogUniform, A: 0.01, B: 2}, {Kind: Normal, A: 0.4, B: 0.2},
		{Kind: TruncatedNormal, A: 0.1, B: 0.3, Lo: 0, Hi: 10}, {Kind: TruncatedNormal, A: -5, B: 0.3, Lo: 0, Hi: 1}} {
		for _, z := range []float64{-2.5, -0.4, 0, 1.3} {
			const h = 1e-5
			x, by, extra, slope, _ := p.value(z, true)
			if back := p.coordinate(x); math.Abs(back-z) > 1e-6 {
				t.Errorf("%+v: z = %g comes back as %g", p, z, back)
			}
			up, _, extraUp, _, _ := p.value(z+h, true)
			down, _, extraDown, _, _ := p.value(z-h, true)
			if d := (up - down) / (2 * h); math.Abs(d-by) > 1e-6*math.Abs(by)+1e-9 {
				t.Errorf("%+v at %g: derivative %g, want %g", p, z, by, d)
			}
			if d := (extraUp - extraDown) / (2 * h); math.Abs(d-slope) > 1e-5*math.Abs(slope)+1e-7 {
				t.Errorf("%+v at %g: slope of %g is %g, want %g", p, z, extra, slope, d)
			}
		}
	}
}
