package lightcurve

import (
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"runtime"
	"strings"
	"testing"

	"rimlight/steps/fits"
)

// smallCube has three integrations of two channels and two auxiliaries.
func smallCube() Cube {
	return Cube{
		Time:     []float64{2459000.1, 2459000.2, 2459000.3},
		Channels: []Channel{{0, 0.6, 0.8}, {1, 0.8, 1.1}},
		Flux:     [][]float64{{1, 0.99, 1.01}, {2, 1.98, 2.02}},
		Err:      [][]float64{{0.1, 0.1, 0.1}, {0.2, 0.2, 0.2}},
		Mask:     [][]Flag{{0, 0, 0}, {0, 0, 0}},
		Aux:      []Series{{"X", "pixel", []float64{0.5, math.Pi, -0.1}}, {"AIRMASS", "", []float64{1.1, 1.2, 1.3}}},
	}
}

// table builds a file with the two tables, changed as the caller wants.
func fitsFile(t testing.TB, series, channels []fits.NewColumn) []byte {
	t.Helper()
	var w fits.Writer
	if err := w.Table("LIGHTCURVES", series); err != nil {
		t.Fatal(err)
	}
	if channels != nil {
		if err := w.Table("CHANNELS", channels); err != nil {
			t.Fatal(err)
		}
	}
	return w.Bytes()
}

type cols = []fits.NewColumn

func twoChannels() cols {
	return cols{{Name: "WAVE_LO", Unit: "um", Values: []float64{0.6, 0.8}}, {Name: "WAVE_HI", Unit: "um", Values: []float64{0.8, 1.1}}}
}

func TestWriteThenReadFITS(t *testing.T) {
	want := smallCube()
	data, err := WriteFITS(want)
	if err != nil {
		t.Fatal(err)
	}
	got, warnings, err := ReadFITS(data, nil)
	if err != nil || len(warnings) > 0 {
		t.Fatal(warnings, err)
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v\nwant %+v", got, want)
	}
}

