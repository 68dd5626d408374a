package sample

import (
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/chain"
)

func TestEnsembleNormal(t *testing.T) {
	target := newNormalTarget(5)
	for _, share := range []float64{0, 0.5} {
		d, err := Ensemble(numbered(5, 0, 0), target.density, target.starts(t, 32), EnsembleSettings{Seed: 1, WarmUp: 1000, Draws: 1000, Thin: 4, Differential: share})
		if err != nil {
			t.Fatal(err)
		}
		sound(t, d)
		var moments []moment
		for k := range 5 {
			z := func(x []float64) float64 { return (x[k] - target.mean[k]) / target.sd[k] }
			moments = append(moments, moment{fmt.Sprint("mean ", k), z, 0}, moment{fmt.Sprint("variance ", k), func(x []float64) float64 { return z(x) * z(x) }, 1})
		}
		holds(t, d, moments...)
		t.Logf("differential %g: %d evaluations, draws worth %.0f, acceptance %.2f", share, d.Evaluations, leastSize(t, d), d.Acceptance[0])
	}
}

func TestEnsembleShapes(t *testing.T) {
	start, err := Around(unbounded("x", "y"), []float64{0, 1}, []float64{1, 1}, 20, 1)
	if err != nil {
		t.Fatal(err)
	}
	d, err := Ensemble(unbounded("x", "y"), func(x []float64) float64 { return banana(x, nil) }, start, EnsembleSettings{Seed: 2, Draws: 4000, Thin: 3})
	if err != nil {
		t.Fatal(err)
	}
	sound(t, d)
	holds(t, d,
		moment{"x", func(x []float64) float64 { return x[0] }, 0}, moment{"x²", func(x []float64) float64 { return x[0] * x[0] }, 1},
		moment{"y", func(x []float64) float64 { return x[1] }, 1}, moment{"y²", func(x []float64) float64 { return x[1] * x[1] }, 4})

	start, err = Around(truncated, []float64{0.5, 1.5, -3}, []float64{0.3, 0.5, 1}, 24, 1)
	if err != nil {
		t.Fatal(err)
	}
	d, err = Ensemble(truncated, func(x []float64) float64 { return truncatedDensity(x, nil) }, start, EnsembleSettings{Seed: 2, Draws: 2000, Thin: 3, Differential: 0.3})
	if err != nil {
		t.Fatal(err)
	}
	sound(t, d)
	holds(t, d, truncatedMoments()...)
	for i, x := range d.X {
		if !truncated[i%3].inside(x) {
			t.Fatalf("draw %g of %s", x, truncated[i%3].Name)
		}
	}
}

// The errors claimed of the mean of all walkers are those made, although walkers
// are not independent chains.
func TestEnsembleErrors(t *testing.T) {
	const trials = 150
	square := 0.0
	for seed := range uint64(trials) {
		target := newNormalTarget(2)
		start, err := Around(numbered(2, 0, 0), target.mean, target.sd, 10, seed)
		if err != nil {
			t.Fatal(err)
		}
		d, err := Ensemble(numbered(2, 0, 0), target.density, start, EnsembleSettings{Seed: seed, WarmUp: 100, Draws: 500})
		if err != nil {
			t.Fatal(err)
		}
		s, err := chain.Summaries(d)
		if err != nil {
			t.Fatal(err)
		}
		z := (s[1].Mean - target.mean[1]) / s[1].MeanError
		square += z * z / trials
	}
	// The mean of 150 squares of normal numbers scatters by 0.12.
	if square < 0.6 || square > 1.5 {
		t.Errorf("mean square error of the mean is %.2f of that claimed", square)
	}
}

// Linear changes of the parameters change nothing.
func TestEnsembleAffine(t *testing.T) {
	target := normalTarget{mean: []float64{0, 0}, sd: []float64{1 << 20, 1.0 / 1024}, rho: 0.9} // powers of 2 round nothing
	unit := normalTarget{mean: []float64{0, 0}, sd: []float64{1, 1}, rho: 0.9}
	start := unit.starts(t, 8)
	mapped := make([][]float64, len(start))
	for w, x := range start {
		mapped[w] = []float64{target.sd[0] * x[0], target.sd[1] * x[1]}
	}
	settings := EnsembleSettings{Seed: 3, WarmUp: 50, Draws: 200, Differential: 0.3}
	a, err := Ensemble(numbered(2, 0, 0), unit.density, start, settings)
	if err != nil {
		t.Fatal(err)
	}
	b, err := Ensemble(numbered(2, 0, 0), target.density, mapped, settings)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(a.Acceptance, b.Acceptance) {
		t.Error("other moves were accepted after a change of scale")
	}
	for i, x := range a.X {
		if y := b.X[i] / target.sd[i%2]; x != y {
			t.Fatalf("draw %d: %g, and %g after a change of scale", i/2, x, y)
		}
	}
	again, err := Ensemble(numbered(2, 0, 0), unit.density, start, settings)
	if err != nil || !reflect.DeepEqual(a, again) {
		t.Errorf("the same seed gave other draws, %v", err)
	}
}

func TestEnsembleRefused(t *testing.T) {
	f := func(x []float64) float64 { return 0 }
	good := [][]float64{{0.1, 0.2}, {0.3, 0.1}, {0.5, 0.9}, {0.7, 0.3}, {0.2, 0.2}, {0.6, 0.5}}
	line := [][]float64{{0.1, 0.1}, {0.3, 0.3}, {0.5, 0.5}, {0.7, 0.7}, {0.2, 0.2}, {0.6, 0.6}}
	for name, tc := range map[string]struct {
		f        func(x []float64) float64
		start    [][]float64
		settings EnsembleSettings
		want     string
	}{
		"nil":        {nil, good, EnsembleSettings{}, "nil"},
		"few":        {f, good[:4], EnsembleSettings{}, "walkers"},
		"odd":        {f, append(good[:6:6], good[0]), EnsembleSettings{}, "even"},
		"line":       {f, line, EnsembleSettings{}, "plane"},
		"outside":    {f, append(line[:5:5], []float64{2, 2}), EnsembleSettings{}, "walker 6"},
		"no density": {func(x []float64) float64 { return math.Inf(-1) }, good, EnsembleSettings{}, "walker 1: the target has no density"},
		"share":      {f, good, EnsembleSettings{Differential: 2}, "share"},
		"much":       {f, good, EnsembleSettings{Draws: 1e6, Thin: 1e6}, "altogether"},
	} {
		if _, err := Ensemble(numbered(2, 0, 1), tc.f, tc.start, tc.settings); err == nil || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
}
