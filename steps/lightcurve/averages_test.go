package lightcurve

import (
	"math"
	"strings"
	"testing"
)

func TestAverage(t *testing.T) {
	nan := math.NaN()
	time := []float64{0, 1, 2, nan, 5, 6, 9}
	value := []float64{1, 3, nan, 100, 5, 7, math.Inf(1)}
	got, err := Average(time, value, 5) // intervals of 2 days from -0.5: {1, 3}, {none}, {5}, {7}, {none}
	if err != nil {
		t.Fatal(err)
	}
	want := Averages{
		Begin: -0.5, End: 9.5,
		Time: []float64{0.5, nan, 5, 6, nan}, Value: []float64{2, nan, 5, 7, nan},
		Used: []int{2, 0, 1, 1, 0}, Samples: []int{2, 1, 1, 1, 1},
	}
	same := func(a, b float64) bool { return a == b || a != a && b != b }
	if got.Begin != want.Begin || got.End != want.End || len(got.Time) != 5 {
		t.Fatalf("%+v", got)
	}
	for k := range want.Time {
		if !same(got.Time[k], want.Time[k]) || !same(got.Value[k], want.Value[k]) || got.Used[k] != want.Used[k] || got.Samples[k] != want.Samples[k] {
			t.Errorf("interval %d: %+v", k, got)
		}
	}
}

// TestAverageKeepsTheSum holds that no sample is lost or counted twice, and that
// times of today keep their digits.
func TestAverageKeepsTheSum(t *testing.T) {
	const n = 20_000
	time, value := make([]float64, n), make([]float64, n)
	for i := range time {
		time[i], value[i] = 2460512.35+float64(i)*10/86400, math.Sin(float64(i)/100)
		if i%7 == 0 {
			value[i] = math.NaN()
		}
	}
	got, err := Average(time, value, 320)
	if err != nil || len(got.Value) != 320 {
		t.Fatalf("%d intervals, %v", len(got.Value), err)
	}
	used, samples, sum, want := 0, 0, 0.0, 0.0
	for k := range got.Value {
		used, samples, sum = used+got.Used[k], samples+got.Samples[k], sum+got.Value[k]*float64(got.Used[k])
		middle := got.Begin + (float64(k)+0.5)*(got.End-got.Begin)/320
		if math.Abs(got.Time[k]-middle)*86400 > 10 {
			t.Errorf("mean time of interval %d is %g s from its middle", k, (got.Time[k]-middle)*86400)
		}
	}
	for _, v := range value {
		if v == v {
			want += v
		}
	}
	if samples != n || used != n-(n+6)/7 || math.Abs(sum-want) > 1e-9 {
		t.Errorf("%d of %d samples used, sum %g, want %g", used, samples, sum, want)
	}
}

func TestAverageOfLittle(t *testing.T) {
	nan := math.NaN()
	for _, tc := range []struct {
		time, value []float64
		intervals   int
	}{
		{nil, nil, 0},
		{[]float64{nan}, []float64{1}, 0},
		{[]float64{5}, []float64{1}, 1},
		{[]float64{5, 5}, []float64{1, 3}, 1},
		{[]float64{1, 2, 3}, []float64{1, 2, 3}, 3},
		{[]float64{-math.MaxFloat64, math.MaxFloat64}, []float64{1, 3}, 1},
		{[]float64{1, 2, 3, 1e12}, []float64{1, 2, 3, 4}, 320},
	} {
		got, err := Average(tc.time, tc.value, 320)
		if err != nil || len(got.Value) != tc.intervals || len(got.Samples) != tc.intervals {
			t.Errorf("%v: %d intervals, %v; want %d", tc.time, len(got.Value), err, tc.intervals)
		}
	}
	for _, n := range []int{0, -1, mostIntervals + 1} {
		if _, err := Average(nil, nil, n); err == nil || !strings.Contains(err.Error(), "expected 1 to") {
			t.Errorf("%d intervals: error %v", n, err)
		}
	}
	if _, err := Average([]float64{1}, nil, 3); err == nil || !strings.Contains(err.Error(), "1 times and 0 values") {
		t.Errorf("error %v", err)
	}
}

func TestCadence(t *testing.T) {
	if got := Cadence([]float64{0, 1, 2, 10, 11, math.NaN(), 12}); got != 1440 {
		t.Errorf("%g", got)
	}
	if !math.IsNaN(Cadence(nil)) || !math.IsNaN(Cadence([]float64{1})) {
		t.Error("a cadence without steps")
	}
}
