package sample

import (
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/chain"
	"rimlight/steps/check"
)

func TestNUTSNormal(t *testing.T) {
	target := newNormalTarget(20)
	for _, dense := range []bool{false, true} {
		d, err := NUTS(numbered(20, 0, 0), target.gradient, target.starts(t, 4), NUTSSettings{Seed: 1, Dense: dense})
		if err != nil {
			t.Fatal(err)
		}
		sound(t, d)
		var moments []moment
		for k := range 20 {
			z := func(x []float64) float64 { return (x[k] - target.mean[k]) / target.sd[k] }
			moments = append(moments, moment{fmt.Sprint("mean ", k), z, 0}, moment{fmt.Sprint("variance ", k), func(x []float64) float64 { return z(x) * z(x) }, 1})
			if k > 0 {
				before := func(x []float64) float64 { return (x[k-1] - target.mean[k-1]) / target.sd[k-1] }
				moments = append(moments, moment{fmt.Sprint("covariance ", k), func(x []float64) float64 { return z(x) * before(x) }, 0.9})
			}
		}
		holds(t, d, moments...)
		steps := 0
		for _, s := range d.Steps {
			steps += s
		}
		t.Logf("dense %v: %d evaluations, %d of them for %d draws worth %.0f, acceptance %.2f, steps of %.2g",
			dense, d.Evaluations, steps, len(d.Steps), leastSize(t, d), d.Acceptance, d.StepSize)
		for c, a := range d.Acceptance {
			if a < 0.7 || a > 0.95 {
				t.Errorf("dense %v: acceptance of chain %d is %.3f, wanted about 0.8", dense, c, a)
			}
		}
		if limit := map[bool]int{true: 12, false: 40}[dense]; steps > limit*len(d.Steps) {
			t.Errorf("dense %v: %d steps for %d draws; the metric does not fit", dense, steps, len(d.Steps))
		}
	}
}

func TestNUTSShapes(t *testing.T) {
	t.Run("banana", func(t *testing.T) {
		d, err := NUTS(unbounded("x", "y"), banana, [][]float64{{0, 0}, {1, 1}, {-1, 1}, {2, 4}}, NUTSSettings{Seed: 3, Draws: 2000, Acceptance: 0.99})
		if err != nil {
			t.Fatal(err)
		}
		sound(t, d)
		holds(t, d,
			moment{"x", func(x []float64) float64 { return x[0] }, 0}, moment{"x²", func(x []float64) float64 { return x[0] * x[0] }, 1},
			moment{"y", func(x []float64) float64 { return x[1] }, 1}, moment{"y²", func(x []float64) float64 { return x[1] * x[1] }, 4})
	})
	t.Run("truncated", func(t *testing.T) {
		d, err := NUTS(truncated, truncatedDensity, [][]float64{{0.1, 1.1, -2.5}, {0.9, 2, -4}, {0.5, 1.5, -3}, {0.01, 3, -2.01}}, NUTSSettings{Seed: 4})
		if err != nil {
			t.Fatal(err)
		}
		sound(t, d)
		holds(t, d, truncatedMoments()...)
	})
	// A hierarchy: y of standard deviation exp(v/2), v of standard deviation 1. The
	// funnel of Neal (2003) has 3, which no sampler draws from well.
	funnel := func(x, g []float64) float64 {
		v, precision := x[0], math.Exp(-x[0])
		sum := 0.0
		for k, y := range x[1:] {
			sum += y * y
			g[k+1] = -y * precision
		}
		n := float64(len(x) - 1)
		g[0] = -v - n/2 + sum*precision/2
		return -v*v/2 - n*v/2 - sum*precision/2
	}
	t.Run("funnel", func(t *testing.T) {
		start, err := Around(numbered(4, 0, 0), make([]float64, 4), []float64{1, 1, 1, 1}, 4, 1)
		if err != nil {
			t.Fatal(err)
		}
		d, err := NUTS(numbered(4, 0, 0), funnel, start, NUTSSettings{Seed: 5, Draws: 4000, Acceptance: 0.98})
		if err != nil {
			t.Fatal(err)
		}
		sound(t, d)
		holds(t, d, moment{"v", func(x []float64) float64 { return x[0] }, 0},
			moment{"v²", func(x []float64) float64 { return x[0] * x[0] }, 1}, moment{"y", func(x []float64) float64 { return x[1] }, 0})
	})
	// The funnel as it is must be seen to fail.
	t.Run("Neal's funnel", func(t *testing.T) {
		narrow := func(x, g []float64) float64 {
			value := funnel(x, g)
			g[0] += x[0] - x[0]/9
			return value + x[0]*x[0]/2 - x[0]*x[0]/18
		}
		start, err := Around(numbered(10, 0, 0), make([]float64, 10), []float64{1, 1, 1, 1, 1, 1, 1, 1, 1, 1}, 4, 1)
		if err != nil {
			t.Fatal(err)
		}
		d, err := NUTS(numbered(10, 0, 0), narrow, start, NUTSSettings{Seed: 6})
		if err != nil {
			t.Fatal(err)
		}
		failed := check.Failed(chain.Checks("", d))
		if !strings.Contains(fmt.Sprint(failed), "divergent") {
			t.Errorf("no divergences: %v", failed)
		}
	})
}

