package lightcurve

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"
)

// TestBinnedAgainstTables compares the scatter of binned white and correlated
// noise with values computed apart, in other code (see the README of the folder).
func TestBinnedAgainstTables(t *testing.T) {
	series := readCSV(t, "../../testdata/lightcurve/noise_series.csv")
	want := readCSV(t, "../../testdata/lightcurve/binned_rms.csv")
	for k, name := range []string{"white", "ar1"} {
		var x []float64
		for _, row := range series[1:] {
			x = append(x, number(t, row[k]), math.NaN()) // NaN is to be skipped
		}
		got, err := Binned(x)
		if err != nil {
			t.Fatal(err)
		}
		compared := 0
		for _, row := range want[1:] {
			if row[0] != name {
				continue
			}
			for i, size := range got.Size {
				if strconv.Itoa(size) != row[1] {
					continue
				}
				compared++
				if rms := number(t, row[2]); math.Abs(got.RMS[i]/rms-1) > 1e-12 {
					t.Errorf("%s, bins of %d: %.15g, want %.15g", name, size, got.RMS[i], rms)
				}
				if beta := number(t, row[3]); math.Abs(got.RMS[i]/got.White[i]/beta-1) > 1e-12 {
					t.Errorf("%s, bins of %d: ratio %.15g, want %.15g", name, size, got.RMS[i]/got.White[i], beta)
				}
			}
		}
		if compared < 5 {
			t.Errorf("%s: only %d sizes compared", name, compared)
		}
	}
	if _, err := Binned(make([]float64, 9)); err == nil {
		t.Error("nine residuals were accepted")
	}
}

func readCSV(t *testing.T, name string) [][]string {
	t.Helper()
	file, err := os.Open(name)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
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
