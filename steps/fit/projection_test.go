package fit

import (
	"math"
	"testing"

	"rimlight/steps/lightcurve"
)

// posed is a scene's white light curve as an objective, at the starts of the fit.
func posed(t testing.TB, s scene, model Model) (*objective, [][slots]float64) {
	t.Helper()
	if err := model.check(); err != nil {
		t.Fatal(err)
	}
	space := newSpace(model)
	if _, err := space.apply(model.White, model.Trend.Settling); err != nil {
		t.Fatal(err)
	}
	m, err := newObjective(lightcurve.Curves(s.cube)[0], model, space, nil)
	if err != nil {
		t.Fatal(err)
	}
	if err := m.search(); err != nil {
		t.Fatal(err)
	}
	return m, m.starts()
}

// searches runs the optimiser from each start, in all elements jointly or by
// variable projection, and returns the sums of squares and the iterations.
func searches(m *objective, starts [][slots]float64, joint bool) (sums []float64, steps int) {
	for _, v := range starts {
		var x []float64
		for _, slot := range m.space.free {
			x = append(x, v[slot])
		}
		p := m.projected()
		if joint {
			coefficients, _, err := m.solveTrend(&v)
			if err != nil {
				continue
			}
			x = append(x, coefficients...)
			p = m.problem(m.size(), m.residuals)
		}
		got := p.solve(x)
		sums, steps = append(sums, got.sum), steps+got.steps
	}
	return sums, steps
}

// TestProjectionAgrees compares variable projection with the joint search: from
// several starts of many scenes, it must find as low a minimum, in fewer iterations.
func TestProjectionAgrees(t *testing.T) {
	var worse, better, stepsJoint, stepsProjected, all int
	for seed := range uint64(12) {
		s := newScene(t, 300+seed, 400, 1)
		m, starts := posed(t, s, withWhite(s.model(), whitePriors()))
		a, n := searches(m, starts, true)
		b, k := searches(m, starts, false)
		stepsJoint, stepsProjected = stepsJoint+n, stepsProjected+k
		for i := range a {
			all++
			if b[i] > a[i]+1e-3 {
				worse++
			}
			if b[i] < a[i]-1e-3 {
				better++
			}
		}
		best := func(x []float64) float64 {
			least := math.Inf(1)
			for _, v := range x {
				least = min(least, v)
			}
			return least
		}
		if best(b) > best(a)+1e-4 {
			t.Errorf("seed %d: minima %.6f jointly and %.6f projected", seed, best(a), best(b))
		}
	}
	t.Logf("%d searches: %d iterations jointly, %d projected; projected better in %d, worse in %d", all, stepsJoint, stepsProjected, better, worse)
	if stepsProjected > stepsJoint || worse > better+2 {
		t.Error("variable projection does not pay")
	}
}

// TestProjectedJacobian compares the derivatives of the projected residuals with
// differences near the minimum, where what they leave out is small.
func TestProjectedJacobian(t *testing.T) {
	s := newScene(t, 311, 300, 1)
	m, starts := posed(t, s, withWhite(s.model(), append(whitePriors(), Prior{Name: "trend.X", Kind: Normal, A: 0, B: 1e-4})))
	got, err := m.best(starts)
	if err != nil {
		t.Fatal(err)
	}
	x := got.x[:m.leading()]
	res, jac := make([]float64, m.rows()), columns(len(x), m.rows())
	if !m.projectedResiduals(x, res, jac) {
		t.Fatal("not finite")
	}
	for k := range x {
		// The slope of half the sum of squares is exact in spite of what is left out.
		sum := func(h float64) float64 {
			at := append([]float64(nil), x...)
			at[k] += h
			r := make([]float64, m.rows())
			m.projectedResiduals(at, r, nil)
			total := 0.0
			for _, v := range r {
				total += v * v / 2
			}
			return total
		}
		sd := math.Sqrt(1 / dot(jac[k], jac[k]))
		h := 0.01 * sd
		at := append([]float64(nil), x...)
		at[k] += sd
		if !m.projectedResiduals(at, res, jac) {
			t.Fatal("not finite")
		}
		want := (sum(sd+h) - sum(sd-h)) / (2 * h)
		if slope := dot(jac[k], res); math.Abs(slope-want) > 0.02*math.Abs(want)+1e-3/sd {
			t.Errorf("element %d: slope %g, want %g", k, slope, want)
		}
	}
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, x := range a {
		sum += x * b[i]
	}
	return sum
}

// BenchmarkSearch compares the two ways.
func BenchmarkSearch(b *testing.B) {
	s := newScene(b, 27, 6000, 1)
	for _, name := range []string{"joint", "projected"} {
		m, starts := posed(b, s, withWhite(s.model(), whitePriors()))
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				searches(m, starts[:1], name == "joint")
			}
		})
	}
}
