package diagnose

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestPolyline(t *testing.T) {
	n := 2000
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i] = float64(i) / float64(n)
		y[i] = 1
		if z := math.Abs(x[i]-0.5) / 0.2; z < 1 {
			y[i] = 1 - 0.01*math.Sqrt(1-z*z)
		}
	}
	x[7], y[8] = math.NaN(), math.Inf(1)
	const tolerance = 1e-5
	index := polyline(x, y, tolerance, mostPoints)
	if len(index) > 80 || index[0] != 0 || index[len(index)-1] != n-1 {
		t.Fatalf("%d points, from %d to %d", len(index), index[0], index[len(index)-1])
	}
	for k := 1; k < len(index); k++ {
		a, b := index[k-1], index[k]
		for i := a; i <= b; i++ {
			onLine := y[a] + (y[b]-y[a])*(x[i]-x[a])/(x[b]-x[a])
			if finite(x[i]) && finite(y[i]) && math.Abs(onLine-y[i]) > tolerance*(1+1e-9) {
				t.Fatalf("point %d is off by %g", i, onLine-y[i])
			}
		}
	}
}

// TestPolylineHasABound holds that what no line can follow keeps its greatest
// excursion, and no more points than it may.
func TestPolylineHasABound(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	x, y := make([]float64, 20_000), make([]float64, 20_000)
	for i := range x {
		x[i], y[i] = float64(i), rng.Float64()
	}
	y[777] = 50
	index := polyline(x, y, 1e-6, 100)
	found := false
	for k, i := range index {
		found = found || i == 777
		if k > 0 && index[k-1] >= i {
			t.Fatalf("point %d after %d", i, index[k-1])
		}
	}
	if len(index) != 100 || !found {
		t.Errorf("%d points, the farthest among them: %v", len(index), found)
	}
	for n := range 3 {
		if got := polyline(x[:n], y[:n], 0, 100); len(got) != n {
			t.Errorf("%d of %d points", len(got), n)
		}
	}
}
