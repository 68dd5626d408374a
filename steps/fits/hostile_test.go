package fits

import (
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"strings"
	"testing"
)

// rawHDU builds an HDU from records and data, padded, with no check at all.
func rawHDU(data []byte, records ...string) []byte {
	var b []byte
	for _, r := range append(records, "END") {
		b = append(b, record(r)...)
	}
	for len(b)%blockSize != 0 {
		b = append(b, ' ')
	}
	b = append(b, data...)
	for len(b)%blockSize != 0 {
		b = append(b, 0)
	}
	return b
}

var emptyPrimary = rawHDU(nil, "SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 0")

func rawTable(rowSize, rows, pcount int64, data []byte, columns ...string) []byte {
	records := []string{"XTENSION= 'BINTABLE'", "BITPIX  = 8", "NAXIS   = 2", fmt.Sprintf("NAXIS1  = %d", rowSize),
		fmt.Sprintf("NAXIS2  = %d", rows), fmt.Sprintf("PCOUNT  = %d", pcount), "GCOUNT  = 1"}
	return append(bytes.Clone(emptyPrimary), rawHDU(data, append(records, columns...)...)...)
}

func zipped(t *testing.T, data []byte) []byte {
	t.Helper()
	var b bytes.Buffer
	z, _ := gzip.NewWriterLevel(&b, gzip.BestCompression)
	if _, err := z.Write(data); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// TestHostileFiles: small files that claim or expand to much more.
func TestHostileFiles(t *testing.T) {
	// 20000 rows that all point at the same 80 000 bytes: 1.6 GB of elements.
	const rows, heap = 20000, 80000
	aliased := make([]byte, 8*rows+heap)
	for i := range rows {
		binary.BigEndian.PutUint32(aliased[8*i:], heap)
	}
	wide := make([]string, 999)
	for i := range wide {
		wide[i] = fmt.Sprintf("TFORM%d = '0J'", i+1)
	}
	for name, c := range map[string]struct {
		data []byte
		want string // "" when the file is fine
	}{
		"aliased arrays":      {rawTable(8, rows, heap, aliased, "TFIELDS = 1", "TFORM1  = 'PB'"), "too much for a file of"},
		"rows without bytes":  {rawTable(0, 1<<60, 0, nil, "TFIELDS = 1", "TFORM1  = '0J'"), "rows of NAXIS1 = 0 bytes"},
		"shape without bytes": {rawTable(1, 3, 0, make([]byte, 3), "TFIELDS = 1", "TFORM1  = '1A'", "TDIM1   = '(0,999999999)'"), ""},
		"shape overflows":     {rawTable(8, 1, 0, make([]byte, 8), "TFIELDS = 1", "TFORM1  = 'D'", "TDIM1   = '(4294967296,4294967296)'"), ""},
		"empty columns":       {rawTable(1, 5000, 0, make([]byte, 5000), append([]string{"TFIELDS = 1000", "TFORM1000= 'B'"}, wide...)...), "TFIELDS = 1000"},
		"gzip bomb":           {zipped(t, make([]byte, 64<<20)), "expands to more than"},
		"gzip cut":            {zipped(t, everything(t))[:500], "damaged or cut short"},
		"heap out of place":   {rawTable(8, 1, 8, make([]byte, 16), "TFIELDS = 1", "TFORM1  = 'PD'", "THEAP   = 99"), "THEAP = 99, expected 8"},
		"bits overflow":       {rawTable(1, 1, 0, make([]byte, 1), "TFIELDS = 1", "TFORM1  = '9223372036854775807X'"), "NAXIS1 = 1, but the fields need"},
		"repeat overflows":    {rawTable(1, 1, 0, make([]byte, 1), "TFIELDS = 1", "TFORM1  = '9223372036854775807M'"), "the repeat count is too large"},
		"size overflows":      {rawTable(1<<40, 1<<40, 0, nil, "TFIELDS = 0"), "too long to multiply"},
		"bad scale":           {rawTable(2, 1, 0, make([]byte, 2), "TFIELDS = 1", "TFORM1  = 'I'", "TSCAL1  = 'two'"), "keyword TSCAL1 = two, expected a number"},
		"bad logical":         {rawTable(1, 1, 0, []byte{1}, "TFIELDS = 1", "TFORM1  = 'L'"), "row 1: a logical value is byte 0x01"},
		"many records":        {append(bytes.Clone(emptyPrimary[:240]), strings.Repeat(record("A       = 1"), 36*20-3)...), "no END"},
		"many HDUs":           {append(bytes.Clone(emptyPrimary), bytes.Repeat(rawHDU(nil, "XTENSION= 'X'", "BITPIX  = 8", "NAXIS   = 0", "PCOUNT  = 0", "GCOUNT  = 1"), 200)...), ""},
	} {
		var err error
		used := allocated(func() { err = readAll(c.data) })
		if c.want == "" && err != nil || c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%s: %v, expected %q", name, err, c.want)
		}
		if bound := uint64(len(c.data))*10 + 512<<10; used > bound {
			t.Errorf("%s: %d bytes allocated for a file of %d, expected at most %d", name, used, len(c.data), bound)
		}
	}
}

