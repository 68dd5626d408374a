package fits

import (
	"fmt"
	"strings"

	"rimlight/steps/nearest"
)

// A Table is a binary or an ASCII table.
type Table struct {
	Rows    int
	Columns []Column

	hdu      *HDU
	rowSize  int64
	heap     int64 // start of the heap, from the start of the data
	heapSize int64
}

// A Column describes one field of a table.
type Column struct {
	Index    int    // from 1, as in the header's keywords
	Name     string // TTYPEn; may be empty
	Unit     string // TUNITn; may be empty
	Form     string // TFORMn as in the header
	Kind     Kind   // of the values, after scaling
	Variable bool   // the rows hold arrays of different lengths
	Width    int    // elements in a row; 0 for variable columns
	Dim      []int  // TDIMn, first index fastest, for strings without their length; nil when there is none

	code   byte  // type letter of the elements
	count  int64 // stored elements in a row: characters for strings
	wide   bool  // descriptors of 64 bits
	text   int64 // characters of one string
	offset int64 // of the field in the row
	size   int64 // of the field in bytes
	scale  scaling
	null   string // ASCII tables: the field that means undefined
	isNull bool   // null is set
	point  int    // ASCII tables: digits behind an implied decimal point
}

// Label is the column's name, or "(column 3)" when it has none. Both can be
// used to ask for the column.
func (c *Column) Label() string {
	if c.Name == "" {
		return fmt.Sprintf("(column %d)", c.Index)
	}
	return c.Name
}

// Column finds a column by name; letter case does not count. Of several with
// one name the first is taken.
func (t *Table) Column(name string) (*Column, error) {
	name = strings.TrimSpace(name)
	known := make([]string, len(t.Columns))
	for i := range t.Columns {
		c := &t.Columns[i]
		if strings.EqualFold(c.Label(), name) {
			return c, nil
		}
		known[i] = c.Label()
	}
	list := "no columns"
	if len(known) > 30 {
		list = fmt.Sprintf("%s and %d more", strings.Join(known[:30], ", "), len(known)-30)
	} else if len(known) > 0 {
		list = strings.Join(known, ", ")
	}
	return nil, fmt.Errorf("fits: %s has no column %.40q, but %s%s", t.hdu.Label(), name, list, nearest.Hint(name, known))
}

// Label names the table's HDU: "HDU 1 (LIGHTCURVES)".
func (t *Table) Label() string { return t.hdu.Label() }

// Header is the header of the table's HDU.
func (t *Table) Header() *Header { return &t.hdu.Header }

// describeTable reads the columns' keywords and checks that the fields fill
// the rows and the rows fill the data.
func describeTable(h *HDU, warn func(string, ...any)) (*Table, error) {
	need := map[string]int64{"BITPIX": 8, "NAXIS": 2, "GCOUNT": 1}
	for _, key := range []string{"BITPIX", "NAXIS", "GCOUNT"} {
		if v, _ := h.Header.Int(key); v != need[key] {
			return nil, fmt.Errorf("%s = %d, but in a table it is %d: the header is damaged", key, v, need[key])
		}
	}
	rowSize, _ := h.Header.Int("NAXIS1") // these three were checked with the size
	rows, _ := h.Header.Int("NAXIS2")
	pcount, _ := h.Header.Int("PCOUNT")
	if rowSize == 0 && rows > h.file.size {
		return nil, fmt.Errorf("NAXIS2 = %d rows of NAXIS1 = 0 bytes: the header is damaged", rows)
	}
	t := &Table{Rows: int(rows), hdu: h, rowSize: rowSize, heap: rows * rowSize, heapSize: pcount}
	fields, err := h.Header.Int("TFIELDS")
	if err != nil {
		return nil, err
	}
	if fields < 0 || fields > maxFields {
		return nil, fmt.Errorf("TFIELDS = %d, expected 0 to %d", fields, maxFields)
	}
	for n := 1; n <= int(fields); n++ {
		c := Column{Index: n, Name: h.Header.textOr(key("TTYPE", n)), Unit: h.Header.textOr(key("TUNIT", n))}
		if c.Form, err = h.Header.Text(key("TFORM", n)); err != nil {
			return nil, err
		}
		if h.Type == BinaryTable {
			err = c.describeBinary(&h.Header, warn)
		} else {
			err = c.describeASCII(&h.Header, warn)
		}
		if err != nil {
			return nil, err
		}
		t.Columns = append(t.Columns, c)
	}
	if h.Header.Has(key("TFORM", int(fields)+1)) {
		warn("TFORM%d is there, but TFIELDS = %d: further columns are ignored", fields+1, fields)
	}
	if err := t.placeFields(); err != nil {
		return nil, err
	}
	return t, t.placeHeap()
}

func key(root string, n int) string { return fmt.Sprintf("%s%d", root, n) }

// placeFields computes the fields' places in a row. They follow each other
// without gaps in a binary table (FITS 4.0 section 7.3.1); in an ASCII table
// TBCOLn says where they are.
func (t *Table) placeFields() error {
	need, ok := int64(0), true
	for i := range t.Columns {
		c := &t.Columns[i]
		if t.hdu.Type == ASCIITable {
			if end := c.offset + c.size; end > t.rowSize {
				return fmt.Errorf("column %s ends at character %d, but NAXIS1 = %d: the header is damaged", c.Label(), end, t.rowSize)
			}
			continue
		}
		c.offset = need
		if need, ok = add(need, c.size); !ok {
			return fmt.Errorf("TFORM%d = '%.20s': the fields are too long to add up: the header is damaged", c.Index, c.Form)
		}
	}
	if t.hdu.Type == BinaryTable && need != t.rowSize {
		return fmt.Errorf("NAXIS1 = %d, but the fields need %d bytes: the header is damaged", t.rowSize, need)
	}
	return nil
}

// placeHeap finds the heap, which starts THEAP bytes after the start of the
// table and ends PCOUNT bytes after the table's end.
func (t *Table) placeHeap() error {
	h := &t.hdu.Header
	if !h.Has("THEAP") || t.hdu.Type != BinaryTable {
		return nil
	}
	start, err := h.Int("THEAP")
	if err != nil {
		return err
	}
	if start < t.heap || start > t.heap+t.heapSize {
		return fmt.Errorf("THEAP = %d, expected %d (the end of the table) to %d (the end of the data): the header is damaged",
			start, t.heap, t.heap+t.heapSize)
	}
	t.heapSize -= start - t.heap
	t.heap = start
	return nil
}
