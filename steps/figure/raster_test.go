package figure

import (
	"math"
	"testing"

	"rimlight/steps/diagnose"
	"rimlight/steps/lightcurve"
)

// rowOf averages the values of a channel.
func rowOf(t *testing.T, c lightcurve.Channel, time, value []float64) mapRow {
	t.Helper()
	flux, err := lightcurve.Average(time, value, diagnose.Intervals)
	if err != nil {
		t.Fatal(err)
	}
	return mapRow{channel: c, flux: flux}
}

func TestRaster(t *testing.T) {
	time := []float64{0, 1, 2, 5} // a gap of two integrations
	r := newRaster([]mapRow{
		rowOf(t, lightcurve.Channel{Index: 0, Lo: 1, Hi: 2}, time, []float64{1, 2, nan, 4}),
		rowOf(t, lightcurve.Channel{Index: 1, Lo: 2, Hi: 3}, time, []float64{5, 6, 7, 8}),
	})
	if r.columns != 6 || r.rows != 2 || r.from != -0.5 || r.to != 5.5 || r.most != 1 {
		t.Fatalf("%+v", r)
	}
	want := []float64{5, 6, 7, nan, nan, 8, 1, 2, nan, nan, nan, 4} // longest wavelength first
	for k, v := range want {
		if r.value[k] != v && !(math.IsNaN(v) && math.IsNaN(r.value[k])) {
			t.Errorf("cell %d is %g, want %g", k, r.value[k], v)
		}
		if gap := k%6 == 3 || k%6 == 4; r.filled[k] == gap {
			t.Errorf("cell %d: filled %v", k, r.filled[k])
		}
	}
	img := r.picture(func(v float64) float64 { return v / 8 })
	red, _, _, alpha := img.At(3, 0).RGBA()
	if alpha != 0 || red != 0 {
		t.Error("a gap has a colour")
	}
	if img.At(2, 1) != mapPalette()[maskedIndex] {
		t.Error("a masked cell has the colour of a flux")
	}
	if img.At(5, 0) != mapPalette()[firstColor+rampColors-1] {
		t.Error("the greatest flux has not the last colour")
	}
}

// TestRasterAverages: many integrations and channels of different width share
// cells, and half of a cell must be usable.
func TestRasterAverages(t *testing.T) {
	n := 3200
	time := make([]float64, n)
	flat, half := make([]float64, n), make([]float64, n)
	for i := range time {
		time[i] = float64(i) / 1000
		flat[i], half[i] = float64(i%10), 1
		if i%2 == 0 {
			half[i] = nan
		}
	}
	r := newRaster([]mapRow{
		rowOf(t, lightcurve.Channel{Index: 0, Lo: 1, Hi: 1.5}, time, flat),
		rowOf(t, lightcurve.Channel{Index: 1, Lo: 2, Hi: 4}, time, half),
	})
	if r.columns != diagnose.Intervals || r.rows != mapRows || r.most < 10 || r.most > 11 {
		t.Fatalf("%d columns, %d rows, %d samples", r.columns, r.rows, r.most)
	}
	low := (r.rows-1)*r.columns + 7
	if math.Abs(r.value[low]-4.5) > 0.51 {
		t.Errorf("mean of 0 to 9 is %g", r.value[low])
	}
	if !math.IsNaN(r.value[7]) || !r.filled[7] {
		t.Error("a cell with half of its samples masked has a value")
	}
	if gap := r.columns * int(float64(r.rows)*(4-1.75)/3); r.filled[gap] {
		t.Error("there is something between the channels")
	}
}