func TestMasksOnReading(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	flux := []float64{1, nan, inf, 0, -1, 1, 1, 1, nan}
	sigma := []float64{1, 1, 1, 1, 1, nan, 0, -1, 0}
	want := []Flag{0, Missing, Missing, Zero, Negative, Missing, Negative, Negative, Missing | Negative}
	time := make([]float64, len(flux))
	for i := range time {
		time[i] = float64(i)
	}
	data := fitsFile(t, cols{{Name: "TIME", Values: time}, {Name: "FLUX", Values: flux}, {Name: "FLUX_ERR", Values: sigma}},
		cols{{Name: "WAVE_LO", Values: []float64{1}}, {Name: "WAVE_HI", Values: []float64{2}}})
	cube, warnings, err := ReadFITS(data, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(cube.Mask[0], want) {
		t.Errorf("mask %v, expected %v", cube.Mask[0], want)
	}
	for i, x := range cube.Flux[0] {
		if math.Float64bits(x) != math.Float64bits(flux[i]) {
			t.Errorf("flux %d is %g, expected %g as in the file", i, x, flux[i])
		}
	}
	if w := "8 of 9 samples are masked: 4 missing, 1 zero, 4 negative"; len(warnings) != 1 || warnings[0] != w {
		t.Errorf("warnings %q, expected %q", warnings, w)
	}
}

// TestSortsRowsAndChannels: times and wavelengths out of order.
func TestSortsRowsAndChannels(t *testing.T) {
	data := fitsFile(t, cols{
		{Name: "TIME", Unit: "d", Values: []float64{3, 1, 2}},
		{Name: "FLUX", Values: []float64{31, 32, 11, 12, 21, 22}, Width: 2},
		{Name: "X", Values: []int16{3, 1, 2}},
	}, cols{{Name: "WAVE_LO", Unit: "um", Values: []float64{2, 1}}, {Name: "WAVE_HI", Unit: "um", Values: []float64{3, 2}}})
	cube, warnings, err := ReadFITS(data, nil)
	if err != nil {
		t.Fatal(err)
	}
	want := Cube{
		Time:     []float64{1, 2, 3},
		Channels: []Channel{{1, 1, 2}, {0, 2, 3}},
		Flux:     [][]float64{{12, 22, 32}, {11, 21, 31}},
		Err:      [][]float64{{0, 0, 0}, {0, 0, 0}},
		Mask:     [][]Flag{{0, 0, 0}, {0, 0, 0}},
		Aux:      []Series{{Name: "X", Value: []float64{1, 2, 3}}},
	}
	if !reflect.DeepEqual(cube, want) {
		t.Errorf("got %+v\nwant %+v", cube, want)
	}
	text := strings.Join(warnings, "\n")
	if len(warnings) != 2 || !strings.Contains(text, "sorted") || !strings.Contains(text, "no flux errors") {
		t.Errorf("warnings %q", warnings)
	}
}

// TestOtherLayout: own names, units, an offset, images and other HDUs.
func TestOtherLayout(t *testing.T) {
	var w fits.Writer
	must := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	must(w.Table("SPEC", cols{
		{Name: "JD", Unit: "s", Values: []float64{0, 43200}},
		{Name: "DX", Unit: "pixel", Values: []float32{0.25, 0.5}},
		{Name: "NAME", Values: []string{"a", "b"}},
		{Name: "QUALITY", Values: []uint8{0, 1}},
	}))
	must(w.Image("COUNTS", []int{3, 2}, []float32{1, 2, 3, 4, 5, 6}))
	must(w.Image("SIGMA", []int{3, 2}, []float32{1, 1, 1, 2, 2, 2}))
	must(w.Table("GRID", cols{
		{Name: "BLUE", Unit: "nm", Values: []float64{500, 600, 700}, Width: 3},
		{Name: "RED", Unit: "m", Values: []float64{600, 700, 800}, Width: 3},
	}))
	must(w.Table("HK", cols{{Name: "TEMP", Unit: "mK", Values: []float64{1000, 2000}}}))
	cube, warnings, err := ReadFITS(w.Bytes(), Columns{
		{Role: "TIME", HDU: "SPEC", Name: "jd", Offset: 86400},
		{Role: "FLUX", HDU: "COUNTS"},
		{Role: "FLUX_ERR", HDU: "3"},
		{Role: "WAVE_LO", HDU: "GRID", Name: "BLUE"},
		{Role: "WAVE_HI", Name: "RED", Unit: "nm"},
		{Role: "X", Name: "DX"},
		{Role: "temperature", HDU: "HK", Name: "TEMP", Offset: 1, Unit: "K"},
	})
	if err != nil {
		t.Fatal(err)
	}
	want := Cube{
		Time:     []float64{1, 1.5},
		Channels: []Channel{{0, 0.5, 0.6}, {1, 0.6, 0.7}, {2, 0.7, 0.8}},
		Flux:     [][]float64{{1, 4}, {2, 5}, {3, 6}},
		Err:      [][]float64{{1, 2}, {1, 2}, {1, 2}},
		Mask:     [][]Flag{{0, 0}, {0, 0}, {0, 0}},
		Aux: []Series{{"X", "pixel", []float64{0.25, 0.5}}, {"QUALITY", "", []float64{0, 1}},
			{"temperature", "K", []float64{1001, 2001}}},
	}
	if !reflect.DeepEqual(cube, want) {
		t.Errorf("got %+v\nwant %+v", cube, want)
	}
	if len(warnings) != 1 || !strings.Contains(warnings[0], "left out because they do not hold one number per row: NAME") {
		t.Errorf("warnings %q", warnings)
	}
}

func TestComparison(t *testing.T) {
	star, other := smallCube(), smallCube()
	other.Time = []float64{1, 2, 3}
	other.Aux = nil
	data, err := WriteFITSComparison(star, other)
	if err != nil {
		t.Fatal(err)
	}
	got, _, err := ReadFITSComparison(data, nil)
	if err != nil || !reflect.DeepEqual(got, other) {
		t.Errorf("%+v, %v", got, err)
	}
	if got, _, err := ReadFITS(data, nil); err != nil || !reflect.DeepEqual(got, star) {
		t.Errorf("%+v, %v", got, err)
	}
	alone, err := WriteFITS(star)
	if err != nil {
		t.Fatal(err)
	}
	if _, _, err := ReadFITSComparison(alone, nil); err == nil || !strings.Contains(err.Error(), `no HDU "COMPARISON"; the file has HDU 0 (PRIMARY), HDU 1 (LIGHTCURVES), HDU 2 (CHANNELS)`) {
		t.Errorf("without the table: %v", err)
	}
	other.Channels[1].Hi = 9
	if _, err := WriteFITSComparison(star, other); err == nil {
		t.Error("other channels were accepted")
	}
}

func TestReadFITSErrors(t *testing.T) {
	time := fits.NewColumn{Name: "TIME", Unit: "d", Values: []float64{1, 2, 3}}
	flux := fits.NewColumn{Name: "FLUX", Values: []float64{1, 2, 3, 4, 5, 6}, Width: 2}
	with := func(c ...fits.NewColumn) cols { return c }
	renamed := func(c fits.NewColumn, name string) fits.NewColumn { c.Name = name; return c }
	times := func(unit string, v ...float64) fits.NewColumn {
		return fits.NewColumn{Name: "TIME", Unit: unit, Values: v}
	}
	edges := func(lo, hi []float64) cols {
		return cols{{Name: "WAVE_LO", Values: lo}, {Name: "WAVE_HI", Values: hi}}
	}
	for name, c := range map[string]struct {
		series, channels cols
		mapping          Columns
		want             string
	}{
		"no time":          {with(renamed(time, "TIMES"), flux), twoChannels(), nil, `light-curve table, TIME: fits: HDU 1 (LIGHTCURVES) has no column "TIME", but TIMES, FLUX; nearest known name: TIMES`},
		"no flux":          {with(time), twoChannels(), nil, `has no column "FLUX", but TIME`},
		"no channels":      {with(time, flux), nil, nil, `light-curve table, WAVE_LO: fits: no HDU "CHANNELS"; the file has HDU 0 (PRIMARY), HDU 1 (LIGHTCURVES); a column mapping can name another HDU`},
		"channel count":    {with(time, flux), edges([]float64{1}, []float64{2}), nil, "HDU 1 (LIGHTCURVES): column FLUX has 2 values in each row, but HDU 2 (CHANNELS): column WAVE_LO lists 1 channels"},
		"vector time":      {with(fits.NewColumn{Name: "TIME", Values: []float64{1, 2, 3, 4, 5, 6}, Width: 2}, flux), twoChannels(), nil, "column TIME has 2 values in each row, expected one"},
		"time NaN":         {with(times("d", 1, math.NaN(), 3), flux), twoChannels(), nil, "light-curve table: HDU 1 (LIGHTCURVES): column TIME: row 2: the time is NaN, expected a finite number"},
		"time twice":       {with(times("d", 2, 1, 2), flux), twoChannels(), nil, "row 1 and HDU 1 (LIGHTCURVES): column TIME: row 3 have the same time 2: remove one of them"},
		"time unit":        {with(times("BJD - 2450000", 1, 2, 3), flux), twoChannels(), nil, `the unit "BJD - 2450000" is not one of time, expected d, day`},
		"wave unit":        {with(time, flux), cols{{Name: "WAVE_LO", Unit: "Hz", Values: []float64{1, 2}}, {Name: "WAVE_HI", Values: []float64{1, 2}}}, nil, `column WAVE_LO: the unit "Hz" is not one of wavelength`},
		"edges swapped":    {with(time, flux), edges([]float64{1, 3}, []float64{2, 2.5}), nil, "HDU 2 (CHANNELS): column WAVE_LO: row 2: the channel from 3 to 2.5 um, expected 0 < WAVE_LO < WAVE_HI"},
		"edges NaN":        {with(time, flux), edges([]float64{1, math.NaN()}, []float64{2, 3}), nil, "row 2: the channel from NaN to 3 um"},
		"text flux":        {with(time, fits.NewColumn{Name: "FLUX", Values: []string{"a", "b", "c"}}), twoChannels(), nil, "column FLUX holds string values, expected numbers"},
		"error shape":      {with(time, flux, fits.NewColumn{Name: "FLUX_ERR", Values: []float64{1, 2, 3}}), twoChannels(), nil, "column FLUX_ERR has 3 rows of 1 values"},
		"no rows":          {with(times("d"), fits.NewColumn{Name: "FLUX", Values: []float64{}, Width: 2}), twoChannels(), nil, "light-curve table: the table has no integrations"},
		"mapped error":     {with(time, flux), twoChannels(), Columns{{Role: "FLUX_ERR", Name: "SIGMA"}}, `has no column "SIGMA"`},
		"mapped auxiliary": {with(time, flux), twoChannels(), Columns{{Role: "X", Name: "XPOS"}}, `light-curve table, X: fits: HDU 1 (LIGHTCURVES) has no column "XPOS"`},
		"auxiliary twice":  {with(time, flux, renamed(time, "X"), renamed(time, "Y")), twoChannels(), Columns{{Role: "x", Name: "Y"}}, "the auxiliary x is there twice"},
		"role twice":       {with(time, flux), twoChannels(), Columns{{Role: "TIME"}, {Role: "time"}}, "names the role time twice"},
		"no role":          {with(time, flux), twoChannels(), Columns{{Name: "A"}}, "has no role"},
	} {
		_, _, err := ReadFITS(fitsFile(t, c.series, c.channels), c.mapping)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s:\n got %v\nwant %s", name, err, c.want)
		}
	}
}

