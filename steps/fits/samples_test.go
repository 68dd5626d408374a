package fits

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"strconv"
	"strings"
	"testing"
)

const testdata = "../../testdata/fits"

// loadJSON reads a file of testdata/fits with numbers kept as written.
func loadJSON(t *testing.T, name string, into any) {
	t.Helper()
	f, err := os.Open(filepath.Join(testdata, name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	d := json.NewDecoder(f)
	d.UseNumber()
	if err := d.Decode(into); err != nil {
		t.Fatal(err)
	}
}

func sample(t testing.TB, name string) []byte {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(testdata, "samples", name))
	if err != nil {
		t.Fatal(err)
	}
	return data
}

func sampleNames(t testing.TB) []string {
	t.Helper()
	names, err := filepath.Glob(filepath.Join(testdata, "samples", "*"))
	if err != nil || len(names) != 34 {
		t.Fatalf("%d samples (%v), expected 34", len(names), err)
	}
	for i := range names {
		names[i] = filepath.Base(names[i])
	}
	return names
}

func TestSamplesAreUnchanged(t *testing.T) {
	sums := map[string]string{}
	loadJSON(t, "sha256.json", &sums)
	for _, name := range sampleNames(t) {
		sum := sha256.Sum256(sample(t, name))
		if got := hex.EncodeToString(sum[:]); got != sums[name] {
			t.Errorf("%s: SHA-256 %s, expected %s", name, got, sums[name])
		}
	}
}

// cell turns element i into what expected.json writes for it.
func cell(v *Values, i int) any {
	if v.IsNull(i) {
		return nil
	}
	switch v.Kind {
	case String:
		return v.Strings[i]
	case Logical:
		return v.Bools[i]
	case Integer:
		return json.Number(strconv.FormatInt(v.Ints[i], 10))
	case Unsigned:
		return json.Number(strconv.FormatUint(v.Uints[i], 10))
	case Complex:
		z := v.Complexes[i]
		return []any{number(real(z) + 0), number(imag(z) + 0)} // -0 stands as 0 in expected.json
	}
	return number(v.Floats[i])
}

func number(x float64) any {
	switch {
	case math.IsNaN(x), math.IsInf(x, 0):
		return strconv.FormatFloat(x, 'g', -1, 64)
	case x == 0 && math.Signbit(x):
		return "-0.0"
	}
	return json.Number(strconv.FormatFloat(x, 'g', -1, 64))
}

// nest arranges a row by its shape, first index fastest.
func nest(cells []any, dim []int) any {
	if len(dim) < 2 {
		return cells
	}
	last := dim[len(dim)-1]
	step := len(cells) / last
	out := make([]any, 0, last)
	for i := range last {
		out = append(out, nest(cells[i*step:(i+1)*step], dim[:len(dim)-1]))
	}
	return out
}

// rowsOf turns a column into what expected.json writes for it.
func rowsOf(v *Values, scalar bool) []any {
	rows := []any{}
	for r := 0; r+1 < len(v.Offsets); r++ {
		cells := []any{}
		bits := ""
		for i := v.Offsets[r]; i < v.Offsets[r+1]; i++ {
			if v.Kind == Bits {
				bits += map[bool]string{false: "0", true: "1"}[v.Bools[i]]
				continue
			}
			cells = append(cells, cell(v, i))
		}
		switch {
		case v.Kind == Bits:
			rows = append(rows, bits)
		case scalar || v.Kind == String && len(cells) == 1:
			rows = append(rows, cells[0])
		default:
			rows = append(rows, nest(cells, v.Dim))
		}
	}
	return rows
}

// same compares a value with expected.json: numbers by value, exactly.
func same(got, want any) bool {
	g, isList := got.([]any)
	w, alsoList := want.([]any)
	if isList || alsoList {
		if !isList || !alsoList || len(g) != len(w) {
			return false
		}
		for i := range g {
			if !same(g[i], w[i]) {
				return false
			}
		}
		return true
	}
	n, ok := got.(json.Number)
	if !ok {
		return reflect.DeepEqual(got, want)
	}
	text := strings.Trim(fmt.Sprint(want), `"`)
	if string(n) == text {
		return true
	}
	if strings.Trim(text, "-0123456789") == "" && strings.Trim(string(n), "-0123456789") == "" {
		return false // both integers: exact digits decide
	}
	x, _ := n.Float64()
	y, err := strconv.ParseFloat(text, 64)
	return err == nil && (x == y || x == float64(float32(y))) // C64 is listed in double precision
}

type expectation struct {
	Size    int64
	Valid   any
	HDU     int
	Extname string
	Rows    *int
	Columns map[string][]any
	Lenient map[string][]any `json:"columns_if_lenient"`
	Header  map[string]any
	Datasum []string
	HDUs    []string
	Primary []any
	SCI     []any
	LC1     map[string][]any
	LC2     map[string][]any
}

func expectations(t *testing.T) map[string]expectation {
	t.Helper()
	all := map[string]expectation{}
	loadJSON(t, "expected.json", &all)
	return all
}

func checkColumns(t *testing.T, table *Table, want map[string][]any) {
	t.Helper()
	if len(table.Columns) != len(want) {
		t.Errorf("%d columns, expected %d", len(table.Columns), len(want))
	}
	for i := range table.Columns {
		c := &table.Columns[i]
		v, err := table.Values(c.Label())
		if err != nil {
			t.Error(err)
			continue
		}
		expected, ok := want[c.Label()]
		if got := rowsOf(&v, c.Scalar()); !ok || !same(got, expected) {
			t.Errorf("column %s\n got %v\nwant %v", c.Label(), got, expected)
		}
	}
}

// TestReadableSamples compares everything that expected.json says.
func TestReadableSamples(t *testing.T) {
	warns := map[string]string{
		"09_no_final_padding.fits": "padding after the data is 2760 bytes short",
		"10_trailing_junk.fits":    "2880 bytes after the last HDU are not an HDU",
	}
	for name, want := range expectations(t) {
		if want.Valid == false {
			continue
		}
		t.Run(name, func(t *testing.T) {
			data := sample(t, name)
			if int64(len(data)) != want.Size {
				t.Fatalf("%d bytes, expected %d", len(data), want.Size)
			}
			f, err := Read(data)
			if err != nil {
				t.Fatal(err)
			}
			if got, w := strings.Join(f.Warnings, "\n"), warns[name]; (w == "") != (got == "") || !strings.Contains(got, w) {
				t.Errorf("warnings %q, expected %q", got, w)
			}
			if want.Columns != nil {
				h := f.HDUs[want.HDU]
				if want.Extname != "" && h.Name != want.Extname {
					t.Errorf("EXTNAME %q, expected %q", h.Name, want.Extname)
				}
				if want.Rows != nil && h.Table.Rows != *want.Rows {
					t.Errorf("%d rows, expected %d", h.Table.Rows, *want.Rows)
				}
				checkColumns(t, h.Table, want.Columns)
			}
			for key, value := range want.Header {
				if got := headerValue(t, &f.HDUs[want.HDU].Header, key); !same(got, value) {
					t.Errorf("%s = %#v, expected %#v", key, got, value)
				}
			}
		})
	}
}

func headerValue(t *testing.T, h *Header, key string) any {
	t.Helper()
	card, ok := h.Lookup(key)
	if !ok {
		t.Errorf("keyword %s not found", key)
	}
	var v any
	var err error
	switch card.Kind {
	case String:
		v, err = h.Text(key)
	case Logical:
		v, err = h.Bool(key)
	case Integer:
		var n int64
		n, err = h.Int(key)
		v = json.Number(strconv.FormatInt(n, 10))
	case Real:
		var x float64
		x, err = h.Float(key)
		v = number(x)
	case Complex:
		var z complex128
		z, err = h.Complex(key)
		v = []any{number(real(z)), number(imag(z))}
	}
	if err != nil {
		t.Error(err)
	}
	return v
}

func TestSeveralHDUs(t *testing.T) {
	want := expectations(t)["06_checksum_ok.fits"]
	f, err := Read(sample(t, "06_checksum_ok.fits"))
	if err != nil {
		t.Fatal(err)
	}
	if len(f.HDUs) != len(want.HDUs) {
		t.Fatalf("%d HDUs, expected %d", len(f.HDUs), len(want.HDUs))
	}
	for i, name := range want.HDUs {
		h, err := f.HDU(name)
		if err != nil || h.Index != i {
			t.Errorf("HDU %q: %v, %v", name, h, err)
		}
		if n, err := f.HDU(strconv.Itoa(i)); err != nil || n != h {
			t.Errorf("HDU %d: %v", i, err)
		}
	}
	for name, pixels := range map[string][]any{"PRIMARY": want.Primary, "sci": want.SCI} {
		m, err := f.Image(name)
		if err != nil {
			t.Fatal(err)
		}
		v, err := m.Values()
		if err != nil {
			t.Fatal(err)
		}
		if got := rowsOf(&v, false)[0]; !same(got, pixels) {
			t.Errorf("image %s: got %v, expected %v", name, got, pixels)
		}
	}
	for name, columns := range map[string]map[string][]any{"LC": want.LC1, "LC,2": want.LC2} {
		table, err := f.Table(name)
		if err != nil {
			t.Fatal(err)
		}
		checkColumns(t, table, columns)
	}
	for i, sum := range want.Datasum {
		if got, _ := f.HDUs[i].Header.Text("DATASUM"); got != sum {
			t.Errorf("DATASUM of HDU %d: %q, expected %q", i, got, sum)
		}
	}
	if _, err := f.HDU("LCS"); err == nil || !strings.Contains(err.Error(), "HDU 2 (LC)") || !strings.Contains(err.Error(), "nearest known name: LC") {
		t.Errorf("unknown HDU: %v", err)
	}
	if _, err := f.Table("SCI"); err == nil {
		t.Error("an image was given as a table")
	}
}

// readAll opens a file and reads everything in it.
func readAll(data []byte) error {
	f, err := Read(data)
	if err != nil {
		return err
	}
	for _, h := range f.HDUs {
		if h.Image != nil {
			if _, err := h.Image.Values(); err != nil {
				return err
			}
		}
		if h.Table == nil {
			continue
		}
		for i := range h.Table.Columns {
			if _, err := h.Table.ValuesAt(i + 1); err != nil {
				return err
			}
		}
	}
	_, err = f.VerifyChecksums()
	return err
}

// allocated is the number of bytes that do allocates.
func allocated(do func()) uint64 {
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	do()
	runtime.ReadMemStats(&after)
	return after.TotalAlloc - before.TotalAlloc
}

// TestBrokenSamples pins the one error of each broken file.
func TestBrokenSamples(t *testing.T) {
	want := map[string]string{
		"20_truncated_table.fits":     "fits: HDU 1 (LC): the file is cut short or the header is damaged: the data need 120 bytes, but 43 are missing",
		"21_truncated_header.fits":    "fits: HDU 1: the header has no END: the file is cut short after 1000 bytes of it",
		"22_naxis1_small.fits":        "fits: HDU 1: NAXIS1 = 8, but the fields need 12 bytes: the header is damaged",
		"23_naxis1_large.fits":        "fits: HDU 1: NAXIS1 = 16, but the fields need 12 bytes: the header is damaged",
		"24_pcount_lies.fits":         "fits: HDU 1: column V: row 2: the array of 1000 elements at byte 8 reaches beyond the heap of 16 bytes: the file is damaged",
		"25_negative_descriptor.fits": "fits: HDU 1: column V: row 1: the array has -5 elements at byte 0 of the heap: the descriptor is damaged",
		"26_huge_descriptor.fits":     "fits: HDU 1: column V: row 1: the array of 1152921504606846976 elements at byte 4611686018427387904 reaches beyond the heap of 16 bytes: the file is damaged",
		"28_huge_naxis2.fits":         "fits: HDU 1: the file is cut short or the header is damaged: the data need 13194139533312 bytes, but 13194139530432 are missing",
		"29_huge_tfields.fits":        "fits: HDU 1: TFIELDS = 2000000000, expected 0 to 999",
		"30_bad_tform.fits":           "fits: HDU 1: TFORM1 = '1Z', expected a repeat count and one of the letters L X B I J K A E D C M P Q",
		"31_huge_repeat.fits":         "fits: HDU 1: NAXIS1 = 12, but the fields need 7999999999999999996 bytes: the header is damaged",
		"32_negative_naxis2.fits":     "fits: HDU 1: NAXIS2 = -1 is negative",
		"33_missing_tform.fits":       "fits: HDU 1: keyword TFORM3 is missing; nearest known name: TFORM1",
		"34_huge_image.fits":          "fits: HDU 0 (PRIMARY): the header is damaged: the axes are too long to multiply",
		"35_garbage_header.fits":      "fits: HDU 0 (PRIMARY): the header is damaged: byte 0x80 stands between END and the end of the block, expected spaces",
		"36_unclosed_string.fits":     "fits: HDU 0 (PRIMARY): record 4 of the header: keyword OBJECT: the string 'never closed has no closing quote",
		"37_not_fits.fits":            `fits: not a FITS file: it starts with "hello, th" instead of "SIMPLE  ="`,
		"38_empty.fits":               "fits: the file is empty (0 bytes)",
		"39_naxis_1000.fits":          "fits: HDU 0 (PRIMARY): NAXIS = 1000000, expected 0 to 999",
	}
	for name, e := range expectations(t) {
		if e.Valid != false {
			continue
		}
		message, ok := want[name]
		if !ok {
			t.Errorf("%s: no message is pinned", name)
		}
		err := readAll(sample(t, name))
		if err == nil || err.Error() != message {
			t.Errorf("%s\n got %v\nwant %s", name, err, message)
		}
	}
}

// TestUndamagedRowsOfBrokenTable: what lies before the damage can be read.
func TestUndamagedRowsOfBrokenTable(t *testing.T) {
	f, err := Read(sample(t, "24_pcount_lies.fits"))
	if err != nil {
		t.Fatal(err)
	}
	c, err := f.HDUs[1].Table.Column("V")
	if err != nil {
		t.Fatal(err)
	}
	v, err := f.HDUs[1].Table.ValuesOf(c.Index, 0, 1)
	if err != nil || !reflect.DeepEqual(v.Floats, []float64{1.5, 2.5}) {
		t.Errorf("row 1: %v, %v", v.Floats, err)
	}
}

// TestSamplesMemory bounds what any sample may cost: the constant covers
// buffers and the checksum pass, the multiple is the package's promise.
func TestSamplesMemory(t *testing.T) {
	for _, name := range sampleNames(t) {
		data := sample(t, name)
		used := allocated(func() { _ = readAll(data) })
		if bound := uint64(len(data))*100 + 256<<10; used > bound {
			t.Errorf("%s: %d bytes allocated for a file of %d, expected at most %d", name, used, len(data), bound)
		}
	}
}
