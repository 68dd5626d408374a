package lightcurve

import (
	"bytes"
	"math"
	"reflect"
	"strings"
	"testing"
)

const channelCSV = "channel,wave_lo,wave_hi\n0,0.6,0.8\n1,0.8,1.1\n"

func TestWriteThenReadCSV(t *testing.T) {
	want := smallCube()
	series, channels, err := WriteCSV(want)
	if err != nil {
		t.Fatal(err)
	}
	got, warnings, err := ReadCSV(series, channels, Columns{{Role: "X", Unit: "pixel"}})
	if err != nil || len(warnings) > 0 {
		t.Fatal(warnings, err)
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v\nwant %+v", got, want)
	}
}

// TestReadCSV: comments, quotes, blank and nan cells, columns and channels in
// any order.
func TestReadCSV(t *testing.T) {
	series := "\xef\xbb\xbf# a comment\n\"Time_BJD_TDB\", X ,err_001,flux_001,flux_000,err_000\r\n" +
		"2,0.5,0.2,22,12,0.1\r\n\n# another, with commas, and \"quotes\n1,,nan,NaN,\"11\",0.1\n"
	channels := "channel,wave_hi,wave_lo\n1,0.7,0.6\n0,0.9,0.8\n"
	cube, warnings, err := ReadCSV([]byte(series), []byte(channels), nil)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(cube.Time, []float64{1, 2}) || !reflect.DeepEqual(cube.Channels, []Channel{{1, 0.6, 0.7}, {0, 0.8, 0.9}}) {
		t.Errorf("times %v, channels %v", cube.Time, cube.Channels)
	}
	if !reflect.DeepEqual(cube.Flux[1], []float64{11, 12}) || !math.IsNaN(cube.Flux[0][0]) || cube.Flux[0][1] != 22 {
		t.Errorf("fluxes %v", cube.Flux)
	}
	if !reflect.DeepEqual(cube.Mask, [][]Flag{{Missing, 0}, {0, 0}}) {
		t.Errorf("masks %v", cube.Mask)
	}
	if x := cube.Aux[0]; x.Name != "X" || !math.IsNaN(x.Value[0]) || x.Value[1] != 0.5 {
		t.Errorf("auxiliaries %v", cube.Aux)
	}
	if len(warnings) != 2 {
		t.Errorf("warnings %q", warnings)
	}
}

func TestReadCSVOtherLayout(t *testing.T) {
	series := "mjd,pos,f0,f1\n59000,7,1,2\n59001,8,3,4\n"
	channels := "blue,red\n6000,8000\n8000,11000\n"
	cube, warnings, err := ReadCSV([]byte(series), []byte(channels), Columns{
		{Role: "TIME", Name: "mjd", Offset: 2400000.5},
		{Role: "FLUX", Name: "f"},
		{Role: "X", Name: "pos", Unit: "pixel", Offset: 1},
		{Role: "WAVE_LO", Name: "blue", Unit: "Angstrom"},
		{Role: "WAVE_HI", Name: "red", Unit: "Angstrom"},
	})
	if err != nil {
		t.Fatal(err)
	}
	want := Cube{
		Time:     []float64{2459000.5, 2459001.5},
		Channels: []Channel{{0, 0.6, 0.8}, {1, 0.8, 1.1}},
		Flux:     [][]float64{{1, 3}, {2, 4}},
		Err:      [][]float64{{0, 0}, {0, 0}},
		Mask:     [][]Flag{{0, 0}, {0, 0}},
		Aux:      []Series{{"X", "pixel", []float64{8, 9}}},
	}
	if !reflect.DeepEqual(cube, want) || len(warnings) != 1 {
		t.Errorf("got %+v, %q\nwant %+v", cube, warnings, want)
	}
}

