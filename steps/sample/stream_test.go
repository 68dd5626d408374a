package sample

import (
	"math"
	"testing"
)

// The random numbers of a seed are the same for good: these are the first draws of
// each sampler when it was written. A change means that results kept by seed are
// no longer what the seed gives.
func TestStreams(t *testing.T) {
	parameters := []Parameter{{Name: "a", Lo: 0, Hi: 1}}
	density := func(x []float64) float64 { return -4 * x[0] }
	start, err := Around(parameters, []float64{0.5}, []float64{0.2}, 4, 42)
	if err != nil {
		t.Fatal(err)
	}
	nuts, err := NUTS(parameters, func(x, g []float64) float64 { g[0] = -4; return -4 * x[0] }, start[:1], NUTSSettings{Seed: 42, WarmUp: 1, Draws: 3})
	if err != nil {
		t.Fatal(err)
	}
	walkers, err := Ensemble(parameters, density, start, EnsembleSettings{Seed: 42, WarmUp: 1, Draws: 3})
	if err != nil {
		t.Fatal(err)
	}
	nested, _, err := Nested(parameters, nil, density, NestedSettings{Seed: 42, Live: 20})
	if err != nil {
		t.Fatal(err)
	}
	importance, _, err := Importance(parameters, density, StudentT{Mean: []float64{0.5}, Scale: [][]float64{{0.1}}, Degrees: 5}, 3, 42)
	if err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct {
		name string
		got  []float64
		want [3]float64
	}{
		{"starts", []float64{start[0][0], start[1][0], start[2][0]}, [3]float64{0.3928450553, 0.7799541223, 0.2595672816}},
		{"NUTS", nuts.X, [3]float64{0.0179385271, 0.0689074532, 0.0725276444}},
		{"ensemble", walkers.X, [3]float64{0.2979013806, 0.2966649357, 0.2845970259}},
		{"nested", nested.X, [3]float64{0.9523719843, 0.8568991096, 0.8247807484}},
		{"importance", importance.X, [3]float64{0.6772193726, 0.7022683482, 1.4531466093}},
	} {
		for i, want := range tc.want {
			if math.Abs(tc.got[i]-want) > 1e-8 {
				t.Errorf("%s: %.10f, want %.10f", tc.name, tc.got[:3], tc.want)
				break
			}
		}
	}
}
