package reports

import (
	"math"
	"slices"
	"testing"

	"rimlight/steps/diagnose"
	"rimlight/steps/lightcurve"
)

// TestLightOfSummaries holds that what steps keep of fits is shown as fits are,
// with gaps among them.
func TestLightOfSummaries(t *testing.T) {
	nan := math.NaN()
	one := diagnose.Summary{
		Channel: lightcurve.Channel{Index: 4, Lo: 1, Hi: 2}, Mid: 2460000.5, Level: 1000,
		Flux:    lightcurve.Averages{Begin: 2460000.25, End: 2460000.75},
		Scatter: diagnose.Scatter{Used: 900, Masked: 100, RMS: 5e-4, Ratio: 1.02}, Beta: diagnose.Beta{Value: 1.1},
	}
	l, ok := LightOf(one)
	if !ok {
		t.Fatal("a summary is not shown")
	}
	for _, want := range []fact{
		{"samples", "900 of 1000 fitted"}, {"residual scatter", "500 ppm, 1.02 times the errors used"},
		{"scatter in bins", "1.10 times that of uncorrelated noise in bins of 10 to 30 min"}, {"time", "2460000.25000 to 2460000.75000 BJD_TDB, 12.00 h"},
	} {
		if got := l.facts(); !slices.Contains(got, want) {
			t.Errorf("%v is not among %v", want, got)
		}
	}
	gap := diagnose.Summary{Channel: lightcurve.Channel{Index: 5, Lo: 2, Hi: 3}, Mid: nan, Level: nan,
		Flux: lightcurve.Averages{Begin: nan, End: nan}, Scatter: diagnose.Scatter{RMS: nan, Ratio: nan}, Beta: diagnose.Beta{Value: nan}}
	other := one
	other.Scatter.RMS, other.Beta.Value = 7e-4, 1.3
	l, _ = LightOf([]diagnose.Summary{one, gap, other})
	for _, want := range []fact{
		{"size", "3 fits"}, {"samples", "1800 of 2000 fitted"}, {"residual scatter", "500 to 700 ppm, median 600"},
		{"scatter in bins", "median 1.20, at most 1.30 times that of uncorrelated noise in bins of 10 to 30 min"},
	} {
		if got := l.facts(); !slices.Contains(got, want) {
			t.Errorf("%v is not among %v", want, got)
		}
	}
}
