package lightcurve

import (
	"math"
	"testing"
)

func TestWhite(t *testing.T) {
	flat := func(level float64) func(int) float64 { return func(int) float64 { return level } }
	n := 400
	a, b, dead := noisy(n, 1, 31, flat(1000)), noisy(n, 4, 32, flat(2000)), noisy(n, 1, 33, flat(0))
	cube := join(a, b, dead)
	cube.Aux = []Series{{"X", "pix", make([]float64, n)}}
	cube, err := MaskDead(cube)
	if err != nil {
		t.Fatal(err)
	}
	cube.Mask[1][5] = Outlier // weight 1/5: the first channel is enough
	cube.Mask[0][6] = Missing // weight 4/5: the rest is not enough
	cube.Mask[0][7], cube.Mask[1][7] = Missing, Negative

	white, err := White(cube)
	if err != nil {
		t.Fatal(err)
	}
	levelA, _ := levelAndWeight(cube.Flux[0], cube.Err[0], cube.Mask[0])
	levelB, _ := levelAndWeight(cube.Flux[1], cube.Err[1], cube.Mask[1])
	// Relative errors 1/1000 and 4/2000 give weights of ratio 4 (times the ratio of
	// the medians, which are 1000 and 2000 to within the noise).
	wa, wb := levelA*levelA, levelB*levelB/16
	want := (wa*cube.Flux[0][0]/levelA + wb*cube.Flux[1][0]/levelB) / (wa + wb)
	if math.Abs(white.Flux[0]-want) > 1e-14 {
		t.Errorf("flux %.15g, want %.15g", white.Flux[0], want)
	}
	if wantErr := 1 / math.Sqrt(wa+wb); math.Abs(white.Err[0]/wantErr-1) > 1e-12 {
		t.Errorf("error %g, want %g", white.Err[0], wantErr)
	}
	if white.Mask[5] != 0 || math.Abs(white.Flux[5]-cube.Flux[0][5]/levelA) > 1e-14 {
		t.Errorf("sample 5: flag %d, flux %g", white.Mask[5], white.Flux[5])
	}
	if white.Mask[6] != Missing || white.Mask[7] != Missing|Negative {
		t.Errorf("flags %d and %d", white.Mask[6], white.Mask[7])
	}
	if white.Channel != (Channel{-1, 1, 3}) {
		t.Errorf("channel %+v: the dead one counts", white.Channel)
	}
	if len(white.Aux) != 1 || white.Aux[0].Name != "X" {
		t.Error("auxiliary columns were lost")
	}
	white.Aux[0].Value[0] = 9
	if cube.Aux[0].Value[0] == 9 {
		t.Error("the result shares memory with the cube")
	}
	onlyDead, err := MaskDead(join(dead, dead))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := White(onlyDead); err == nil {
		t.Error("a white curve was made of nothing")
	}
}

func TestCurves(t *testing.T) {
	cube := join(noisy(5, 1, 1, trapezoid), noisy(5, 1, 2, trapezoid))
	curves := Curves(cube)
	if len(curves) != 2 || curves[1].Channel != cube.Channels[1] || curves[1].Flux[3] != cube.Flux[1][3] {
		t.Errorf("curves %+v", curves)
	}
	curves[0].Flux[0] = -1
	if cube.Flux[0][0] == -1 {
		t.Error("curves share memory with the cube")
	}
}

func TestMaskedCounts(t *testing.T) {
	cube := join(noisy(4, 1, 1, trapezoid), noisy(4, 1, 2, trapezoid))
	cube.Mask[0] = []Flag{0, Missing, Missing | Outlier, Excluded}
	got := Masked(cube)
	want := map[string][2]float64{"samples": {4, 4}, "usable": {1, 4}, "missing": {2, 0}, "zero": {0, 0},
		"negative": {0, 0}, "outlier": {1, 0}, "excluded": {1, 0}, "channel": {0, 1}}
	for _, column := range got.Columns {
		if w, ok := want[column.Name]; ok && (column.Number[0] != w[0] || column.Number[1] != w[1]) {
			t.Errorf("%s: %v, want %v", column.Name, column.Number, w)
		}
	}
	if masked, outlier := MaskedShare(cube, Outlier); masked != 3.0/8 || outlier != 1.0/8 {
		t.Errorf("shares %g and %g", masked, outlier)
	}
}