func TestTimeUnits(t *testing.T) {
	for unit, value := range map[string]float64{"": 1.5, "d": 1.5, "h": 36, "min": 2160, "s": 129600, "BJD_TDB": 1.5} {
		data := fitsFile(t, cols{{Name: "TIME", Unit: unit, Values: []float64{value}}, {Name: "FLUX", Values: []float64{1, 2}, Width: 2}}, twoChannels())
		cube, _, err := ReadFITS(data, nil)
		if err != nil || cube.Time[0] != 1.5 {
			t.Errorf("unit %q: %v, %v", unit, cube.Time, err)
		}
	}
	data := fitsFile(t, cols{{Name: "TIME", Unit: "MJD", Values: []float64{59000.25}}, {Name: "FLUX", Values: []float64{1, 2}, Width: 2}}, twoChannels())
	if _, warnings, err := ReadFITS(data, nil); err != nil || !strings.Contains(strings.Join(warnings, "\n"), "2400000.5") {
		t.Errorf("MJD: %q, %v", warnings, err)
	}
	cube, warnings, err := ReadFITS(data, Columns{{Role: "TIME", Offset: 2400000.5}})
	if err != nil || cube.Time[0] != 2459000.75 || strings.Contains(strings.Join(warnings, "\n"), "MJD") {
		t.Errorf("MJD with offset: %v, %q, %v", cube.Time, warnings, err)
	}
}

