package fits

import (
	"fmt"
	"strings"
)

// A Writer puts together a FITS file in memory, HDU by HDU; its zero value is
// an empty file. Every HDU gets DATASUM and CHECKSUM, but no date, so that the
// same content gives the same bytes.
type Writer struct {
	data []byte
}

// Bytes returns the file written so far.
func (w *Writer) Bytes() []byte { return w.data }

// Image adds an image HDU, the primary one if it is the first. pixels is a
// slice of numbers (float64, float32, int64, int32, int16, uint8 or their
// unsigned and signed counterparts), the first axis varying fastest, its
// length the product of axes. No axes and nil pixels make an HDU without
// data. name is the EXTNAME and may be empty.
func (w *Writer) Image(name string, axes []int, pixels any, cards ...Card) error {
	err := w.image(name, axes, pixels, cards)
	if err != nil {
		return fmt.Errorf("fits: writing image %.40q: %w", name, err)
	}
	return nil
}

func (w *Writer) image(name string, axes []int, pixels any, cards []Card) error {
	if pixels == nil {
		pixels = []uint8{}
	}
	f, err := newField(pixels)
	if err != nil {
		return err
	}
	want := 0
	if len(axes) > 0 {
		want = 1
	}
	for _, n := range axes {
		if n < 0 {
			return fmt.Errorf("an axis of length %d", n)
		}
		want *= n
	}
	if len(axes) > maxAxes || want != f.length {
		return fmt.Errorf("%d pixels for axes %v, expected %d", f.length, axes, want)
	}
	if f.bitpix == 0 {
		return fmt.Errorf("an image cannot hold values of type %T", pixels)
	}
	primary := len(w.data) == 0
	var head []Card
	if primary {
		head = append(head, BoolCard("SIMPLE", true, "conforms to FITS standard"))
	} else {
		head = append(head, StringCard("XTENSION", "IMAGE", "image extension"))
	}
	head = append(head,
		IntCard("BITPIX", f.bitpix, "bits per pixel, negative for reals"),
		IntCard("NAXIS", int64(len(axes)), "number of axes"))
	for i, n := range axes {
		head = append(head, IntCard(key("NAXIS", i+1), int64(n), ""))
	}
	if primary {
		head = append(head, BoolCard("EXTEND", true, "extensions may follow"))
	} else {
		head = append(head, IntCard("PCOUNT", 0, ""), IntCard("GCOUNT", 1, ""))
	}
	if f.zero != 0 {
		head = append(head, zeroCards("BSCALE", "BZERO", f)...)
	}
	data := make([]byte, 0, padded(int64(f.length*f.size)))
	for i := range f.length {
		data = f.put(data, i)
	}
	return w.add(name, head, cards, data)
}

// A NewColumn is a column to be written. Values is a slice with Width elements
// for each row, one row after another: []bool, []string, []float64,
// []complex128 or a narrower or integer counterpart; the type decides how the
// column is stored. Width 0 means 1. Dim gives the rows a shape, first index
// fastest, and may be nil. Strings keep no spaces at their end.
type NewColumn struct {
	Name   string
	Unit   string // FITS-standard unit string; empty for a pure number
	About  string // comment beside the name
	Values any
	Width  int
	Dim    []int
}

// Table adds a binary table; an empty primary HDU is put before it if it is
// the first. All columns must have the same number of rows. name is the
// EXTNAME and may be empty.
func (w *Writer) Table(name string, columns []NewColumn, cards ...Card) error {
	if len(w.data) == 0 {
		if err := w.Image("", nil, nil); err != nil {
			return err
		}
	}
	if err := w.table(name, columns, cards); err != nil {
		return fmt.Errorf("fits: writing table %.40q: %w", name, err)
	}
	return nil
}

func (w *Writer) table(name string, columns []NewColumn, cards []Card) error {
	if len(columns) > maxFields {
		return fmt.Errorf("%d columns, expected at most %d", len(columns), maxFields)
	}
	fields := make([]field, len(columns))
	rows, rowSize := 0, 0
	var described []Card
	for i, c := range columns {
		f, err := newField(c.Values)
		if err != nil {
			return fmt.Errorf("column %s: %w", c.Name, err)
		}
		f.width = max(c.Width, 1)
		if f.length%f.width != 0 {
			return fmt.Errorf("column %s has %d values, expected a multiple of the width %d", c.Name, f.length, f.width)
		}
		if n := f.length / f.width; i == 0 {
			rows = n
		} else if n != rows {
			return fmt.Errorf("column %s has %d rows, but column %s has %d", c.Name, n, columns[0].Name, rows)
		}
		about, err := c.describe(i+1, &f)
		if err != nil {
			return err
		}
		described = append(described, about...)
		rowSize += f.width * f.size
		fields[i] = f
	}
	data := make([]byte, 0, padded(int64(rows)*int64(rowSize)))
	for row := range rows {
		for i := range fields {
			f := &fields[i]
			for j := range f.width {
				data = f.put(data, row*f.width+j)
			}
		}
	}
	head := append([]Card{
		StringCard("XTENSION", "BINTABLE", "binary table extension"),
		IntCard("BITPIX", 8, ""),
		IntCard("NAXIS", 2, ""),
		IntCard("NAXIS1", int64(rowSize), "bytes in a row"),
		IntCard("NAXIS2", int64(rows), "rows"),
		IntCard("PCOUNT", 0, ""),
		IntCard("GCOUNT", 1, ""),
		IntCard("TFIELDS", int64(len(columns)), "columns"),
	}, described...)
	return w.add(name, head, cards, data)
}

