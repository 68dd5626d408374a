package fits

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

// everything writes a file with every kind of column, image and card.
func everything(t testing.TB) []byte {
	t.Helper()
	var w Writer
	must := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	long := strings.Repeat("A long text, it's continued. ", 20) + "end"
	must(w.Image("", nil, nil, StringCard("ORIGIN", "invented", ""), StringCard("LONGTEXT", long, "over several records"),
		FloatCard("ANSWER", 42.5, "with a comment"), BoolCard("SIMULATD", true, ""), IntCard("NUMBER", -7, ""),
		IntCard("HIERARCH A LONG NAME", 3, ""), CommentCard("HISTORY", strings.Repeat("history ", 20))))
	must(w.Image("SCI", []int{3, 2}, []float32{1, 2, 3, 4, 5, float32(math.Inf(1))}, StringCard("BUNIT", "electron", "")))
	must(w.Image("U16", []int{3}, []uint16{0, 1, 65535}))
	must(w.Image("I64", []int{2}, []int64{math.MinInt64, math.MaxInt64}))
	must(w.Table("ALL", []NewColumn{
		{Name: "LOGICAL", Values: []bool{true, false, true}},
		{Name: "U8", Values: []uint8{0, 1, 255}},
		{Name: "I8", Values: []int8{-128, 0, 127}},
		{Name: "I16", Values: []int16{-32768, 0, 32767}},
		{Name: "U16", Values: []uint16{0, 1, 65535}},
		{Name: "I32", Values: []int32{math.MinInt32, 0, math.MaxInt32}, Unit: "count"},
		{Name: "U32", Values: []uint32{0, 1, math.MaxUint32}},
		{Name: "I64", Values: []int64{math.MinInt64, 9007199254740993, math.MaxInt64}},
		{Name: "U64", Values: []uint64{0, 1, math.MaxUint64}},
		{Name: "F32", Values: []float32{1.5, -0.25, 3e38}},
		{Name: "F64", Values: []float64{2459000.123456789, math.Inf(-1), 5e-324}, Unit: "d", About: "mid-exposure"},
		{Name: "C64", Values: []complex64{1 + 2i, 0, -1i}},
		{Name: "C128", Values: []complex128{1 + 2i, 0, -1i}},
		{Name: "TEXT", Values: []string{"", "a b", " lead"}},
		{Name: "TEXTS", Values: []string{"a", "bcd", "", "x", "y", "zz"}, Width: 2},
		{Name: "VECTOR", Values: []float64{1, 2, 3, 4, 5, 6}, Width: 2},
		{Name: "MATRIX", Values: []int16{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12}, Width: 4, Dim: []int{2, 2}},
	}, StringCard("OBSERVER", "nobody", "")))
	must(w.Table("EMPTY", []NewColumn{{Name: "T", Values: []float64{}}}))
	return w.Bytes()
}

