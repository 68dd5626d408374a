package compress

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/limb"
)

// TestFarStart starts far from the radius ratio, and has planets that are not seen.
func TestFarStart(t *testing.T) {
	for _, test := range []struct{ r, noise float64 }{{0.2, 5e-4}, {0.35, 5e-4}, {0.04, 5e-4}, {0.06, 5e-4}, {0.02, 2e-3}, {0, 1e-3}} {
		s := scene{n: 800, r: test.r, b: 0.3, u: [2]float64{0.3, 0.2}, noise: test.noise, slope: true, seed: 4,
			parameters: Parameters{Radius: Prior{Kind: Uniform, A: 0.001, B: 0.5}, Square: true,
				Limb: [2]Prior{{Kind: Uniform, A: 0, B: 1}, {Kind: Uniform, A: 0, B: 1}}}}
		shared, curve := s.make(t, 0) // starts at 0.1
		p, err := shared.Posterior(curve, Settings{Effective: 1000, Compare: 50, Seed: 1})
		if err != nil {
			t.Errorf("r = %g: %v", test.r, err)
			continue
		}
		q := p.Marginals[0]
		if test.r >= 0.04 && math.Abs(q.Mean-test.r) > 4*q.SD {
			t.Errorf("r = %g: %.5g ± %.2g", test.r, q.Mean, q.SD)
		}
		if test.r < 0.04 && !(q.Quantiles[4] < 0.06) {
			t.Errorf("a planet of %g, unseen: below %g", test.r, q.Quantiles[4])
		}
		if !p.Mixed || !(p.Compared.SD < 0.05) || p.Edge > mostEdge {
			t.Errorf("r = %g: %+v", test.r, p)
		}
		t.Logf("r = %g: %.5g ± %.2g, by %s, k-hat %.2f, %d tables, error %.3f, sd %.4f", test.r, q.Mean, q.SD, p.By, p.K, p.Tables, p.Error, p.Compared.SD)
	}
}

func TestErrors(t *testing.T) {
	s := scenes()["settling"]
	star := s.star()
	trend := s.trend(star)
	power, short, none := star, trend, trend
	power.Law = limb.Power2
	short.Columns = [][]float64{{1}}
	none.Settle = Prior{Kind: Uniform, A: 2, B: 1}
	for _, test := range []struct {
		star  Star
		trend Trend
		want  string
	}{
		{power, trend, "not linear"}, {star, Trend{}, "without columns"}, {star, short, "has 1 values"}, {star, none, "settling times from"},
	} {
		if _, err := NewShared(test.star, test.trend); err == nil || !strings.Contains(err.Error(), test.want) {
			t.Errorf("error %v, want %q", err, test.want)
		}
	}
	shared, curve := s.make(t, 0)
	dark := *curve
	dark.Flux = make([]float64, len(curve.Flux))
	if _, err := shared.Posterior(&dark, Settings{Effective: 100}); err == nil || !strings.Contains(err.Error(), "no starlight") {
		t.Errorf("a dark star: %v", err)
	}
	masked := *curve
	masked.Used = make([]bool, len(curve.Used))
	if _, err := shared.Posterior(&masked, Settings{Effective: 100}); err == nil {
		t.Error("no samples: no error")
	}
}
