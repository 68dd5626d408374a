package figure

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestBinned(t *testing.T) {
	x := []float64{0, 1, 2, 3, nan, 4, 10}
	y := []float64{1, 3, nan, 5, 100, 7, 9}
	got := binned(x, y, 5) // intervals of 2: {1, 3}, {5}, {7}, none, {9}
	if !slices.Equal(got.y, []float64{2, 5, 7, 9}) || !slices.Equal(got.x, []float64{0.5, 3, 4, 10}) || !slices.Equal(got.count, []int{2, 1, 1, 1}) || got.width != 2 {
		t.Errorf("%+v", got)
	}
	one := binned([]float64{5, 5}, []float64{1, 2}, 9)
	if !slices.Equal(one.y, []float64{1.5}) || one.width != 0 {
		t.Errorf("%+v", one)
	}
	if none := binned(nil, nil, 3); len(none.x) != 0 {
		t.Errorf("%+v", none)
	}
	if wide := binned([]float64{-math.MaxFloat64, math.MaxFloat64}, []float64{1, 3}, 4); len(wide.y) != 1 || wide.y[0] != 2 {
		t.Errorf("%+v", wide)
	}
}

func TestQuantile(t *testing.T) {
	sorted := finites([]float64{4, nan, 1, math.Inf(1), 3, 2, 5})
	for q, want := range map[float64]float64{0: 1, 0.25: 2, 0.5: 3, 0.625: 3.5, 1: 5} {
		if got := quantile(sorted, q); got != want {
			t.Errorf("quantile %g is %g, want %g", q, got, want)
		}
	}
	if !math.IsNaN(quantile(nil, 0.5)) || !math.IsNaN(rms(nil)) || !math.IsNaN(median([]float64{nan})) {
		t.Error("numbers out of nothing")
	}
	if got := rms([]float64{3, nan, 4}); math.Abs(got-math.Sqrt(12.5)) > 1e-15 {
		t.Errorf("rms %g", got)
	}
}

func TestThinAndSpread(t *testing.T) {
	if index, every := thin(10, 4); every != 3 || !slices.Equal(index, []int{0, 3, 6, 9}) {
		t.Errorf("%v, every %d", index, every)
	}
	if index, every := thin(3, 4); every != 1 || len(index) != 3 {
		t.Errorf("%v, every %d", index, every)
	}
	if got := spread(77, 24); len(got) != 24 || got[0] != 0 || got[23] != 76 || !slices.IsSorted(got) || len(slices.Compact(got)) != 24 {
		t.Errorf("%v", got)
	}
	if got := spread(3, 24); !slices.Equal(got, []int{0, 1, 2}) {
		t.Errorf("%v", got)
	}
	if got := spread(5, 1); !slices.Equal(got, []int{0}) {
		t.Errorf("%v", got)
	}
}

func TestSimplified(t *testing.T) {
	n := 2000
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i] = float64(i) / float64(n)
		y[i] = 1
		if z := math.Abs(x[i]-0.5) / 0.2; z < 1 {
			y[i] = 1 - 0.01*math.Sqrt(1-z*z)
		}
	}
	x[7], y[8] = nan, math.Inf(1)
	const tolerance = 1e-5
	index := simplified(x, y, tolerance)
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

func TestClip(t *testing.T) {
	if a, b, ok := clip(-1, 0.5, 2, 0.5); !ok || a != [2]float64{0, 0.5} || b != [2]float64{1, 0.5} {
		t.Error(a, b, ok)
	}
	if _, _, ok := clip(-1, 0, 0, 1.5); ok {
		t.Error("a line past the corner is kept")
	}
	if _, _, ok := clip(0.5, 2, 0.6, 3); ok {
		t.Error("a line above is kept")
	}
	if _, _, ok := clip(nan, 0, 1, 1); ok {
		t.Error("a line from nowhere is kept")
	}
	rng := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		p := [4]float64{}
		for k := range p {
			p[k] = 4*rng.Float64() - 1.5
		}
		a, b, ok := clip(p[0], p[1], p[2], p[3])
		for _, v := range []float64{a[0], a[1], b[0], b[1]} {
			if ok && (v < -1e-12 || v > 1+1e-12) {
				t.Fatalf("%v is cut to %v %v", p, a, b)
			}
		}
	}
}
