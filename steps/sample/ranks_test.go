package sample

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"rimlight/steps/chain"
)

// Simulation-based calibration (Talts et al. 2018): of parameters drawn from the
// prior and data drawn with them, the rank of the true parameter among draws from
// the posterior is uniform. The model has a share with a flat prior, seen in a few
// trials, and a location with a normal prior, seen with normal noise.
func TestRanksUniform(t *testing.T) {
	const simulations, ranks, bins = 300, 39, 8
	parameters := []Parameter{{Name: "share", Lo: 0, Hi: 1}, {Name: "location"}}
	for _, sampler := range []struct {
		name string
		draw func(seed uint64, likelihood, posterior func(x, g []float64) float64) (chain.Draws, error)
	}{
		{"NUTS", func(seed uint64, _, posterior func(x, g []float64) float64) (chain.Draws, error) {
			return NUTS(parameters, posterior, [][]float64{{0.5, 0}}, NUTSSettings{Seed: seed, WarmUp: 150, Draws: 4 * ranks})
		}},
		{"ensemble", func(seed uint64, _, posterior func(x, g []float64) float64) (chain.Draws, error) {
			start, err := Around(parameters, []float64{0.5, 0}, []float64{0.2, 0.5}, 6, seed)
			if err != nil {
				return chain.Draws{}, err
			}
			return Ensemble(parameters, func(x []float64) float64 { return posterior(x, make([]float64, 2)) }, start,
				EnsembleSettings{Seed: seed, WarmUp: 100, Draws: 4 * ranks, Thin: 4})
		}},
		{"nested", func(seed uint64, likelihood, _ func(x, g []float64) float64) (chain.Draws, error) {
			w, _, err := Nested(parameters, func(u []float64) []float64 { return []float64{u[0], NormalQuantile(u[1], 0, 1)} },
				func(x []float64) float64 { return likelihood(x, make([]float64, 2)) }, NestedSettings{Seed: seed, Live: 50})
			if err != nil {
				return chain.Draws{}, err
			}
			return chain.Resample(w, 4*ranks, seed)
		}},
		{"importance", func(seed uint64, _, posterior func(x, g []float64) float64) (chain.Draws, error) {
			w, _, err := Importance(parameters, func(x []float64) float64 { return posterior(x, make([]float64, 2)) },
				StudentT{Mean: []float64{0.5, 0}, Scale: [][]float64{{0.1, 0}, {0, 0.5}}, Degrees: 5}, 2000, seed)
			if err != nil {
				return chain.Draws{}, err
			}
			return chain.Resample(w, 4*ranks, seed)
		}},
	} {
		counts := [2][bins]float64{}
		for i := range simulations {
			rng := rand.New(rand.NewPCG(uint64(i), 99))
			truth := []float64{rng.Float64(), rng.NormFloat64()}
			successes := 0.0
			for range 6 {
				if rng.Float64() < truth[0] {
					successes++
				}
			}
			seen := truth[1] + 0.5*rng.NormFloat64()
			likelihood := func(x, g []float64) float64 {
				z := (seen - x[1]) / 0.5
				g[0], g[1] = successes/x[0]-(6-successes)/(1-x[0]), z/0.5
				value := -z * z / 2
				if successes > 0 {
					value += successes * math.Log(x[0])
				}
				if successes < 6 {
					value += (6 - successes) * math.Log1p(-x[0])
				}
				return value
			}
			posterior := func(x, g []float64) float64 {
				value := likelihood(x, g)
				g[1] -= x[1]
				return value - x[1]*x[1]/2
			}
			d, err := sampler.draw(uint64(i), likelihood, posterior)
			if err != nil {
				t.Fatal(sampler.name, err)
			}
			for k := range truth {
				rank := 0
				for r := range ranks { // every fourth draw of the first chain
					if d.X[4*r*2+k] < truth[k] {
						rank++
					}
				}
				counts[k][rank*bins/(ranks+1)]++
			}
		}
		for k, c := range counts {
			square := 0.0
			for _, n := range c {
				square += (n - simulations/bins) * (n - simulations/bins) / (simulations / bins)
			}
			p := distuv.ChiSquared{K: bins - 1}.Survival(square)
			t.Logf("%s: %s: ranks %v, probability %.3f", sampler.name, parameters[k].Name, fmt.Sprint(c), p)
			if p < 1e-3 {
				t.Errorf("%s: ranks of %s are uneven: %v, probability %.2g", sampler.name, parameters[k].Name, c, p)
			}
		}
	}
}