// TestChecksumWarning: a changed file is read, and said to be changed.
func TestChecksumWarning(t *testing.T) {
	data, err := WriteFITS(smallCube())
	if err != nil {
		t.Fatal(err)
	}
	data[2*2880+16] ^= 1
	_, warnings, err := ReadFITS(data, nil)
	if err != nil || len(warnings) != 2 || !strings.Contains(warnings[0], "do not match their DATASUM") {
		t.Errorf("%q, %v", warnings, err)
	}
}

func TestEveryTruncationOfFITS(t *testing.T) {
	data, err := WriteFITS(smallCube())
	if err != nil {
		t.Fatal(err)
	}
	whole, _, err := ReadFITS(data, nil)
	if err != nil {
		t.Fatal(err)
	}
	for n := 0; n < len(data); n += 31 {
		cube, warnings, err := ReadFITS(data[:n], nil)
		if err == nil && (len(warnings) == 0 || !reflect.DeepEqual(cube, whole)) {
			t.Errorf("cut to %d of %d bytes: read without error", n, len(data))
		}
	}
}

// allocated is the number of bytes that do allocates.
func allocated(do func()) uint64 {
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	do()
	runtime.ReadMemStats(&after)
	return after.TotalAlloc - before.TotalAlloc
}

func FuzzReadFITS(f *testing.F) {
	data, err := WriteFITS(smallCube())
	if err != nil {
		f.Fatal(err)
	}
	f.Add(data, "TIME", "X")
	f.Add(data[:len(data)-3000], "2", "WAVE_LO")
	f.Fuzz(func(t *testing.T, data []byte, hdu, name string) {
		for _, mapping := range []Columns{nil, {{Role: "FLUX", HDU: hdu, Name: name}, {Role: "WAVE_LO", HDU: hdu, Name: name}}} {
			var cube Cube
			var err error
			used := allocated(func() { cube, _, err = ReadFITS(data, mapping) })
			if bound := uint64(len(data))*500 + 256<<20; used > bound {
				t.Errorf("%d bytes allocated for a file of %d", used, len(data))
			}
			if err == nil {
				if err := cube.checkShape("fuzz"); err != nil {
					t.Error(err)
				}
			}
		}
	})
}

