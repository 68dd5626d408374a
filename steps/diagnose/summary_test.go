package diagnose

import (
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

// TestSummarise holds that a summary has what the functions for a whole fit give.
func TestSummarise(t *testing.T) {
	f := curve(series(t, "ar1"), 1e-4)
	for i := range f.Mask {
		if i%10 == 3 {
			f.Mask[i] = lightcurve.Outlier
		}
	}
	got, err := Summarise(f)
	if err != nil {
		t.Fatal(err)
	}
	if got.Channel != f.Channel || got.Mid != f.Mid || got.Level != f.Level || math.Abs(got.Cadence-1) > 1e-9 {
		t.Errorf("%+v", got)
	}
	scatter, _ := ResidualScatter(f)
	beta, _ := TimeAveraging(f, 10, 30)
	if got.Scatter != scatter || got.Beta != beta || got.Samples() != len(f.Time) || !got.Fitted() {
		t.Errorf("%+v and %+v, want %+v and %+v", got.Scatter, got.Beta, scatter, beta)
	}
	residual, _ := Residuals(f)
	if binning, _ := lightcurve.Binned(residual); !reflect.DeepEqual(got.Binning, binning) {
		t.Errorf("%+v, want %+v", got.Binning, binning)
	}
	if n := len(got.Flux.Value); n != Intervals {
		t.Fatalf("%d intervals", n)
	}
	// Averages of flux over trend are those of the model and of the residuals.
	used := 0
	for k, n := range got.Flux.Used {
		used += n
		want, from := 0.0, used-n
		seen := 0
		for i := range f.Time {
			if f.Mask[i] != 0 {
				continue
			}
			if seen >= from && seen < used {
				want += f.Transit[i] + residual[i]
			}
			seen++
		}
		if want /= float64(n); math.Abs(got.Flux.Value[k]-want) > 1e-14 {
			t.Fatalf("average %d is %.16g, want %.16g", k, got.Flux.Value[k], want)
		}
	}
	if used != scatter.Used {
		t.Errorf("%d samples averaged, %d used", used, scatter.Used)
	}
	// The line is the model.
	k := 1
	for i, x := range f.Time {
		for k < len(got.ModelTime)-1 && got.ModelTime[k] < x {
			k++
		}
		a, b := got.ModelTime[k-1], got.ModelTime[k]
		line := got.Model[k-1] + (got.Model[k]-got.Model[k-1])*(x-a)/(b-a)
		if math.Abs(line-f.Transit[i]) > bend*0.01*(1+1e-9) {
			t.Fatalf("the line is at %g, the model at %g", line, f.Transit[i])
		}
	}
	if err := got.Check(); err != nil {
		t.Error(err)
	}
}

func TestSummariseWithoutSamples(t *testing.T) {
	f := curve(series(t, "white")[:100], 1e-4)
	for i := range f.Mask {
		f.Mask[i] = lightcurve.Excluded
	}
	for _, f := range []fit.CurveFit{f, {}} {
		got, err := Summarise(f)
		if err != nil {
			t.Fatal(err)
		}
		if got.Fitted() || got.Samples() != len(f.Time) || len(got.Flux.Samples) != len(f.Time) || !math.IsNaN(got.Beta.Value) || !math.IsNaN(got.Scatter.RMS) || len(got.Binning.Size) != 0 {
			t.Errorf("%+v", got)
		}
		if err := got.Check(); err != nil {
			t.Error(err)
		}
	}
	f.Mask = nil
	if _, err := Summarise(f); err == nil || !strings.Contains(err.Error(), "channel 3 has 0 flags") {
		t.Errorf("error %v", err)
	}
}

// TestSummaryHasABound holds that the size of a summary does not grow with the
// number of integrations, whatever the model looks like.
func TestSummaryHasABound(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	numbers := func(n int, rough bool) int {
		noise := make([]float64, n)
		for i := range noise {
			noise[i] = 1e-4 * rng.NormFloat64()
		}
		f := curve(noise, 1e-4)
		if rough {
			for i := range f.Transit {
				f.Transit[i] = 1 - 0.01*rng.Float64()
			}
		}
		s, err := Summarise(f)
		if err != nil {
			t.Fatal(err)
		}
		return 4*len(s.Flux.Value) + 2*len(s.Model) + 5*len(s.Binning.Size)
	}
	for _, n := range []int{1000, 20_000} {
		if got := numbers(n, false); got > 1600 {
			t.Errorf("%d numbers for a transit of %d integrations", got, n)
		}
		if got := numbers(n, true); got > 2500 { // 20 kB
			t.Errorf("%d numbers for noise of %d integrations", got, n)
		}
	}
}
