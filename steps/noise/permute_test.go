package noise

import (
	"math"
	"slices"
	"testing"
)

func TestShift(t *testing.T) {
	nan := math.NaN()
	model, residual := []float64{10, 20, 30, 40, 50}, []float64{1, 2, nan, 4, 5}
	for by, want := range map[int][]float64{
		0: {11, 22, 0, 44, 55}, 1: {15, 21, 0, 42, 54}, -1: {12, 24, 0, 45, 51}, 4: {11, 22, 0, 44, 55},
		math.MinInt: {11, 22, 0, 44, 55}, math.MaxInt: {12, 24, 0, 45, 51},
	} {
		got, err := Shift(model, residual, by)
		if err != nil || !math.IsNaN(got[2]) {
			t.Fatal(got, err)
		}
		got[2] = 0
		if !slices.Equal(got, want) {
			t.Errorf("shifted by %d: %v, want %v", by, got, want)
		}
	}
	if _, err := Shift(model, residual[1:], 1); err == nil {
		t.Error("unequal lengths were taken")
	}
}

func TestShifts(t *testing.T) {
	for _, c := range []struct {
		n, count int
		want     []int
	}{{4, 0, []int{0, 1, 2, 3}}, {4, 9, []int{0, 1, 2, 3}}, {10, 3, []int{0, 3, 6}}, {0, 0, []int{}}} {
		if got, err := Shifts(c.n, c.count); err != nil || !slices.Equal(got, c.want) {
			t.Errorf("%d of %d: %v, %v", c.count, c.n, got, err)
		}
	}
	if _, err := Shifts(math.MaxInt, 0); err == nil {
		t.Error("endless shifts were granted")
	}
}
