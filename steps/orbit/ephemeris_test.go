package orbit

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// TestPredict compares with the rule for the variance of a sum, and a simulation
// of the covariance.
func TestPredict(t *testing.T) {
	e := Ephemeris{MidTransit: 2459000.25, Period: 3.25, MidTransitErr: 2e-4, PeriodErr: 3e-6, Covariance: -4.2e-10}
	for _, n := range []int{0, 1, -1, 47, 500, -3000} {
		time, err, fault := e.Predict(n)
		k := float64(n)
		want := math.Sqrt(4e-8 + 2*k*-4.2e-10 + k*k*9e-12)
		if fault != nil || time != 2459000.25+k*3.25 || math.Abs(err/want-1) > 1e-12 {
			t.Errorf("transit %d: %.10f ± %g, error %v, expected ± %g", n, time, err, fault, want)
		}
	}
	moved, n, err := e.Uncorrelated()
	if err != nil || n != 47 || math.Abs(moved.Covariance) > 0.5*9e-12 || moved.MidTransitErr >= e.MidTransitErr {
		t.Errorf("uncorrelated at %d, %+v, error %v", n, moved, err)
	}
	for _, m := range []int{46, 48} {
		if _, err, _ := e.Predict(m); err < moved.MidTransitErr {
			t.Errorf("transit %d has a smaller error, %g, than transit %d, %g", m, err, n, moved.MidTransitErr)
		}
	}
	// Moving back and forth changes nothing.
	back, err := moved.Move(-n)
	if err != nil || back.MidTransit != e.MidTransit || math.Abs(back.MidTransitErr/e.MidTransitErr-1) > 1e-12 || math.Abs(back.Covariance/e.Covariance-1) > 1e-12 {
		t.Errorf("back to %+v, error %v, was %+v", back, err, e)
	}
	// Fully correlated: the error may vanish, not become NaN.
	full := Ephemeris{Period: 1, MidTransitErr: 0.1, PeriodErr: 0.01, Covariance: -0.001}
	if _, err, fault := full.Predict(10); fault != nil || err > 1e-9 {
		t.Errorf("fully correlated: error %g, %v", err, fault)
	}
	if number, err := e.Number(2459000.25 + 10.4*3.25); number != 10 || err != nil {
		t.Errorf("number %d, error %v", number, err)
	}
	for want, bad := range map[string]Ephemeris{
		"Period is 0":      {},
		"PeriodErr -1":     {Period: 1, PeriodErr: -1},
		"within ±1e-10":    {Period: 1, PeriodErr: 1e-6, MidTransitErr: 1e-4, Covariance: 2e-10},
		"MidTransit is":    {Period: 1, MidTransit: math.NaN()},
		"Covariance is 1 ": {Period: 1, MidTransitErr: 1, Covariance: 1},
	} {
		if _, _, err := bad.Predict(1); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("got error %v, expected %s", err, want)
		}
	}
	if _, _, err := e.Predict(2e9); err == nil {
		t.Error("no error for transit 2e9")
	}
}

// TestFitEphemeris fits simulated times: the results scatter as their errors and
// covariance say, the chi-square as it should, and timings come back.
func TestFitEphemeris(t *testing.T) {
	rng := rand.New(rand.NewPCG(21, 22))
	truth := Ephemeris{MidTransit: 2458765.4321, Period: 4.5678901}
	numbers := []int{-3, 0, 1, 5, 40, 41, 90, 200}
	errs := []float64{3e-4, 2e-4, 1e-4, 5e-4, 1e-4, 2e-4, 1e-4, 3e-4}
	const draws = 4000
	var chi, at, period, cross, chi2 float64
	var fitted Ephemeris
	for range draws {
		var times []float64
		for i, n := range numbers {
			times = append(times, truth.MidTransit+float64(n)*truth.Period+errs[i]*rng.NormFloat64())
		}
		var err error
		if fitted, chi, err = FitEphemeris(numbers, times, errs); err != nil {
			t.Fatal(err)
		}
		a, b := (fitted.MidTransit-truth.MidTransit)/fitted.MidTransitErr, (fitted.Period-truth.Period)/fitted.PeriodErr
		at, period, cross, chi2 = at+a*a/draws, period+b*b/draws, cross+a*b/draws, chi2+chi/draws
	}
	correlation := fitted.Covariance / (fitted.MidTransitErr * fitted.PeriodErr)
	sigma := math.Sqrt(2. / draws) // of a mean square
	if math.Abs(at-1) > 5*sigma || math.Abs(period-1) > 5*sigma || math.Abs(cross-correlation) > 5*sigma || math.Abs(chi2/6-1) > 5*sigma {
		t.Errorf("mean squares of time %g, period %g, chi-square %g; correlation %g, expected %g", at, period, chi2/6, cross, correlation)
	}
	times := []float64{truth.MidTransit + 7*truth.Period + 0.01, truth.MidTransit - 2*truth.Period - 0.002}
	timings, err := Ephemeris{MidTransit: truth.MidTransit, Period: truth.Period, MidTransitErr: 3e-4}.Timings(times, []float64{4e-4, 0})
	if err != nil || timings[0].Number != 7 || math.Abs(timings[0].Offset-0.01) > 1e-9 || math.Abs(timings[0].OffsetErr-5e-4) > 1e-12 ||
		timings[1].Number != -2 || math.Abs(timings[1].Offset+0.002) > 1e-9 {
		t.Errorf("%+v, error %v", timings, err)
	}
	for _, bad := range []struct {
		numbers     []int
		times, errs []float64
		want        string
	}{
		{nil, nil, nil, "no transit times"},
		{[]int{1}, []float64{1, 2}, []float64{1, 1}, "1 numbers and 2 errors for 2 times"},
		{[]int{1, 1}, []float64{1, 2}, []float64{1, 1}, "one and the same transit"},
		{[]int{1, 2}, []float64{1, 2}, []float64{1, 0}, "errs[1] is 0"},
		{[]int{1, 2}, []float64{1, math.NaN()}, []float64{1, 1}, "times[1] is NaN"},
		{[]int{1, 2}, []float64{2, 1}, []float64{1, 1}, "Period is -1"},
	} {
		if _, _, err := FitEphemeris(bad.numbers, bad.times, bad.errs); err == nil || !strings.Contains(err.Error(), bad.want) {
			t.Errorf("got error %v, expected %s", err, bad.want)
		}
	}
}

func TestVisit(t *testing.T) {
	o := orbits()["B"]
	o.MidTransit = 100.25
	v, err := o.Visit(3, 0.01)
	if err != nil || v.MidTransit != 100.25+30+0.01 {
		t.Fatalf("%+v, error %v", v, err)
	}
	// The same place, as long as the offset is 0; and the derivative by the period.
	v, _ = o.Visit(3, 0)
	z, _, grad := o.SeparationGradient(130.4)
	zv, _, gradV := v.SeparationGradient(130.4)
	if math.Abs(z-zv) > 1e-14 || math.Abs(grad[0]-(gradV[0]+3*gradV[1])) > 1e-12*math.Abs(grad[0]) {
		t.Errorf("z = %g and %g; derivatives %v and %v", z, zv, grad, gradV)
	}
	if _, err := o.Visit(1, math.Inf(1)); err == nil {
		t.Error("no error for an infinite offset")
	}
}
