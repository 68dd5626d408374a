package chain

import (
	"math"
	"slices"
	"strings"
	"testing"

	"rimlight/steps/check"
)

func pair(seed uint64, chains, n int) Draws {
	a, b := autoregressive(seed, 0.2, chains, n), autoregressive(seed+1000, 0.4, chains, n)
	d := Draws{Names: []string{"a", "b"}, Chains: chains, Length: n}
	for i := range a {
		d.X = append(d.X, a[i], a[i]+b[i])
	}
	return d
}

func TestJoin(t *testing.T) {
	a, b := pair(1, 2, 50), pair(2, 1, 50)
	a.Divergent, a.LogDensity, b.LogDensity = make([]bool, 100), make([]float64, 100), make([]float64, 50)
	a.Evaluations, b.Evaluations = 3, 4
	all, err := Join(a, b)
	if err != nil {
		t.Fatal(err)
	}
	if all.Chains != 3 || len(all.LogDensity) != 150 || all.Divergent != nil || all.Evaluations != 7 {
		t.Errorf("joined: %d chains, %d log densities, divergences %v", all.Chains, len(all.LogDensity), all.Divergent)
	}
	column, err := all.Column("b")
	if err != nil {
		t.Fatal(err)
	}
	if column[100] != b.X[1] {
		t.Errorf("first draw of the third chain is %g, want %g", column[100], b.X[1])
	}
	if _, err := all.Column("c"); err == nil || !strings.Contains(err.Error(), `"c"`) {
		t.Errorf("unknown parameter: %v", err)
	}
	b.Names = []string{"a", "c"}
	if _, err := Join(a, b); err == nil {
		t.Error("sets of other parameters were joined")
	}
}

func TestShape(t *testing.T) {
	for name, spoil := range map[string]func(d *Draws){
		"names": func(d *Draws) { d.Names = nil }, "chains": func(d *Draws) { d.Chains = 0 }, "length": func(d *Draws) { d.Length++ },
		"overflow": func(d *Draws) { d.Chains, d.Length = math.MaxInt, math.MaxInt }, "energy": func(d *Draws) { d.Energy = make([]float64, 3) },
		"units": func(d *Draws) { d.Units = []string{"d"} },
	} {
		d := pair(1, 2, 20)
		spoil(&d)
		if d.Check() == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

func TestCovariance(t *testing.T) {
	d := Draws{Names: []string{"a", "b"}, Chains: 1, Length: 3, X: []float64{1, 2, 2, 4, 3, 9}}
	c, err := Covariance(d)
	if err != nil {
		t.Fatal(err)
	}
	// By hand: deviations -1 0 1 and -3 -1 4.
	for i, want := range []float64{1, 3.5, 3.5, 13} {
		near(t, "covariance", c[i/2][i%2], want, 1e-14)
	}
}

func TestChecks(t *testing.T) {
	good := pair(1, 4, 1000)
	good.Divergent, good.Energy = make([]bool, 4000), autoregressive(7, 0.3, 4, 1000)
	if failed := check.Failed(Checks("white light", good)); failed != nil {
		t.Errorf("good chains failed: %+v", failed)
	}
	for name, tc := range map[string]struct {
		spoil func(d *Draws)
		want  string
		count int
	}{
		"apart": {func(d *Draws) {
			for i := range 1000 {
				d.X[2*i+1] += 10
			}
		}, "R-hat", 3},
		"few":       {func(d *Draws) { *d = pair(1, 4, 60) }, "effective sample size", 2},
		"divergent": {func(d *Draws) { d.Divergent[5] = true }, "divergent", 1},
		"energy":    {func(d *Draws) { d.Energy = autoregressive(7, 0.95, 4, 1000) }, "energy", 1},
		"undefined": {func(d *Draws) { d.Undefined = 1 }, "without a density", 1},
		"NaN":       {func(d *Draws) { d.X[3] = math.NaN() }, "R-hat", 1},
		"shape":     {func(d *Draws) { d.X = nil }, "R-hat", 1},
		"stuck": {func(d *Draws) {
			for i := range 4000 {
				d.X[2*i] = 1
			}
		}, "R-hat", 3},
	} {
		d := good
		d.X, d.Divergent = slices.Clone(good.X), slices.Clone(good.Divergent)
		tc.spoil(&d)
		failed := check.Failed(Checks("white light", d))
		if len(failed) < 1 || len(failed) > tc.count || !strings.HasPrefix(failed[0].Name, "white light: ") || !strings.Contains(failed[0].Name, tc.want) {
			t.Errorf("%s: %+v", name, failed)
		}
	}
}

func TestImportanceChecks(t *testing.T) {
	_, good := importance(1, 1.25, 4000)
	if failed := check.Failed(ImportanceChecks("", good)); failed != nil {
		t.Errorf("good ratios failed: %+v", failed)
	}
	_, bad := importance(1, 10, 4000)
	if failed := check.Failed(ImportanceChecks("", bad)); len(failed) == 0 || !strings.Contains(failed[0].Name, "k-hat") {
		t.Errorf("ratios of k = 0.9: %+v", failed)
	}
	if failed := check.Failed(ImportanceChecks("", nil)); len(failed) != 1 {
		t.Errorf("no ratios: %+v", failed)
	}
}

func TestEnergyFraction(t *testing.T) {
	// Of independent energies it is 2, of an autoregressive chain 2 (1 - rho).
	e := append(autoregressive(1, 0, 1, 20000), autoregressive(2, 0.9, 1, 20000)...)
	got, err := EnergyFraction(e, 2)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "independent", got[0], 2, 0.05)
	near(t, "autoregressive", got[1], 0.2, 0.1)
}
