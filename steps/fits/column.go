package fits

import (
	"encoding/binary"
	"fmt"
	"strings"
)

// Values reads a column. TSCALn, TZEROn and TNULLn are applied, in
// variable-length columns to the values in the heap. Errors name the column
// and, where one is to blame, the row, counting from 1.
func (t *Table) Values(name string) (Values, error) {
	c, err := t.Column(name)
	if err != nil {
		return Values{}, err
	}
	return t.ValuesAt(c.Index)
}

// ValuesAt reads column number index, from 1.
func (t *Table) ValuesAt(index int) (Values, error) {
	if index < 1 || index > len(t.Columns) {
		return Values{}, fmt.Errorf("fits: %s has no column number %d, but 1 to %d", t.hdu.Label(), index, len(t.Columns))
	}
	return t.ValuesOf(index, 0, t.Rows)
}

// ValuesOf reads rows first up to end (from 0, end not included) of column
// number index.
func (t *Table) ValuesOf(index, first, end int) (Values, error) {
	if index < 1 || index > len(t.Columns) || first < 0 || end < first || end > t.Rows {
		return Values{}, fmt.Errorf("fits: %s has no rows %d to %d of column number %d", t.hdu.Label(), first, end, index)
	}
	c := &t.Columns[index-1]
	var v Values
	var err error
	switch {
	case t.hdu.Type == ASCIITable:
		v, err = t.readASCII(c, first, end)
	case c.Variable:
		v, err = t.readVariable(c, first, end)
	default:
		v, err = t.readFixed(c, first, end)
	}
	if err != nil {
		return Values{}, fmt.Errorf("fits: %s: column %s: %w", t.hdu.Label(), c.Label(), err)
	}
	return v, nil
}

// eachField calls do with the bytes of a column's field in each row. The bytes
// are good only during the call.
func (t *Table) eachField(c *Column, first, end int, do func(row int, field []byte) error) error {
	if c.size == 0 {
		for row := first; row < end; row++ {
			if err := do(row, nil); err != nil {
				return fmt.Errorf("row %d: %w", row+1, err)
			}
		}
		return nil
	}
	// Short rows are read many at a time, of long ones only the field.
	start, stride, batch := c.offset, c.size, int64(1)
	if t.rowSize <= chunkSize/2 {
		start, stride, batch = 0, t.rowSize, min(chunkSize/t.rowSize, int64(end-first))
	}
	buffer := make([]byte, batch*stride)
	for row := first; row < end; {
		n := min(batch, int64(end-row))
		chunk := buffer[:n*stride]
		if err := t.hdu.readData(chunk, int64(row)*t.rowSize+start); err != nil {
			return err
		}
		for ; n > 0; n-- {
			at := c.offset - start
			if err := do(row, chunk[at:at+c.size]); err != nil {
				return fmt.Errorf("row %d: %w", row+1, err)
			}
			chunk = chunk[stride:]
			row++
		}
	}
	return nil
}

// readFixed reads a column whose rows all have the same width.
func (t *Table) readFixed(c *Column, first, end int) (Values, error) {
	rows, width := int64(end-first), int64(c.Width)
	v := newValues(c.Kind, rows*width) // at most rows x stored bytes x 8 (bits)
	v.Dim = c.Dim
	v.setEqualRows(rows, width)
	err := t.eachField(c, first, end, func(row int, field []byte) error {
		at := (row - first) * c.Width
		if c.code != 'A' {
			return v.decode(at, c.code, &c.scale, field, c.Width)
		}
		for i := range c.Width {
			text := field[int64(i)*c.text:]
			v.Strings[at+i] = strings.TrimRight(cutText(text[:c.text]), " ")
		}
		return nil
	})
	return v, err
}

// readVariable reads a column of arrays in the heap (FITS 4.0 section 7.3.5).
func (t *Table) readVariable(c *Column, first, end int) (Values, error) {
	rows := end - first
	offsets := make([]int, rows+1)
	longest, memory := int64(0), int64(0)
	limit := allowance(t.hdu.file.size)
	err := t.eachField(c, first, end, func(row int, field []byte) error {
		n, start := descriptor(c.wide, field)
		size, ok := storedSize(c.code, n)
		if n < 0 || n > 0 && start < 0 {
			return fmt.Errorf("the array has %d elements at byte %d of the heap: the descriptor is damaged", n, start)
		}
		if n > 0 && (!ok || size > t.heapSize || start > t.heapSize-size) {
			return fmt.Errorf("the array of %d elements at byte %d reaches beyond the heap of %d bytes: the file is damaged", n, start, t.heapSize)
		}
		longest = max(longest, size)
		elements, each := n, memorySize(c.Kind)
		if c.code == 'A' {
			elements, each = 1, each+n // one string
		}
		if memory += elements * each; memory > limit {
			return fmt.Errorf("the arrays up to here take more than %d bytes, which is too much for a file of %d bytes", limit, t.hdu.file.size)
		}
		offsets[row-first+1] = offsets[row-first] + int(elements)
		return nil
	})
	if err != nil {
		return Values{}, err
	}
	v := newValues(c.Kind, int64(offsets[rows]))
	v.Offsets = offsets
	buffer := make([]byte, longest)
	err = t.eachField(c, first, end, func(row int, field []byte) error {
		n, start := descriptor(c.wide, field)
		size, _ := storedSize(c.code, n)
		raw := buffer[:size]
		if size > 0 {
			if err := t.hdu.readData(raw, t.heap+start); err != nil {
				return err
			}
		}
		at := v.Offsets[row-first]
		if c.code == 'A' {
			v.Strings[at] = cutText(raw)
			return nil
		}
		return v.decode(at, c.code, &c.scale, raw, int(n))
	})
	return v, err
}

// memorySize is the number of bytes that one element takes in memory, for
// strings without the text.
func memorySize(kind Kind) int64 {
	switch kind {
	case Logical, Bits:
		return 1
	case String, Complex:
		return 16
	}
	return 8
}

// descriptor reads the number of elements and the offset of an array. A field
// of no bytes is an empty array.
func descriptor(wide bool, field []byte) (n, start int64) {
	switch {
	case len(field) == 0:
		return 0, 0
	case wide:
		return int64(binary.BigEndian.Uint64(field)), int64(binary.BigEndian.Uint64(field[8:]))
	}
	return int64(int32(binary.BigEndian.Uint32(field))), int64(int32(binary.BigEndian.Uint32(field[4:])))
}
