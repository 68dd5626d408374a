package limbtable

import (
	"reflect"
	"runtime"
	"strings"
	"testing"

	"rimlight/steps/fits"
	"rimlight/steps/lightcurve"
)

func fitsTable(t testing.TB, unit string, columns ...fits.NewColumn) []byte {
	t.Helper()
	var w fits.Writer
	all := append([]fits.NewColumn{
		{Name: "WAVE_LO", Unit: unit, Values: []float64{2, 1}},
		{Name: "WAVE_HI", Unit: unit, Values: []float64{3, 2}},
	}, columns...)
	if err := w.Table("LIMB", all, fits.StringCard("LIMBLAW", "quadratic", "")); err != nil {
		t.Fatal(err)
	}
	return w.Bytes()
}

func TestRead(t *testing.T) {
	want := Table{
		Channels: []lightcurve.Channel{{Index: 1, Lo: 1, Hi: 2}, {Index: 0, Lo: 2, Hi: 3}},
		U1:       []float64{0.1, 0.3}, U2: []float64{0.2, 0.4}, U1Err: []float64{0.01, 0.03}, U2Err: []float64{0.02, 0.04},
		Law: "quadratic",
	}
	csv := "# invented\n# Law: quadratic\nwave_lo,wave_hi,u1,u2,u1_err,u2_err,note\n2,3,0.3,0.4,0.03,0.04,7\n1,2,0.1,0.2,0.01,0.02,\n"
	if got, err := Read([]byte(csv)); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("CSV: %+v, %v", got, err)
	}
	data := fitsTable(t, "um",
		fits.NewColumn{Name: "U1", Values: []float64{0.3, 0.1}}, fits.NewColumn{Name: "U2", Values: []float64{0.4, 0.2}},
		fits.NewColumn{Name: "U1_ERR", Values: []float64{0.03, 0.01}}, fits.NewColumn{Name: "U2_ERR", Values: []float64{0.04, 0.02}})
	if got, err := Read(data); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("FITS: %+v, %v", got, err)
	}
	want.U1Err, want.U2Err, want.Law = nil, nil, ""
	csv = "wave_lo,wave_hi,u1,u2\n2,3,0.3,0.4\n1,2,0.1,0.2\n"
	if got, err := Read([]byte(csv)); err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("CSV without errors: %+v, %v", got, err)
	}
}

func TestReadErrors(t *testing.T) {
	u := fits.NewColumn{Name: "U1", Values: []float64{0.3, 0.1}}
	const head = "wave_lo,wave_hi,u1,u2,u1_err\n"
	for name, c := range map[string]struct{ data, want string }{
		"empty":        {"", "limb-darkening table: CSV: the file is empty"},
		"no rows":      {head, "the table has no rows"},
		"column":       {"wave_lo,wave_hi,u1\n1,2,3\n", `no column "u2"`},
		"cell":         {head + "1,2,x,3,0\n", `CSV: line 2, column 5 (u1): "x" is not a number`},
		"missing":      {head + "1,2,,3,0\n", "line 2: coefficient u1 is NaN"},
		"edges":        {head + "1,2,3,3,0\n2,1,1,1,0\n", "line 3: the channel from 2 to 1 um"},
		"error":        {head + "1,2,3,3,-1\n", "line 2: the error of coefficient u1 is -1"},
		"FITS column":  {string(fitsTable(t, "um", u)), `HDU 1 (LIMB) has no column "U2", but WAVE_LO, WAVE_HI, U1; nearest known name: U1`},
		"FITS unit":    {string(fitsTable(t, "nm", u)), `HDU 1 (LIMB): column WAVE_LO is in "nm", expected um`},
		"FITS cut":     {string(fitsTable(t, "um", u)[:4000]), "limb-darkening table: fits: HDU 1: the header has no END"},
		"FITS no LIMB": {string(fitsTable(t, "um", u)[:2880]), `fits: no HDU "LIMB"; the file has HDU 0 (PRIMARY)`},
		"gzip":         {"\x1f\x8b\x08", "limb-darkening table: fits: the gzip-compressed file is damaged or cut short"},
	} {
		if _, err := Read([]byte(c.data)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s:\n got %v\nwant %s", name, err, c.want)
		}
	}
}

func TestReadLaw(t *testing.T) {
	table, err := Read([]byte("# law: quadr\xe9\nwave_lo,wave_hi,u1,u2\n1,2,3,4\n"))
	if err != nil || table.Law != "quadr\ufffd" {
		t.Errorf("a law that is not UTF-8 text: %q, %v", table.Law, err)
	}
}

func FuzzRead(f *testing.F) {
	f.Add([]byte("# law: linear\nwave_lo,wave_hi,u1,u2\n1,2,0.1,0.2\n"))
	f.Add(fitsTable(f, "um", fits.NewColumn{Name: "U1", Values: []float64{1, 2}}, fits.NewColumn{Name: "U2", Values: []float64{1, 2}}))
	f.Fuzz(func(t *testing.T, data []byte) {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		table, err := Read(data)
		runtime.ReadMemStats(&after)
		if used := after.TotalAlloc - before.TotalAlloc; used > uint64(len(data))*500+256<<20 {
			t.Errorf("%d bytes allocated for a file of %d", used, len(data))
		}
		if err == nil {
			table.At(0.5, 5)
		}
	})
}