func TestWriteThenRead(t *testing.T) {
	data := everything(t)
	if len(data)%blockSize != 0 {
		t.Errorf("%d bytes, expected whole blocks", len(data))
	}
	if again := everything(t); !bytes.Equal(data, again) {
		t.Error("writing the same twice gives different bytes")
	}
	f, err := Read(data)
	if err != nil {
		t.Fatal(err)
	}
	if failed, err := f.VerifyChecksums(); len(f.Warnings)+len(failed) != 0 || err != nil {
		t.Errorf("warnings %q, checksums %q, %v", f.Warnings, failed, err)
	}
	table, err := f.Table("ALL")
	if err != nil {
		t.Fatal(err)
	}
	for name, want := range map[string]any{
		"LOGICAL": []bool{true, false, true},
		"U8":      []int64{0, 1, 255}, "I8": []int64{-128, 0, 127}, "I16": []int64{-32768, 0, 32767},
		"U16": []int64{0, 1, 65535}, "I32": []int64{math.MinInt32, 0, math.MaxInt32},
		"U32": []int64{0, 1, math.MaxUint32}, "I64": []int64{math.MinInt64, 9007199254740993, math.MaxInt64},
		"U64": []uint64{0, 1, math.MaxUint64}, "F32": []float64{1.5, -0.25, float64(float32(3e38))},
		"F64":  []float64{2459000.123456789, math.Inf(-1), 5e-324},
		"C64":  []complex128{1 + 2i, 0, -1i},
		"C128": []complex128{1 + 2i, 0, -1i},
		"TEXT": []string{"", "a b", " lead"}, "TEXTS": []string{"a", "bcd", "", "x", "y", "zz"},
		"VECTOR": []float64{1, 2, 3, 4, 5, 6}, "MATRIX": []int64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12},
	} {
		v, err := table.Values(name)
		if err != nil {
			t.Error(err)
			continue
		}
		got := map[Kind]any{Logical: v.Bools, Integer: v.Ints, Unsigned: v.Uints, Real: v.Floats, Complex: v.Complexes, String: v.Strings}[v.Kind]
		if !reflect.DeepEqual(got, want) {
			t.Errorf("column %s: got %v, expected %v", name, got, want)
		}
	}
	if c, _ := table.Column("matrix"); !reflect.DeepEqual(c.Dim, []int{2, 2}) {
		t.Errorf("shape of MATRIX: %v", c.Dim)
	}
	if c, _ := table.Column("F64"); c.Unit != "d" {
		t.Errorf("unit of F64: %q", c.Unit)
	}
	rows, err := table.Float64Rows("VECTOR")
	if err != nil || !reflect.DeepEqual(rows, [][]float64{{1, 2}, {3, 4}, {5, 6}}) {
		t.Errorf("VECTOR: %v, %v", rows, err)
	}
	for name, want := range map[string][]float64{"SCI": {1, 2, 3, 4, 5, math.Inf(1)}, "U16": {0, 1, 65535}} {
		m, err := f.Image(name)
		if err != nil {
			t.Fatal(err)
		}
		if got, err := m.Float64s(); err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("image %s: %v, %v", name, got, err)
		}
	}
	if text, err := f.HDUs[0].Header.Text("LONGTEXT"); err != nil || len(text) != 20*29+3 || !strings.HasSuffix(text, "continued. end") {
		t.Errorf("LONGTEXT: %q, %v", text, err)
	}
}

func TestColumnWithoutName(t *testing.T) {
	var w Writer
	if err := w.Table("T", []NewColumn{{Values: []uint8{7, 8, 9}}}); err != nil {
		t.Fatal(err)
	}
	f, err := Read(w.Bytes())
	if err != nil {
		t.Fatal(err)
	}
	if v, err := f.HDUs[1].Table.Int64s("(column 1)"); err != nil || !reflect.DeepEqual(v, []int64{7, 8, 9}) {
		t.Errorf("%v, %v", v, err)
	}
}

func TestTypedAccessErrors(t *testing.T) {
	f, err := Read(everything(t))
	if err != nil {
		t.Fatal(err)
	}
	table, _ := f.Table("ALL")
	for _, c := range []struct {
		err  error
		want string
	}{
		{second(table.Float64s("TEXT")), "fits: HDU 4 (ALL): column TEXT holds string values, expected numbers"},
		{second(table.Float64s("VECTOR")), `fits: HDU 4 (ALL): column VECTOR has the format "2D", expected one value per row`},
		{second(table.Strings("U8")), "fits: HDU 4 (ALL): column U8 holds integer values, expected strings"},
		{second(table.Float64s("LOGICALL")), "nearest known name: LOGICAL"},
		{second(table.ValuesAt(19)), "fits: HDU 4 (ALL) has no column number 19, but 1 to 17"},
		{second(table.ValuesOf(1, 2, 9)), "has no rows 2 to 9"},
		{second(f.Image("ALL")), "is no image but holds a binary table"},
	} {
		if c.err == nil || !strings.Contains(c.err.Error(), c.want) {
			t.Errorf("got %v, expected %s", c.err, c.want)
		}
	}
}