// One call for four chains is four calls for one, in any order and at once, and a
// guess of the covariance is of use.
func TestNUTSStreams(t *testing.T) {
	target := newNormalTarget(3)
	start := target.starts(t, 4)
	settings := NUTSSettings{Seed: 9, WarmUp: 200, Draws: 100, Dense: true}
	all, err := NUTS(numbered(3, 0, 0), target.gradient, start, settings)
	if err != nil {
		t.Fatal(err)
	}
	single := make([]chain.Draws, 4)
	done := make(chan error)
	for c := range single {
		go func() {
			own := settings
			own.Stream = c
			var err error
			single[c], err = NUTS(numbered(3, 0, 0), target.gradient, start[c:c+1], own)
			done <- err
		}()
	}
	for range single {
		if err := <-done; err != nil {
			t.Fatal(err)
		}
	}
	joined, err := chain.Join(single...)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(all, joined) {
		t.Error("four chains of one call differ from those of four calls")
	}
	settings.WarmUp = 75
	without, err := NUTS(numbered(3, 0, 0), target.gradient, start, settings)
	if err != nil {
		t.Fatal(err)
	}
	settings.Covariance = make([][]float64, 3)
	for k := range 3 {
		settings.Covariance[k] = make([]float64, 3)
		for l := range 3 {
			settings.Covariance[k][l] = math.Pow(0.9, math.Abs(float64(k-l))) * target.sd[k] * target.sd[l]
		}
	}
	with, err := NUTS(numbered(3, 0, 0), target.gradient, start, settings)
	if err != nil {
		t.Fatal(err)
	}
	if with.Evaluations*3 > without.Evaluations {
		t.Errorf("%d evaluations with a guess of the covariance, %d without", with.Evaluations, without.Evaluations)
	}
}

func TestNUTSRefused(t *testing.T) {
	flat := func(x, g []float64) float64 { return 0 }
	start := [][]float64{{0.5, 0.5}}
	good := numbered(2, 0, 1)
	for name, tc := range map[string]struct {
		parameters []Parameter
		f          func(x, g []float64) float64
		start      [][]float64
		settings   NUTSSettings
		want       string
	}{
		"none":       {nil, flat, start, NUTSSettings{}, "parameters"},
		"twice":      {[]Parameter{{Name: "a"}, {Name: "a"}}, flat, start, NUTSSettings{}, "two parameters"},
		"range":      {[]Parameter{{Name: "a", Lo: 1, Hi: 0}, {Name: "b"}}, flat, start, NUTSSettings{}, "increasing"},
		"wide":       {[]Parameter{{Name: "a", Lo: -math.MaxFloat64, Hi: math.MaxFloat64}, {Name: "b"}}, flat, start, NUTSSettings{}, "too wide"},
		"nil":        {good, nil, start, NUTSSettings{}, "nil"},
		"no start":   {good, flat, nil, NUTSSettings{}, "starts"},
		"outside":    {good, flat, [][]float64{{0.5, 2}}, NUTSSettings{}, "between 0 and 1"},
		"no density": {good, func(x, g []float64) float64 { return math.NaN() }, start, NUTSSettings{}, "no density"},
		"gradient":   {good, func(x, g []float64) float64 { g[0] = math.NaN(); return 0 }, start, NUTSSettings{}, "gradient"},
		"spent":      {good, flat, start, NUTSSettings{Evaluations: 100}, "spent after 100"},
		"covariance": {good, flat, start, NUTSSettings{Covariance: [][]float64{{1, 2}, {2, 1}}, Dense: true}, "positive"},
		"settings":   {good, flat, start, NUTSSettings{Acceptance: 1}, "acceptance"},
	} {
		_, err := NUTS(tc.parameters, tc.f, tc.start, tc.settings)
		if err == nil || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
}
