package sample

import (
	"math"
	"testing"
)

// Coordinates lead there and back, and their derivatives are those of differences.
func TestCoordinates(t *testing.T) {
	inf := math.Inf(1)
	for _, p := range []Parameter{{Lo: 0, Hi: 0}, {Lo: -2, Hi: 3}, {Lo: 1e5, Hi: 1e5 + 1e-3}, {Lo: 2, Hi: inf}, {Lo: -inf, Hi: -1}, {Lo: 0, Hi: inf}} {
		c := newCoordinate(p)
		for _, u := range []float64{-3, -0.7, 0, 0.2, 2.5} {
			x, slope, log, bend := c.value(u)
			if !p.inside(x) {
				t.Errorf("%v: %g gives %g", p, u, x)
			}
			const h = 1e-4
			above, slopeAbove, _, _ := c.value(u + h)
			below, slopeBelow, _, _ := c.value(u - h)
			rounding := math.Abs(x) * 1e-15 / h
			if d := (above - below) / (2 * h); math.Abs(d-slope) > 1e-6*math.Abs(slope)+rounding {
				t.Errorf("%v at %g: slope %g, of differences %g", p, u, slope, d)
			}
			if math.Abs(log-math.Log(math.Abs(slope))) > 1e-12 {
				t.Errorf("%v at %g: logarithm of the slope %g, slope %g", p, u, log, slope)
			}
			if d := math.Log(slopeAbove/slopeBelow) / (2 * h); math.Abs(d-bend) > 1e-6 {
				t.Errorf("%v at %g: derivative of the logarithm %g, of differences %g", p, u, bend, d)
			}
			if back := c.of(x); math.Abs(back-u) > 1e-9+rounding*h*100/math.Abs(slope) {
				t.Errorf("%v: %g leads to %g and back to %g", p, u, x, back)
			}
		}
	}
	// Far out, the limits are reached and not passed.
	c := newCoordinate(Parameter{Lo: -1, Hi: 1})
	for u, want := range map[float64]float64{-50: -1, 50: 1} {
		if x, _, _, _ := c.value(u); x != want {
			t.Errorf("%g gives %g", u, x)
		}
	}
}

func TestAround(t *testing.T) {
	parameters := []Parameter{{Name: "a", Lo: 0, Hi: 1}, {Name: "b"}}
	points, err := Around(parameters, []float64{0.01, 5}, []float64{0.5, 2}, 2000, 3)
	if err != nil {
		t.Fatal(err)
	}
	var sum, square float64
	for _, x := range points {
		if !parameters[0].inside(x[0]) {
			t.Fatalf("%g lies outside", x[0])
		}
		sum += (x[1] - 5) / 2000
		square += (x[1] - 5) * (x[1] - 5) / 2000
	}
	if math.Abs(sum) > 0.2 || math.Abs(square-4) > 0.6 {
		t.Errorf("mean %g and mean square %g of b - 5, want 0 and 4", sum, square)
	}
	for _, bad := range []error{
		second(Around(parameters, []float64{2, 5}, []float64{1, 1}, 5, 1)), second(Around(parameters, []float64{0.5, 5}, []float64{1}, 5, 1)),
		second(Around(parameters, []float64{0.5, 5}, []float64{1, -1}, 5, 1)), second(Around(parameters, []float64{0.5, 5}, []float64{1, 1}, 1e6, 1)),
	} {
		if bad == nil {
			t.Error("bad arguments were accepted")
		}
	}
}

func second(_ [][]float64, err error) error { return err }

func TestQuantiles(t *testing.T) {
	near := func(what string, got, want float64) {
		t.Helper()
		if !(math.Abs(got-want) <= 1e-12*math.Max(1, math.Abs(want))) {
			t.Errorf("%s: %.15g, want %.15g", what, got, want)
		}
	}
	near("uniform", UniformQuantile(0.25, -1, 3), 0)
	near("log-uniform", LogUniformQuantile(0.5, 0.01, 100), 1)
	near("normal", NormalQuantile(0.975, 1, 2), 1+2*1.959963984540054)
	near("truncated", TruncatedNormalQuantile(0.5, 0, 1, -1, 1), 0)
	near("half", TruncatedNormalQuantile(0.5, 0, 1, 0, math.Inf(1)), 0.6744897501960817)
	near("not truncated", TruncatedNormalQuantile(0.1, 3, 2, math.Inf(-1), math.Inf(1)), NormalQuantile(0.1, 3, 2))
	// Ten standard deviations out, the density falls as exp(-10 x): the median is at
	// 10 + log(2) / 10, less a little.
	far := TruncatedNormalQuantile(0.5, 0, 1, 10, 100)
	if far < 10.06 || far > 10.0693 {
		t.Errorf("far tail: %g", far)
	}
	near("mirrored", TruncatedNormalQuantile(0.5, 0, 1, -100, -10), -far)
	if x := TruncatedNormalQuantile(0.5, 0, 1, 60, 61); !(x >= 60 && x <= 61) {
		t.Errorf("beyond what numbers hold: %g", x)
	}
	for _, x := range []float64{LogUniformQuantile(0.5, -1, 1), NormalQuantile(2, 0, 1), TruncatedNormalQuantile(0.5, 0, 1, 1, 0), NormalQuantile(math.NaN(), 0, 1)} {
		if !math.IsNaN(x) {
			t.Errorf("%g, want NaN", x)
		}
	}
}
