package program

import (
	"math"
	"reflect"
	"testing"

	"rimlight/steps/chain"
	verdict "rimlight/steps/check"
	sampler "rimlight/steps/sample"
)

// A recipe with targets of its own.
const samplerRecipe = `
func parameters() []sample.Parameter {
	return []sample.Parameter{{Name: "share", Lo: 0, Hi: 1}, {Name: "offset", Unit: "d"}}
}

func Gradient(start [][]float64) (draws chain.Draws, checks []check.Check, err error) {
	draws, err = sample.NUTS(parameters(), func(x, gradient []float64) float64 {
		gradient[0] = 3/x[0] - 2/(1-x[0])
		gradient[1] = -x[1]
		return 3*math.Log(x[0]) + 2*math.Log1p(-x[0]) - x[1]*x[1]/2
	}, start, sample.NUTSSettings{Seed: 5, WarmUp: 200, Draws: 300})
	if err != nil {
		return
	}
	checks = chain.Checks("", draws)
	return
}

func density(x []float64) float64 {
	return 3*math.Log(x[0]) + 2*math.Log1p(-x[0]) - x[1]*x[1]/2
}

func Walkers() (summaries []chain.Summary, err error) {
	start, err := sample.Around(parameters(), []float64{0.5, 0}, []float64{0.1, 1}, 8, 1)
	if err != nil {
		return
	}
	draws, err := sample.Ensemble(parameters(), density, start, sample.EnsembleSettings{Seed: 5, WarmUp: 100, Draws: 300})
	if err != nil {
		return
	}
	return chain.Summaries(draws)
}

func Model() (evidence sample.Evidence, weighted chain.Weighted, err error) {
	weighted, evidence, err = sample.Nested(parameters(), func(u []float64) []float64 {
		return []float64{u[0], sample.NormalQuantile(u[1], 0, 1)}
	}, func(x []float64) float64 {
		return 3*math.Log(x[0]) + 2*math.Log1p(-x[0])
	}, sample.NestedSettings{Seed: 5, Live: 50})
	return
}
`

// TestOwnTarget compares draws from a recipe's own density with those of the same
// one compiled, bit for bit.
func TestOwnTarget(t *testing.T) {
	m, err := accept(t, samplerRecipe).Compile()
	if err != nil {
		t.Fatal(err)
	}
	call := func(step string, args ...any) []reflect.Value {
		t.Helper()
		var in []reflect.Value
		for _, a := range args {
			in = append(in, reflect.ValueOf(a))
		}
		out, err := m.Call(step, in)
		if err != nil {
			t.Fatal(err)
		}
		return out
	}
	parameters := []sampler.Parameter{{Name: "share", Lo: 0, Hi: 1}, {Name: "offset", Unit: "d"}}
	start := [][]float64{{0.3, 1}, {0.6, -1}, {0.5, 0}, {0.8, 2}}
	draws, err := sampler.NUTS(parameters, func(x, gradient []float64) float64 {
		gradient[0] = 3/x[0] - 2/(1-x[0])
		gradient[1] = -x[1]
		return 3*math.Log(x[0]) + 2*math.Log1p(-x[0]) - x[1]*x[1]/2
	}, start, sampler.NUTSSettings{Seed: 5, WarmUp: 200, Draws: 300})
	if err != nil {
		t.Fatal(err)
	}
	out := call("Gradient", start)
	if !reflect.DeepEqual(out[0].Interface(), draws) {
		t.Error("interpreted and compiled draws differ")
	}
	if failed := verdict.Failed(out[1].Interface().([]verdict.Check)); failed != nil {
		t.Errorf("checks failed: %+v", failed)
	}

	// A beta distribution of 4 and 3, and the integral of its density.
	mean, sd := 4.0/7, math.Sqrt(12.0/49/8)
	s := call("Walkers")[0].Interface().([]chain.Summary)
	if math.Abs(s[0].Mean-mean) > 4*s[0].MeanError || math.Abs(s[0].SD-sd) > 4*s[0].SDError {
		t.Errorf("share %+v, want %.3f ± %.3f", s[0], mean, sd)
	}
	e := call("Model")[0].Interface().(sampler.Evidence)
	if want := math.Log(1.0 / 60); math.Abs(e.LogZ-want) > 4*e.Err {
		t.Errorf("evidence %.3f ± %.3f, want %.3f", e.LogZ, e.Err, want)
	}
}
