package vector

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestSeries(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 1))
	for range 100 {
		x := numbers(rng, rng.IntN(50))
		v := Of(x)
		var sums, steps []float64
		s := 0.0
		for i, a := range x {
			s += a
			sums = append(sums, s)
			if i > 0 {
				steps = append(steps, a-x[i-1])
			}
		}
		if got := values(t, v.CumulativeSum()); !sameAll(got, sums) {
			t.Errorf("sums %v, want %v", got, sums)
		}
		if got := values(t, v.Diff()); !sameAll(got, steps) {
			t.Errorf("differences %v, want %v", got, steps)
		}
		order := rng.Perm(len(x))
		got := values(t, v.Gather(order))
		for k, i := range order {
			if !same(got[k], x[i]) {
				t.Errorf("gathered %g, want %g", got[k], x[i])
			}
		}
	}
}

// TestInterpolate compares with a search from the left for each element.
func TestInterpolate(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	for range 200 {
		n := 1 + rng.IntN(12)
		x, y := make([]float64, n), make([]float64, n)
		at := rng.NormFloat64()
		for i := range x {
			x[i], y[i] = at, rng.NormFloat64()
			at += 0.01 + rng.ExpFloat64()
		}
		where := make([]float64, 30)
		for i := range where {
			switch rng.IntN(4) {
			case 0:
				where[i] = x[rng.IntN(n)]
			case 1:
				where[i] = special[rng.IntN(len(special))]
			default:
				where[i] = x[0] - 0.5 + rng.Float64()*(x[n-1]-x[0]+1)
			}
		}
		if rng.IntN(2) == 0 {
			slices.Sort(where)
		}
		got := values(t, Of(where).Interpolate(Of(x), Of(y)))
		for i, w := range where {
			want := math.NaN()
			for k := range x {
				switch {
				case w == x[k]:
					want = y[k]
				case k > 0 && w > x[k-1] && w < x[k]:
					want = ((x[k]-w)*y[k-1] + (w-x[k-1])*y[k]) / (x[k] - x[k-1])
				}
			}
			if exact := slices.Contains(x, w); exact && got[i] != want || math.IsNaN(got[i]) != math.IsNaN(want) || math.Abs(got[i]-want) > 1e-12 {
				t.Errorf("at %g: %g, want %g (points %v, %v)", w, got[i], want, x, y)
			}
		}
	}
}