func TestReadCSVErrors(t *testing.T) {
	const head = "time_bjd_tdb,flux_000,flux_001\n"
	for name, c := range map[string]struct {
		series, channels string
		mapping          Columns
		want             string
	}{
		"empty":             {"", channelCSV, nil, "light-curve CSV: the file is empty"},
		"only comments":     {"# nothing\n", channelCSV, nil, "light-curve CSV: the file is empty"},
		"no rows":           {head, channelCSV, nil, "light-curve CSV: the table has no integrations"},
		"no time":           {"time_bjd,flux_000,flux_001\n1,2,3\n", channelCSV, nil, `light-curve CSV: no column "time_bjd_tdb", but time_bjd, flux_000, flux_001; nearest known name: time_bjd`},
		"not a number":      {head + "1,2,3\n2,oops,3\n", channelCSV, nil, `light-curve CSV: line 3, column 3 (flux_000): "oops" is not a number`},
		"hexadecimal":       {head + "1,0x1p3,3\n", channelCSV, nil, `"0x1p3" is not a number`},
		"out of range":      {head + "1,1e999,3\n", channelCSV, nil, `line 2, column 3 (flux_000): the number "1e999" is out of range`},
		"short row":         {head + "1,2\n", channelCSV, nil, "light-curve CSV: line 2 has 2 cells, but the header names 3 columns"},
		"open quote":        {head + "1,\"2,3\n", channelCSV, nil, "light-curve CSV: line 2, column 8: extraneous or missing"},
		"stray quote":       {head + "1,2\"2,3\n", channelCSV, nil, "light-curve CSV: line 2, column 4: bare"},
		"nameless":          {"time_bjd_tdb,,flux_000\n", channelCSV, nil, "line 1, column 14: a column without a name"},
		"name twice":        {"time_bjd_tdb,X,x\n", channelCSV, nil, `line 1, column 16: the column name "x" stands there twice`},
		"channel missing":   {"time_bjd_tdb,flux_001\n1,2\n", channelCSV, nil, "light-curve CSV: no column flux_000, but 1 others: the channel CSV lists 2 channels"},
		"channel too many":  {"time_bjd_tdb,flux_000,flux_001,flux_002\n1,2,3,4\n", channelCSV, nil, "column flux_002, but the channel CSV lists 2 channels"},
		"channel twice":     {"time_bjd_tdb,flux_0,flux_00,flux_1\n1,2,3,4\n", channelCSV, nil, "columns flux_0 and flux_00 are both channel 0"},
		"no flux":           {"time_bjd_tdb,X\n1,2\n", channelCSV, nil, "no such column: flux_000, for the first of 2 channels"},
		"error missing":     {"time_bjd_tdb,flux_000,flux_001,err_000\n1,2,3,4\n", channelCSV, nil, "no column err_001"},
		"time missing":      {head + "1,2,3\n,2,3\n", channelCSV, nil, "light-curve CSV: line 3: the time is NaN, expected a finite number"},
		"time twice":        {head + "1,2,3\n# c\n1,2,3\n", channelCSV, nil, "line 2 and line 4 have the same time 1"},
		"edges":             {head + "1,2,3\n", "channel,wave_lo,wave_hi\n0,1,2\n1,3,3\n", nil, "channel 1: the channel from 3 to 3 um"},
		"edge column":       {head + "1,2,3\n", "channel,wave_low,wave_hi\n0,1,2\n", nil, `channel CSV: no column "wave_lo", but channel, wave_low, wave_hi; nearest known name: wave_low`},
		"channel number":    {head + "1,2,3\n", "channel,wave_lo,wave_hi\n0,1,2\n2,2,3\n", nil, "channel CSV: line 3: channel 2, expected the numbers 0 to 1"},
		"channel repeated":  {head + "1,2,3\n", "channel,wave_lo,wave_hi\n0,1,2\n0,2,3\n", nil, "channel CSV: line 3: channel 0 is there twice"},
		"no channels":       {head + "1,2,3\n", "channel,wave_lo,wave_hi\n", nil, "column flux_000, but the channel CSV lists 0 channels"},
		"mapped auxiliary":  {head + "1,2,3\n", channelCSV, Columns{{Role: "X", Name: "XPOS"}}, `auxiliary X: no column "XPOS"`},
		"mapped twice":      {"time_bjd_tdb,X,flux_000,flux_001\n1,2,3,4\n", channelCSV, Columns{{Role: "a", Name: "X"}, {Role: "b", Name: "X"}}, "auxiliary b: the column X has another role already"},
		"mapped error":      {head + "1,2,3\n", channelCSV, Columns{{Role: "FLUX_ERR", Name: "sig_"}}, "no such column: sig_000"},
		"endless mapping":   {head + "1,2,3\n", channelCSV, make(Columns, 257), "the column mapping has 257 rows, expected at most 256"},
		"long role":         {head + "1,2,3\n", channelCSV, Columns{{Role: strings.Repeat("X", 201)}}, "is not UTF-8 text of up to 200 bytes"},
		"unknown time unit": {head + "1,2,3\n", channelCSV, Columns{{Role: "TIME", Unit: "year"}}, `column time_bjd_tdb: the unit "year" is not one of time`},
	} {
		_, _, err := ReadCSV([]byte(c.series), []byte(c.channels), c.mapping)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s:\n got %v\nwant %s", name, err, c.want)
		}
	}
}

