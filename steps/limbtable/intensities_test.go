package limbtable

import (
	"reflect"
	"runtime"
	"strings"
	"testing"

	"rimlight/steps/fits"
	"rimlight/steps/limb"
)

const intensityCSV = "# invented\nwave,mu,intensity,note\n2,1,5,\n1,1,4,\n1,0.5,3,\n2,0.5,4,\n2,0,3,\n1,0,1,\n"

func binary(t testing.TB, name string, columns ...fits.NewColumn) []byte {
	t.Helper()
	var w fits.Writer
	if err := w.Table(name, columns); err != nil {
		t.Fatal(err)
	}
	return w.Bytes()
}

func TestReadIntensities(t *testing.T) {
	want := Intensities{Wave: []float64{1, 2}, Mu: []float64{0, 0.5, 1}, Value: [][]float64{{1, 3, 4}, {3, 4, 5}}}
	if got, err := ReadIntensities([]byte(intensityCSV)); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("CSV: %+v, error %v", got, err)
	}
	data := binary(t, "INTENSITY", fits.NewColumn{Name: "WAVE", Unit: "um", Values: []float64{2, 1, 1, 2, 2, 1}},
		fits.NewColumn{Name: "MU", Values: []float64{1, 1, 0.5, 0.5, 0, 0}}, fits.NewColumn{Name: "INTENSITY", Values: []float64{5, 4, 3, 4, 3, 1}})
	if got, err := ReadIntensities(data); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("FITS: %+v, error %v", got, err)
	}
	const head = "wave,mu,intensity\n"
	for data, want := range map[string]string{
		"":                                      "intensity table: CSV: the file is empty",
		"wave,mu\n1,1\n":                        `no column "intensity"`,
		head + "1,1,2\n1,0.5,1\n2,1,3\n":        "3 rows for 2 wavelengths and 2 values of mu, expected 4",
		head + "1,1,2\n1,1,1\n2,1,3\n2,0.5,3\n": "line 3: wavelength 1 um and mu 1 again, as in line 2",
		head + "1,1.5,2\n":                      "line 2: mu is 1.5",
		head + "-1,1,2\n":                       "line 2: wavelength -1 um",
		head + "1,1,-2\n":                       "line 2: intensity -2",
		string(binary(t, "LIMB", fits.NewColumn{Name: "MU", Values: []float64{1}})): `no HDU "INTENSITY"`,
	} {
		if _, err := ReadIntensities([]byte(data)); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%.40q: got error %v, expected %s", data, err, want)
		}
	}
}

func TestReadThroughput(t *testing.T) {
	want := Throughput{Wave: []float64{1, 2, 3}, Value: []float64{0, 0.7, 0.1}}
	if got, err := ReadThroughput([]byte("wave,throughput\n2,0.7\n1,0\n3,0.1\n")); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("CSV: %+v, error %v", got, err)
	}
	data := binary(t, "THROUGHPUT", fits.NewColumn{Name: "WAVE", Values: []float64{2, 1, 3}}, fits.NewColumn{Name: "THROUGHPUT", Values: []float64{0.7, 0, 0.1}})
	if got, err := ReadThroughput(data); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("FITS: %+v, error %v", got, err)
	}
	for wave, value := range map[float64]float64{0.5: 0, 1: 0, 1.5: 0.35, 2: 0.7, 2.5: 0.4, 3: 0.1, 3.1: 0} {
		if got := want.at(wave); got < value-1e-15 || got > value+1e-15 {
			t.Errorf("throughput at %g is %g, expected %g", wave, got, value)
		}
	}
	const head = "wave,throughput\n"
	for data, want := range map[string]string{
		head + "1,1\n":       "1 rows, expected at least 2",
		head + "1,1\n1,0\n":  "line 3: wavelength 1 um again, as in line 2",
		head + "1,-1\n2,0\n": "line 2: throughput -1 at 1 um",
		head + "1,0\n2,0\n":  "nothing is let through",
		"wave,value\n1,1\n":  `no column "throughput"`,
		head + "1,\n2,1\n":   "line 2: throughput NaN",
	} {
		if _, err := ReadThroughput([]byte(data)); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: got error %v, expected %s", data, err, want)
		}
	}
}

// TestReadLaws reads tables for laws of one and four coefficients.
func TestReadLaws(t *testing.T) {
	table, err := Read([]byte("# law: four-parameter\nwave_lo,wave_hi,u1,u2,u3,u4,u3_err\n1,2,0.5,0.3,-0.4,0.2,0.1\n"))
	if err != nil {
		t.Fatal(err)
	}
	law, errs, err := table.LawAt(1, 2)
	if want := (limb.Law{Name: limb.FourParameter, Coefficients: []float64{0.5, 0.3, -0.4, 0.2}}); err != nil || !reflect.DeepEqual(law, want) || !reflect.DeepEqual(errs, []float64{0, 0, 0.1, 0}) {
		t.Errorf("%+v, %v, error %v", law, errs, err)
	}
	table, err = Read([]byte("# law: linear\nwave_lo,wave_hi,u1\n1,2,0.5\n"))
	law, _, err2 := table.LawAt(1, 2)
	if want := (limb.Law{Name: limb.Linear, Coefficients: []float64{0.5}}); err != nil || err2 != nil || !reflect.DeepEqual(law, want) || table.U2[0] != 0 {
		t.Errorf("%+v, errors %v, %v", law, err, err2)
	}
	for data, want := range map[string]string{
		"# law: power-2\nwave_lo,wave_hi,u1,u2\n1,2,0.5,-1\n":    "the exponent u2 of the power-2 law is -1",
		"# law: cubic\nwave_lo,wave_hi,u1,u2\n1,2,0.5,-1\n":      `no limb-darkening law "cubic"`,
		"# law: Quadratic\nwave_lo,wave_hi,u1,u2\n5,6,0.5,0.1\n": "less than half of 1 to 2 um is covered",
	} {
		table, err := Read([]byte(data))
		if err != nil {
			t.Fatal(err)
		}
		if _, _, err := table.LawAt(1, 2); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: got error %v, expected %s", data, err, want)
		}
	}
	if _, err := Read([]byte("# law: three-parameter\nwave_lo,wave_hi,u1,u2\n1,2,0.5,0.1\n")); err == nil || !strings.Contains(err.Error(), `no column "u3"`) {
		t.Errorf("three-parameter law with two columns: error %v", err)
	}
}

func FuzzReadIntensities(f *testing.F) {
	f.Add([]byte(intensityCSV))
	f.Add([]byte("wave,throughput\n2,0.7\n1,0\n3,0.1\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		table, err := ReadIntensities(data)
		s, errS := ReadThroughput(data)
		runtime.ReadMemStats(&after)
		if used := after.TotalAlloc - before.TotalAlloc; used > uint64(len(data))*1000+512<<20 {
			t.Errorf("%d bytes allocated for a file of %d", used, len(data))
		}
		if err != nil {
			return
		}
		if errS != nil {
			s = Throughput{}
		}
		if p, err := Band(table, s, table.Wave[0], table.Wave[len(table.Wave)-1], Photons); err == nil {
			for _, law := range limb.Names() {
				FitLaw(p, Choice{Law: law})
				FitLaw(p, Choice{Law: law, Grid: GridRadius, Points: 10, Weight: WeightArea})
			}
		}
	})
}
