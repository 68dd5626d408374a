package diagnose

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

const minutesPerDay = 1440

// curve returns a fit whose residuals in units of the star's flux are noise, with
// errors err, one sample a minute, and a trend that is not 1.
func curve(noise []float64, err float64) fit.CurveFit {
	n := len(noise)
	f := fit.CurveFit{
		Channel: lightcurve.Channel{Index: 3, Lo: 1, Hi: 1.1},
		Time:    make([]float64, n), Flux: make([]float64, n), Err: make([]float64, n),
		Mask: make([]lightcurve.Flag, n), Transit: make([]float64, n), Trend: make([]float64, n),
		Level: 1234, Mid: 0.5,
	}
	for i, r := range noise {
		f.Time[i] = float64(i) / minutesPerDay
		f.Trend[i] = 1 + 0.01*math.Sin(float64(i)/50)
		f.Transit[i] = 1
		if i > n/3 && i < n/2 {
			f.Transit[i] = 0.99
		}
		f.Flux[i] = (f.Transit[i] + r) * f.Trend[i]
		f.Err[i] = err * f.Trend[i]
	}
	return f
}

// series reads one of the noise series of the check values for light curves.
func series(t *testing.T, name string) []float64 {
	t.Helper()
	rows := readCSV(t, "noise_series.csv")
	var out []float64
	for _, row := range rows[1:] {
		for k := range row {
			if rows[0][k] == name {
				out = append(out, number(t, row[k]))
			}
		}
	}
	return out
}

func readCSV(t *testing.T, name string) [][]string {
	t.Helper()
	data, err := os.ReadFile("../../testdata/lightcurve/" + name)
	if err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(strings.NewReader(string(data))).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

func TestResiduals(t *testing.T) {
	f := curve([]float64{1e-4, -2e-4, 3e-4, 4e-4}, 1e-4)
	f.Mask[2] = lightcurve.Outlier
	f.Flux[3] = math.Inf(1)
	got, err := Residuals(f)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(got[0]-1e-4) > 1e-15 || math.Abs(got[1]+2e-4) > 1e-15 || !math.IsNaN(got[2]) || !math.IsNaN(got[3]) {
		t.Errorf("residuals %v", got)
	}
	scatter, err := ResidualScatter(f)
	if err != nil {
		t.Fatal(err)
	}
	if want := math.Sqrt(2.5) * 1e-4; scatter.Used != 2 || scatter.Masked != 2 || math.Abs(scatter.RMS/want-1) > 1e-10 || math.Abs(scatter.Ratio-math.Sqrt(2.5)) > 1e-10 {
		t.Errorf("scatter %+v", scatter)
	}
	f.Trend = f.Trend[:3]
	if _, err := Residuals(f); err == nil || !strings.Contains(err.Error(), "channel 3 has 3 trend values") {
		t.Errorf("error %v", err)
	}
}

func TestScatterOfNothing(t *testing.T) {
	got, err := ResidualScatter(fit.CurveFit{})
	if err != nil || got.Used != 0 || !math.IsNaN(got.RMS) || !math.IsNaN(got.Ratio) {
		t.Errorf("%+v, %v", got, err)
	}
}

// TestTimeAveraging compares beta with the ratios computed apart for the same
// series (see the README of the check values for light curves).
func TestTimeAveraging(t *testing.T) {
	compared := 0
	for _, row := range readCSV(t, "binned_rms.csv")[1:] {
		size := number(t, row[1])
		if size != 10 && size != 16 {
			continue
		}
		compared++
		f := curve(series(t, row[0]), 1e-4)
		got, err := TimeAveraging(f, size-1, size+1) // one sample a minute
		if err != nil {
			t.Fatal(err)
		}
		bins := math.Floor(float64(len(f.Time)) / size)
		want := number(t, row[3]) / math.Sqrt(bins/(bins-1))
		// The residuals were added to fluxes about 1, so they carry 1e-16/1e-4 of error.
		if math.Abs(got.Value/want-1) > 1e-9 || got.Sizes != 1 || math.Abs(got.From-size) > 1e-6 || got.To != got.From {
			t.Errorf("%s: %+v, want %g", row[0], got, want)
		}
		if want := 1 / math.Sqrt(2*bins); math.Abs(got.Err-want) > 1e-12 {
			t.Errorf("error %g, want %g", got.Err, want)
		}
	}
	if compared != 4 {
		t.Errorf("%d values compared, want 4", compared)
	}
	// Three sizes an octave: 10, 13, 16, 20 and 25 minutes.
	got, err := TimeAveraging(curve(series(t, "white"), 1e-4), 10, 30)
	if err != nil || got.Sizes != 5 || math.Abs(got.To-25) > 1e-6 || math.Abs(got.Value-1) > 0.1 {
		t.Errorf("%+v, %v", got, err)
	}
}

func TestTimeAveragingRefuses(t *testing.T) {
	short := curve(series(t, "white")[:60], 1e-4)
	for _, tc := range []struct {
		f      fit.CurveFit
		lo, hi float64
		want   string
	}{
		{short, 10, 30, "no bin of 10 to 30 minutes fits ten times into 60 residuals spaced by 1 minutes"},
		{short, 0, 30, "expected 0 < shortest < longest"},
		{short, math.NaN(), 30, "expected 0 < shortest < longest"},
		{fit.CurveFit{}, 10, 30, "0 finite residuals"},
		{curve(make([]float64, 600), 1e-4), 10, 30, "no bin of 10 to 30"},
	} {
		if tc.f.Time != nil && tc.f.Flux[0] == tc.f.Transit[0]*tc.f.Trend[0] {
			for i := range tc.f.Flux { // residuals that are exactly zero
				tc.f.Trend[i], tc.f.Flux[i] = 1, tc.f.Transit[i]
			}
		}
		if got, err := TimeAveraging(tc.f, tc.lo, tc.hi); err == nil || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%+v, error %v; want %q", got, err, tc.want)
		}
	}
}