func TestWriterRefuses(t *testing.T) {
	column := []NewColumn{{Name: "A", Values: []float64{1, 2}}}
	for name, do := range map[string]func(w *Writer) error{
		"rows differ": func(w *Writer) error {
			return w.Table("T", append(column, NewColumn{Name: "B", Values: []int16{1}}))
		},
		"width": func(w *Writer) error {
			return w.Table("T", []NewColumn{{Name: "A", Values: []int16{1, 2, 3}, Width: 2}})
		},
		"shape": func(w *Writer) error {
			return w.Table("T", []NewColumn{{Name: "A", Values: []int16{1}, Dim: []int{2}}})
		},
		"type":      func(w *Writer) error { return w.Table("T", []NewColumn{{Name: "A", Values: []int{1}}}) },
		"letters":   func(w *Writer) error { return w.Table("T", []NewColumn{{Name: "A", Values: []string{"é"}}}) },
		"unit":      func(w *Writer) error { return w.Table("T", []NewColumn{{Name: "A", Unit: "µm", Values: []int8{1}}}) },
		"axes":      func(w *Writer) error { return w.Image("I", []int{2, 2}, []int16{1}) },
		"pixels":    func(w *Writer) error { return w.Image("I", []int{1}, []string{"a"}) },
		"mandatory": func(w *Writer) error { return w.Table("T", column, IntCard("NAXIS1", 3, "")) },
		"checksum":  func(w *Writer) error { return w.Table("T", column, StringCard("CHECKSUM", "", "")) },
	} {
		var w Writer
		if err := do(&w); err == nil || !strings.HasPrefix(err.Error(), "fits: writing ") {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// outside finds another program to check with. Without it the test is skipped,
// or fails when RIMLIGHT_REQUIRE=1.
func outside(t *testing.T, name string, probe ...string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err == nil && len(probe) > 0 {
		err = exec.Command(path, probe...).Run()
	}
	if err != nil {
		message := fmt.Sprintf("%s %s is not there: install fitsverify and python3-astropy to run this check", name, strings.Join(probe, " "))
		if os.Getenv("RIMLIGHT_REQUIRE") == "1" {
			t.Fatal(message)
		}
		t.Skip(message)
	}
	return path
}

func TestFitsverifyAccepts(t *testing.T) {
	program := outside(t, "fitsverify")
	path := filepath.Join(t.TempDir(), "everything.fits")
	if err := os.WriteFile(path, everything(t), 0o666); err != nil {
		t.Fatal(err)
	}
	out, err := exec.Command(program, path).CombinedOutput()
	if err != nil || !strings.Contains(string(out), "Verification found 0 warning(s) and 0 error(s)") {
		t.Errorf("fitsverify: %v\n%s", err, out)
	}
}

func TestAstropyReadsTheSame(t *testing.T) {
	python := outside(t, "/usr/bin/python3", "-c", "import astropy")
	path := filepath.Join(t.TempDir(), "everything.fits")
	if err := os.WriteFile(path, everything(t), 0o666); err != nil {
		t.Fatal(err)
	}
	script := `
import sys, warnings
import numpy as np
from astropy.io import fits
warnings.simplefilter("error")
with fits.open(sys.argv[1], checksum=True) as f:
    f.verify("exception")
    h = f[0].header
    assert h["LONGTEXT"] == "A long text, it's continued. "*20 + "end", h["LONGTEXT"]
    assert h["ANSWER"] == 42.5 and h["SIMULATD"] is True and h["NUMBER"] == -7 and h["A LONG NAME"] == 3
    assert f["SCI"].data.tolist() == [[1, 2, 3], [4, 5, np.inf]]
    assert f["U16"].data.tolist() == [0, 1, 65535]
    assert f["I64"].data.tolist() == [-2**63, 2**63-1]
    d = f["ALL"].data
    want = dict(LOGICAL=[True, False, True], U8=[0, 1, 255], I8=[-128, 0, 127], I16=[-32768, 0, 32767],
        U16=[0, 1, 65535], I32=[-2**31, 0, 2**31-1], U32=[0, 1, 2**32-1], I64=[-2**63, 9007199254740993, 2**63-1],
        U64=[0, 1, 2**64-1], F64=[2459000.123456789, -np.inf, 5e-324], C128=[1+2j, 0, -1j],
        TEXT=["", "a b", " lead"], TEXTS=[["a", "bcd"], ["", "x"], ["y", "zz"]], VECTOR=[[1, 2], [3, 4], [5, 6]],
        MATRIX=[[[1, 2], [3, 4]], [[5, 6], [7, 8]], [[9, 10], [11, 12]]])
    for name, value in want.items():
        assert d[name].tolist() == value, (name, d[name].tolist())
    assert f["ALL"].columns["F64"].unit == "d"
    assert len(f["EMPTY"].data) == 0
print("same")
`
	out, err := exec.Command(python, "-c", script, path).CombinedOutput()
	if err != nil || strings.TrimSpace(string(out)) != "same" {
		t.Errorf("astropy: %v\n%s", err, out)
	}
}