// TestHostileCSVMemory: what costs little to write must cost little to refuse.
func TestHostileCSVMemory(t *testing.T) {
	long := bytes.Repeat([]byte{','}, 1<<18)
	var names strings.Builder
	names.WriteString("time_bjd_tdb")
	for i := range 20000 {
		names.WriteString(",a")
		for n := i; n > 0; n /= 36 {
			names.WriteByte("0123456789abcdefghijklmnopqrstuvwxyz"[n%36])
		}
	}
	for name, series := range map[string][]byte{
		"commas":     long,
		"many names": []byte(names.String()),
		"blank rows": append([]byte("a,b\n"), bytes.Repeat([]byte(",\n"), 1<<16)...),
		"open quote": append([]byte("a\n\""), bytes.Repeat([]byte{'\n'}, 1<<19)...),
		"long rows":  append([]byte("a,b\n"), long...),
		"newlines":   bytes.Repeat([]byte{'\n'}, 1<<18),
		"comments":   bytes.Repeat([]byte("#\n"), 1<<19),
	} {
		var err error
		used := allocated(func() { _, _, err = ReadCSV(series, []byte(channelCSV), nil) })
		if err == nil {
			t.Errorf("%s: no error", name)
		}
		if bound := uint64(len(series)) * 200; used > bound {
			t.Errorf("%s: %d bytes allocated for %d, expected at most %d (%v)", name, used, len(series), bound, err)
		}
		t.Logf("%s: %.1f bytes a byte: %.100v", name, float64(used)/float64(len(series)), err)
	}
}

func FuzzReadCSV(f *testing.F) {
	series, channels, err := WriteCSV(smallCube())
	if err != nil {
		f.Fatal(err)
	}
	f.Add(series, channels, "", "")
	f.Add([]byte("# c\ntime_bjd_tdb,x,flux_0\n1,\"2\",nan\n"), []byte("wave_lo,wave_hi\n1,2\n"), "flux_", "nm")
	f.Fuzz(func(t *testing.T, series, channels []byte, prefix, unit string) {
		var cube Cube
		var err error
		mapping := Columns{{Role: "FLUX", Name: prefix}, {Role: "WAVE_LO", Unit: unit}, {Role: "WAVE_HI", Unit: unit}}
		used := allocated(func() { cube, _, err = ReadCSV(series, channels, mapping) })
		if bound := uint64(len(series)+len(channels))*500 + 1<<20; used > bound {
			t.Errorf("%d bytes allocated for %d and %d", used, len(series), len(channels))
		}
		if err != nil {
			return
		}
		if err := cube.checkShape("fuzz"); err != nil {
			t.Fatal(err)
		}
		// What was read can be written and read again, unless a name is odd.
		series, channels, err = WriteCSV(cube)
		if err != nil {
			return
		}
		again, _, err := ReadCSV(series, channels, nil)
		if err != nil {
			for _, s := range cube.Aux {
				if strings.HasPrefix(strings.ToLower(s.Name), "flux_") || strings.HasPrefix(strings.ToLower(s.Name), "err_") || strings.EqualFold(s.Name, "time_bjd_tdb") {
					return
				}
			}
			t.Fatal(err)
		}
		for i := range cube.Time {
			if again.Time[i] != cube.Time[i] {
				t.Fatalf("time %d: %g, then %g", i, cube.Time[i], again.Time[i])
			}
		}
	})
}

func BenchmarkReadCSV(b *testing.B) {
	series, channels, err := WriteCSV(bigCube(1000, 120))
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(series)))
	b.ReportAllocs()
	for b.Loop() {
		if _, _, err := ReadCSV(series, channels, nil); err != nil {
			b.Fatal(err)
		}
	}
}
