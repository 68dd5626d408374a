package systematics

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
)

func curve(n int) lightcurve.Curve {
	rng := rand.New(rand.NewPCG(1, 2))
	c := lightcurve.Curve{Mask: make([]lightcurve.Flag, n)}
	x, y := make([]float64, n), make([]float64, n)
	flat, ramp := make([]float64, n), make([]float64, n)
	for i := range n {
		c.Time = append(c.Time, 2459000+float64(i)*1e-3)
		x[i], y[i] = 100+0.1*rng.NormFloat64(), rng.NormFloat64()
		flat[i], ramp[i] = 3, 5+2*float64(i)
	}
	c.Aux = []lightcurve.Series{{Name: "X", Value: x}, {Name: "Y", Value: y}, {Name: "FLAT", Value: flat}, {Name: "RAMP", Value: ramp}}
	return c
}

func TestDesign(t *testing.T) {
	c := curve(101)
	c.Mask[7] = lightcurve.Outlier
	c.Aux[0].Value[7] = 1e9 // masked: must not enter the mean
	c.Aux[1].Value[8] = math.NaN()
	d, err := Trend{Polynomial: 2, Settling: true, SettlingTime: 0.02, Regressors: []string{"Y", "X"}}.Design(c)
	if err != nil {
		t.Fatal(err)
	}
	if want := []string{"constant", "time", "time^2", "settling", "Y", "X"}; !slices.Equal(d.Names, want) || d.Settling != 3 {
		t.Fatalf("terms %v, settling %d", d.Names, d.Settling)
	}
	if d.Columns[1][0] != -1 || math.Abs(d.Columns[1][50]) > 1e-7 || d.Columns[1][100] != 1 || math.Abs(d.Columns[2][25]-0.25) > 1e-6 {
		t.Errorf("polynomial columns %v %v", d.Columns[1][:3], d.Columns[2][:3])
	}
	if got, want := d.Columns[3][20], math.Exp(-1); math.Abs(got-want) > 1e-7 {
		t.Errorf("settling after one e-folding time: %g, want %g", got, want)
	}
	if !math.IsNaN(d.Columns[4][8]) {
		t.Error("a missing regressor value did not stay missing")
	}
	var sum, sumSq, n float64
	for i, v := range d.Columns[5] {
		if i != 7 {
			sum, sumSq, n = sum+v, sumSq+v*v, n+1
		}
	}
	if math.Abs(sum/n) > 1e-10 || math.Abs(sumSq/n-1) > 1e-10 {
		t.Errorf("regressor of mean %g and variance %g", sum/n, sumSq/n)
	}
	if len(d.Warnings) != 0 {
		t.Errorf("warnings %v", d.Warnings)
	}
}

func TestDesignErrors(t *testing.T) {
	c := curve(60)
	for _, test := range []struct {
		trend Trend
		want  string
	}{
		{Trend{Polynomial: 5}, "expected 0 to 4"},
		{Trend{Polynomial: -1}, "expected 0 to 4"},
		{Trend{Settling: true}, "settling time 0 d"},
		{Trend{Settling: true, SettlingTime: math.NaN()}, "settling time NaN d"},
		{Trend{Regressors: []string{"Z"}}, "no auxiliary column Z; expected one of X, Y, FLAT, RAMP"},
		{Trend{Regressors: []string{"x"}}, "nearest known name: X"},
		{Trend{Regressors: make([]string, 65)}, "65 regressors; expected at most 64"},
		{Trend{Regressors: []string{"X", "X"}}, "X is listed twice"},
		{Trend{Regressors: []string{"FLAT"}}, "FLAT is constant, 3"},
		{Trend{Polynomial: 1, Regressors: []string{"RAMP"}}, "the term RAMP is a combination of the terms before it (constant, time)"},
	} {
		_, err := test.trend.Design(c)
		if err == nil || !strings.Contains(err.Error(), test.want) {
			t.Errorf("%+v: error %v, want %q", test.trend, err, test.want)
		}
	}
	if _, err := (Trend{Regressors: []string{"X"}}).Design(lightcurve.Curve{Time: []float64{1}, Mask: []lightcurve.Flag{0}}); err == nil {
		t.Error("a regressor of a curve without any was accepted")
	}
	if _, err := (Trend{}).Design(lightcurve.Curve{}); err == nil {
		t.Error("an empty curve was accepted")
	}
}

func TestDesignWarnsOfAlikeTerms(t *testing.T) {
	c := curve(60)
	for i := range c.Aux[1].Value {
		c.Aux[1].Value[i] = c.Aux[0].Value[i] + 0.01*math.Sin(float64(i))
	}
	d, err := Trend{Regressors: []string{"X", "Y"}}.Design(c)
	if err != nil {
		t.Fatal(err)
	}
	if len(d.Warnings) != 1 || !strings.Contains(d.Warnings[0], "X and Y have correlation 0.99") {
		t.Errorf("warnings %q", d.Warnings)
	}
}

func TestSettleDerivative(t *testing.T) {
	times := []float64{-1, 0, 0.01, 0.1, 3}
	const tau, h = 0.05, 1e-6
	up, down := Settle(times, 0, tau+h), Settle(times, 0, tau-h)
	for i, got := range SettleDerivative(times, 0, tau) {
		if want := (up[i] - down[i]) / (2 * h); math.Abs(got-want) > 1e-6 {
			t.Errorf("t=%g: %g, want %g", times[i], got, want)
		}
	}
}
