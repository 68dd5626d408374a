package noise

import (
	"math"
	"testing"
)

func TestPhotonNoise(t *testing.T) {
	// 10,000 counts of 1.6 electrons; 20 pixels read twice with 5 electrons each, and
	// 50 electrons of background: √(16000 + 20 (50 + 2·25)) = √18000.
	d := Detector{Gain: 1.6, ReadNoise: 5, Pixels: 20, Reads: 2, Background: 50}
	got, err := d.Expected(1e4)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "expected", got, math.Sqrt(18000)/16000, 0, 1e-15)
	if got, _ := (Detector{Gain: 1}).Expected(1e6); got != 1e-3 {
		t.Errorf("a million electrons: %g", got)
	}
	x := make([]float64, 200)
	for i := range x {
		x[i] = 2 * got * float64(1-i%2*2)
	}
	x[7] = math.NaN()
	a, err := d.Above(1e4, x)
	if err != nil || a.Samples != 199 {
		t.Fatal(a, err)
	}
	near(t, "ratio", a.Ratio, 2, 0, 1e-14)
	near(t, "error", a.Err, 2/math.Sqrt(398), 0, 1e-14)
	near(t, "extra", a.Extra, math.Sqrt(3)*got, 0, 1e-14)
	for _, bad := range []error{
		second(d.Expected(0)), second(d.Expected(math.NaN())), second(Detector{}.Expected(1)), second(Detector{Gain: 1, ReadNoise: -1}.Expected(1)),
		second(d.Above(1e4, x[:1])), second(d.Above(-1, x)),
	} {
		if bad == nil {
			t.Error("nonsense was taken")
		}
	}
}
