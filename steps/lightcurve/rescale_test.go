package lightcurve

import (
	"math"
	"testing"
)

func TestRescaleErrors(t *testing.T) {
	cube := noisy(5000, 6e-4, 21, func(i int) float64 {
		return trapezoid(i/3) * (1 + 3e-3*math.Exp(-float64(i)/200) - 1e-6*float64(i))
	})
	for i := range cube.Err[0] {
		cube.Err[0][i] = 3e-4
	}
	cube.Flux[0][77], cube.Mask[0][77] = math.NaN(), Missing
	cube.Err[0][78] = 6e-4
	out, factors, err := RescaleErrors(cube)
	if err != nil {
		t.Fatal(err)
	}
	// The standard error of a MAD of 5000 overlapping differences is about 2%.
	if math.Abs(factors[0]-2) > 0.12 {
		t.Errorf("factor %g, want about 2", factors[0])
	}
	if out.Err[0][78] != 2*out.Err[0][79] {
		t.Error("ratios of errors changed")
	}
	if cube.Err[0][0] != 3e-4 {
		t.Error("the input was modified")
	}
	_, again, err := RescaleErrors(out)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(again[0]-1) > 1e-12 {
		t.Errorf("second factor %g, want 1", again[0])
	}
}

func TestRescaleErrorsKeepsWhatItCannotJudge(t *testing.T) {
	for name, cube := range map[string]Cube{
		"few samples": noisy(10, 1e-3, 1, func(int) float64 { return 1 }),
		"no scatter":  noisy(100, 0, 1, func(int) float64 { return 1 }),
	} {
		for i := range cube.Err[0] {
			cube.Err[0][i] = 0.5
		}
		out, factors, err := RescaleErrors(cube)
		if err != nil {
			t.Fatal(err)
		}
		if factors[0] != 1 || out.Err[0][3] != 0.5 {
			t.Errorf("%s: factor %g, error %g", name, factors[0], out.Err[0][3])
		}
	}
}