// describe makes the keywords of column n.
func (c *NewColumn) describe(n int, f *field) ([]Card, error) {
	if len(c.Name) > longestText || len(c.Unit) > longestText || strings.Contains(c.Name+c.Unit, "'") {
		return nil, fmt.Errorf("column %.68q: name and unit must fit %d characters and have no quotes", c.Name, longestText)
	}
	var cards []Card
	if c.Name != "" {
		cards = append(cards, StringCard(key("TTYPE", n), c.Name, c.About))
	}
	repeat, dim := f.width, c.Dim
	if f.code == 'A' {
		repeat *= f.size
		if f.width > 1 && dim == nil {
			dim = []int{f.width}
		}
	}
	form := fmt.Sprintf("%d%c", repeat, f.code)
	cards = append(cards, StringCard(key("TFORM", n), form, ""))
	if c.Unit != "" {
		cards = append(cards, StringCard(key("TUNIT", n), c.Unit, ""))
	}
	if f.zero != 0 {
		cards = append(cards, zeroCards(key("TSCAL", n), key("TZERO", n), *f)...)
	}
	if dim == nil {
		return cards, nil
	}
	shape, product := make([]string, 0, len(dim)+1), 1
	if f.code == 'A' {
		shape = append(shape, fmt.Sprint(f.size))
	}
	for _, d := range dim {
		shape = append(shape, fmt.Sprint(d))
		product *= d
	}
	if product != f.width {
		return nil, fmt.Errorf("column %s: the shape %v does not fit a width of %d", c.Name, dim, f.width)
	}
	return append(cards, StringCard(key("TDIM", n), "("+strings.Join(shape, ",")+")", "")), nil
}

// zeroCards say by which offset unsigned integers are stored.
func zeroCards(scaleKey, zeroKey string, f field) []Card {
	return []Card{
		IntCard(scaleKey, 1, ""),
		{zeroKey, Integer, fmt.Sprintf("%.0f", f.zero), "offset of the stored integers"},
	}
}

// add appends an HDU: the mandatory cards, the name, the caller's cards, the
// checksums, and the data with their padding.
func (w *Writer) add(name string, head, cards []Card, data []byte) error {
	if name != "" {
		if len(name) > longestText || strings.Contains(name, "'") {
			return fmt.Errorf("the name must fit %d characters and have no quotes", longestText)
		}
		head = append(head, StringCard("EXTNAME", name, "name of this HDU"))
	}
	taken := make(map[string]bool, len(head))
	for _, c := range head {
		taken[c.Key] = true
	}
	for _, c := range cards {
		if taken[c.Key] || c.Key == "CHECKSUM" || c.Key == "DATASUM" {
			return fmt.Errorf("keyword %s is written by itself", c.Key)
		}
		if c.Kind == String && len(strings.ReplaceAll(c.Text, "'", "''")) > longestText && !taken["LONGSTRN"] {
			head = append(head, StringCard("LONGSTRN", "OGIP 1.0", "long strings are continued"))
			taken["LONGSTRN"] = true
		}
	}
	for len(data)%blockSize != 0 {
		data = append(data, 0)
	}
	sum := sum32(0, data)
	var header []byte
	var err error
	for _, c := range append(head, cards...) {
		if header, err = appendRecords(header, c); err != nil {
			return err
		}
	}
	blank := StringCard("CHECKSUM", strings.Repeat("0", 16), "makes the sum of this HDU all ones")
	place := len(header) + 11
	if header, err = appendRecords(header, blank); err != nil {
		return err
	}
	if header, err = appendRecords(header, StringCard("DATASUM", fmt.Sprint(sum), "sum of the data")); err != nil {
		return err
	}
	header = append(header, fmt.Sprintf("%-80s", "END")...)
	for len(header)%blockSize != 0 {
		header = append(header, ' ')
	}
	copy(header[place:], encodeChecksum(sumWords(sum32(0, header), sum)))
	w.data = append(append(w.data, header...), data...)
	return nil
}