func TestEveryTruncation(t *testing.T) {
	data := everything(t)
	whole, err := Read(data)
	if err != nil {
		t.Fatal(err)
	}
	for n := 0; n < len(data); n += 97 {
		f, err := Read(data[:n])
		if err == nil && len(f.Warnings) == 0 && len(f.HDUs) == len(whole.HDUs) {
			t.Errorf("cut to %d of %d bytes: neither error nor warning", n, len(data))
		}
		if err != nil && !strings.HasPrefix(err.Error(), "fits: ") {
			t.Errorf("cut to %d bytes: %v", n, err)
		}
	}
}

// failing is a file that cannot be read beyond a place.
type failing struct {
	io.ReaderAt
	limit int64
}

var errDisk = errors.New("disk error")

func (f failing) ReadAt(b []byte, at int64) (int, error) {
	if at+int64(len(b)) > f.limit {
		return 0, errDisk
	}
	return f.ReaderAt.ReadAt(b, at)
}

func TestReadErrorsAreReported(t *testing.T) {
	data := everything(t)
	for limit := int64(0); limit < int64(len(data)); limit += 1500 {
		f, err := Open(failing{bytes.NewReader(data), limit}, int64(len(data)))
		if err == nil {
			_, err = f.VerifyChecksums()
		}
		if !errors.Is(err, errDisk) {
			t.Fatalf("unreadable from byte %d on: %v", limit, err)
		}
	}
}

func FuzzRead(f *testing.F) {
	for _, name := range sampleNames(f) {
		f.Add(sample(f, name))
	}
	f.Add(everything(f))
	f.Fuzz(func(t *testing.T, data []byte) {
		bound := uint64(len(data))*200 + 2*headroom
		within := func(what string, do func()) {
			if used := allocated(do); used > bound {
				t.Errorf("%s allocated %d bytes for a file of %d", what, used, len(data))
			}
		}
		var file *File
		within("Read", func() { file, _ = Read(data) })
		if file == nil {
			return
		}
		within("VerifyChecksums", func() { _, _ = file.VerifyChecksums() })
		for _, h := range file.HDUs {
			if h.Image != nil {
				within("Image.Values", func() { _, _ = h.Image.Values() })
			}
			if h.Table == nil {
				continue
			}
			for i := range h.Table.Columns {
				within("Table.ValuesAt", func() { _, _ = h.Table.ValuesAt(i + 1) })
			}
		}
	})
}

// FuzzWrite writes what the fuzzer makes up and reads it again.
func FuzzWrite(f *testing.F) {
	f.Add("TIME", "d", "it's text &", 1.5, int64(-7), uint64(1<<63), true)
	f.Fuzz(func(t *testing.T, name, unit, text string, x float64, n int64, u uint64, b bool) {
		var w Writer
		err := w.Table("T", []NewColumn{
			{Name: name, Unit: unit, Values: []float64{x, -x}},
			{Name: "N", Values: []int64{n, ^n}},
			{Name: "U", Values: []uint64{u, ^u}},
			{Name: "B", Values: []bool{b, !b}},
			{Name: "S", Values: []string{text, ""}},
		}, StringCard("TEXT", text, unit), FloatCard("X", x, ""))
		if err != nil {
			return
		}
		file, err := Read(w.Bytes())
		if err != nil {
			t.Fatal(err)
		}
		if failed, err := file.VerifyChecksums(); err != nil || len(failed) > 0 {
			t.Fatal(failed, err)
		}
		table := file.HDUs[1].Table
		v, err := table.ValuesAt(1)
		if err != nil || v.Floats[0] != x && x == x {
			t.Fatal(v, err)
		}
		if v, err := table.Values("U"); name == "TIME" && (err != nil || v.Uints[0] != u) {
			t.Fatal(v, err)
		}
		trimmed := strings.TrimRight(text, " ")
		if v, err := table.ValuesAt(5); err != nil || v.Strings[0] != trimmed {
			t.Fatalf("%q, %v, expected %q", v.Strings, err, trimmed)
		}
		if got, err := file.HDUs[1].Header.Text("TEXT"); err != nil || got != trimmed {
			t.Fatalf("%q, %v, expected %q", got, err, trimmed)
		}
	})
}
