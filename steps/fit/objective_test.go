package fit

import (
	"math"
	"testing"

	"rimlight/steps/lightcurve"
)

// TestJacobian compares the Jacobian of the whole model, priors included, with
// finite differences.
func TestJacobian(t *testing.T) {
	s := newScene(t, 3, 400, 1)
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	model := s.model()
	if err := model.check(); err != nil {
		t.Fatal(err)
	}
	for _, names := range [][3]string{{"inclination", "u1", "u2"}, {"impact", "q1", "q2"}} {
		sp := newSpace(model)
		sp.value[slotLimb1], sp.value[slotLimb2] = 0.3, 0.2
		if _, err := sp.apply(Priors{
			{Name: "midTransitOffset", Kind: Normal, A: 0.001, B: 0.01},
			{Name: names[0], Kind: Normal, A: map[string]float64{"inclination": 87, "impact": 0.4}[names[0]], B: 0.5},
			uniform("axisRatio", 2, 20), uniform("radiusRatio", 0, 1), uniform(names[1], 0, 1),
			{Name: names[2], Kind: TruncatedNormal, A: 0.3, B: 0.2, Lo: 0, Hi: 1}, uniform("settlingTime", 0.001, 0.1),
		}, true); err != nil {
			t.Fatal(err)
		}
		m, err := newObjective(curve, model, sp, nil)
		if err != nil {
			t.Fatal(err)
		}
		coefficients, _, err := m.solveTrend(&sp.value)
		if err != nil {
			t.Fatal(err)
		}
		var x []float64
		for _, slot := range sp.free {
			x = append(x, sp.value[slot])
		}
		x = append(x, coefficients...)
		res, jac := make([]float64, m.rows()), columns(m.size(), m.rows())
		if !m.residuals(x, res, jac) {
			t.Fatal("model failed")
		}
		up, down := make([]float64, m.rows()), make([]float64, m.rows())
		for k := range x {
			h := 1e-5 * max(1e-2, math.Abs(x[k]))
			at := x[k]
			x[k] = at + h
			m.residuals(x, up, nil)
			x[k] = at - h
			m.residuals(x, down, nil)
			x[k] = at
			var worst, largest float64
			for i := range res {
				fd := (up[i] - down[i]) / (2 * h)
				worst, largest = max(worst, math.Abs(fd-jac[k][i])), max(largest, math.Abs(fd))
			}
			// The second derivative jumps at the contacts, so differences are only this good.
			if worst > 3e-3*largest {
				t.Errorf("%v: derivative in element %d off by %g of %g", names, k, worst, largest)
			}
		}
	}
}
