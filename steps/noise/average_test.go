package noise

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"testing"
)

// even returns n times, a minute apart.
func even(n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = float64(i) / minutesPerDay
	}
	return out
}

func fileOf(t testing.TB, name string) [][]string {
	t.Helper()
	f, err := os.Open(filepath.Join("../../testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows
}

// Scatters and ratios are those of extended precision arithmetic.
func TestAverages(t *testing.T) {
	series := map[string][]float64{}
	rows := fileOf(t, "lightcurve/noise_series.csv")
	for k, name := range rows[0] {
		for _, row := range rows[1:] {
			series[name] = append(series[name], parse(t, row[k]))
		}
	}
	rows = fileOf(t, "noise/time_averaging_series.csv")
	column := map[string]int{}
	for k, name := range rows[0] {
		column[name] = k
	}
	checked := 0
	for _, row := range rows[1:] {
		x := series[row[0]]
		if x == nil {
			t.Fatalf("there is no series %s", row[0])
		}
		a, err := AverageTable(even(len(x)), x)
		if err != nil {
			t.Fatal(err)
		}
		for k, size := range a.Size {
			if float64(size) != parse(t, row[column["bin"]]) {
				continue
			}
			near(t, "rms", a.RMS[k], parse(t, row[column["rmsN_about_zero"]]), 0, 1e-12)
			checked++
			if size == 1 {
				continue
			}
			near(t, "ratio", a.Ratio[k], parse(t, row[column["beta_rms_about_zero"]]), 0, 1e-12)
			b, err := TimeAveraging(even(len(x)), x, float64(size), float64(size)+0.01)
			if err != nil || b.Sizes != 1 {
				t.Fatal(b, err)
			}
			bins := float64(a.Bins[k])
			near(t, "beta", b.Value, a.Ratio[k]*math.Sqrt((bins-1)/bins), 0, 1e-14)
		}
	}
	if checked < 16 {
		t.Errorf("%d rows of the table were checked", checked)
	}
}

// The overlapping Allan deviation of the 1000-point test of NIST Special Publication
// 1065 (Riley 2008, table 31), published to seven digits and extended by mpmath.
func TestAllan(t *testing.T) {
	n := uint64(1234567890)
	var x []float64
	for range 1000 {
		x = append(x, float64(n)/2147483647)
		n = n * 16807 % 2147483647
	}
	for size, want := range map[int]float64{1: 0.292231878106759177, 10: 0.0915995342011865311, 100: 0.0324134302605698364} {
		near(t, "Allan deviation", allan([][]float64{x}, size), want, 0, 1e-12)
	}
}

// Bins end at gaps and at missing residuals.
func TestGaps(t *testing.T) {
	time, x := even(100), make([]float64, 100)
	for i := range x {
		x[i] = 1
		if i >= 50 {
			time[i] += 1
		}
	}
	x[20] = math.NaN()
	a, err := AverageTable(time, x)
	if err != nil {
		t.Fatal(err)
	}
	for k, size := range a.Size {
		if want := 20/size + 29/size + 50/size; a.Bins[k] != want || math.Abs(a.RMS[k]-1) > 1e-12 || math.Abs(a.Minutes[k]-float64(size)) > 1e-6 || a.Allan[k] > 1e-12 {
			t.Errorf("bins of %d: %d of %g min with scatter %g; want %d", size, a.Bins[k], a.Minutes[k], a.RMS[k], want)
		}
	}
	if len(a.Table("x").Columns) != 9 {
		t.Error("the table has lost columns")
	}
}

// The band holds white noise in 68% of cases.
func TestBand(t *testing.T) {
	p := newProcess(t, Model{}, Data{Time: even(600), Err: ones(600)}, false)
	c, err := p.At(nil)
	if err != nil {
		t.Fatal(err)
	}
	inside, count := 0, 2000
	for k := range count {
		x, err := c.Draw(uint64(k))
		if err != nil {
			t.Fatal(err)
		}
		a, err := AverageTable(even(600), x)
		if err != nil {
			t.Fatal(err)
		}
		// The scatter of one is known to 3%, which hardly widens that of bins of 40.
		at := len(a.Size) - 3
		if a.RMS[at] > a.Lo[at] && a.RMS[at] < a.Hi[at] {
			inside++
		}
	}
	covered(t, "band", inside, count, 0.6827)
}

func ones(n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = 1
	}
	return out
}

// covered fails when a proportion lies 3.3 binomial standard deviations from what it
// should be, which one test in a thousand would do by chance; seeds are fixed.
func covered(t *testing.T, what string, inside, count int, p float64) {
	t.Helper()
	share := float64(inside) / float64(count)
	t.Logf("%s: %.1f%% (%.2f%% expected)", what, 100*share, 100*p)
	if math.Abs(share-p) > 3.3*math.Sqrt(p*(1-p)/float64(count)) {
		t.Errorf("%s holds the truth in %.1f%% of %d cases, want %.2f%%", what, 100*share, count, 100*p)
	}
}

func TestInflate(t *testing.T) {
	x := make([]float64, 400)
	for i := range x {
		x[i] = 2 * math.Copysign(1, math.Sin(float64(i)/20)) // of long runs
	}
	got, err := Inflate(even(400), x, ones(400), 3, 2, 10)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "scatter", got.Scatter, 2*math.Sqrt(400./397), 0, 1e-12)
	if got.Beta < 1.4 || got.Both != got.Beta*got.Scatter {
		t.Errorf("%+v", got)
	}
	for _, bad := range []error{
		second(Inflate(even(400), x, ones(3), 3, 2, 10)), second(Inflate(even(400), x, ones(400), 400, 2, 10)),
		second(Inflate(even(400), x, ones(400), 3, 10, 2)), second(TimeAveraging(even(400), x, 300, 400)),
		second(AverageTable(even(5), x[:5])), second(AverageTable(even(5), x)),
	} {
		if bad == nil {
			t.Error("an impossible request was granted")
		}
	}
}

func second[T any](_ T, err error) error { return err }
