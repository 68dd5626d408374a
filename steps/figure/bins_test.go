package figure

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"rimlight/steps/lightcurve"
)

func TestNewBins(t *testing.T) {
	a := lightcurve.Averages{
		Begin: 10, End: 10 + 5.0/24,
		Time:  []float64{10 + 0.5/24, 10 + 1.5/24, nan, 10 + 3.5/24, 10 + 4.5/24},
		Value: []float64{1, 4, nan, 7, 9}, Used: []int{2, 1, 0, 3, 1}, Samples: []int{2, 2, 1, 3, 1},
	}
	near := func(a, b float64) bool { return math.Abs(a-b) < 1e-9 }
	got := newBins(a, 1, 10)
	if !slices.EqualFunc(got.x, []float64{0.5, 1.5, 3.5, 4.5}, near) || !slices.Equal(got.y, []float64{1, 4, 7, 9}) || !slices.Equal(got.count, []int{2, 1, 3, 1}) || !near(got.width, 1) {
		t.Errorf("%+v", got)
	}
	got = newBins(a, 2, 10) // {1, 1, 4}, {7, 7, 7}, {9}
	if !slices.EqualFunc(got.x, []float64{2.5 / 3, 3.5, 4.5}, near) || !slices.Equal(got.y, []float64{2, 7, 9}) || !slices.Equal(got.count, []int{3, 3, 1}) || !near(got.width, 2) {
		t.Errorf("%+v", got)
	}
	if none := newBins(lightcurve.Averages{}, 1, 0); len(none.x) != 0 {
		t.Errorf("%+v", none)
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