// TestOtherProgramsAcceptTheLayout checks a written file with fitsverify and
// astropy. Without them the test is skipped, or fails when RIMLIGHT_REQUIRE=1.
func TestOtherProgramsAcceptTheLayout(t *testing.T) {
	need := func(err error, what string) {
		t.Helper()
		if err != nil && os.Getenv("RIMLIGHT_REQUIRE") == "1" {
			t.Fatalf("%s is not there: %v", what, err)
		} else if err != nil {
			t.Skipf("%s is not there: %v", what, err)
		}
	}
	verify, err := exec.LookPath("fitsverify")
	need(err, "fitsverify")
	need(exec.Command("/usr/bin/python3", "-c", "import astropy").Run(), "python3-astropy")
	data, err := WriteFITSComparison(smallCube(), smallCube())
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "lightcurves.fits")
	if err := os.WriteFile(path, data, 0o666); err != nil {
		t.Fatal(err)
	}
	if out, err := exec.Command(verify, "-q", path).CombinedOutput(); err != nil || !strings.Contains(string(out), "verification OK") {
		t.Errorf("fitsverify: %v\n%s", err, out)
	}
	script := `
import sys, warnings
from astropy.table import Table
warnings.simplefilter("error")
t = Table.read(sys.argv[1], hdu="LIGHTCURVES")
assert t.colnames == ["TIME", "FLUX", "FLUX_ERR", "X", "AIRMASS"], t.colnames
assert str(t["TIME"].unit) == "d" and str(t["X"].unit) == "pix", t["X"].unit
assert t["TIME"].tolist() == [2459000.1, 2459000.2, 2459000.3]
assert t["FLUX"].tolist() == [[1, 2], [0.99, 1.98], [1.01, 2.02]]
c = Table.read(sys.argv[1], hdu="CHANNELS")
assert str(c["WAVE_LO"].unit) == "um" and c["WAVE_HI"].tolist() == [0.8, 1.1]
Table.read(sys.argv[1], hdu="COMPARISON")
print("same")
`
	out, err := exec.Command("/usr/bin/python3", "-c", script, path).CombinedOutput()
	if err != nil || strings.TrimSpace(string(out)) != "same" {
		t.Errorf("astropy: %v\n%s", err, out)
	}
}

// bigCube has the size of a long visit.
func bigCube(n, m int) Cube {
	c := Cube{Time: make([]float64, n)}
	for i := range c.Time {
		c.Time[i] = 2459000 + float64(i)/8640
	}
	for j := range m {
		lo := 0.6 + 0.05*float64(j)
		c.Channels = append(c.Channels, Channel{j, lo, lo + 0.05})
		flux, sigma := make([]float64, n), make([]float64, n)
		for i := range flux {
			flux[i], sigma[i] = 1+1e-3*math.Sin(float64(i*m+j)), 1e-3
		}
		c.Flux, c.Err, c.Mask = append(c.Flux, flux), append(c.Err, sigma), append(c.Mask, make([]Flag, n))
	}
	return c
}

func BenchmarkReadFITS(b *testing.B) {
	data, err := WriteFITS(bigCube(6000, 120))
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	b.ReportAllocs()
	for b.Loop() {
		if _, _, err := ReadFITS(data, nil); err != nil {
			b.Fatal(err)
		}
	}
}
