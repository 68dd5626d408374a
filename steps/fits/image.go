package fits

import "fmt"

// An Image is an array of numbers of any number of axes. An HDU without data
// has no axes.
type Image struct {
	Axes   []int // lengths NAXIS1, NAXIS2, ...; the first index varies fastest
	BitPix int   // type of the stored numbers: 8, 16, 32, 64, -32 or -64
	Unit   string

	hdu   *HDU
	scale scaling
}

// codeOf is the column type code of a BITPIX.
func codeOf(bitpix int) byte {
	switch bitpix {
	case 8:
		return 'B'
	case 16:
		return 'I'
	case 32:
		return 'J'
	case 64:
		return 'K'
	case -32:
		return 'E'
	}
	return 'D'
}

func (m *Image) describe(warn func(string, ...any)) (err error) {
	m.Unit = m.hdu.Header.textOr("BUNIT")
	m.scale, err = readScaling(&m.hdu.Header, "BSCALE", "BZERO", "BLANK", codeOf(m.BitPix), warn)
	return err
}

// Values reads the image: one row with all its elements, Dim being Axes.
// BSCALE, BZERO and BLANK are applied.
func (m *Image) Values() (Values, error) {
	code := codeOf(m.BitPix)
	size := elementSize(code)
	total := int64(0)
	if len(m.Axes) > 0 {
		total = 1
		for _, n := range m.Axes {
			total *= int64(n) // the product was checked against the file's size
		}
	}
	v := newValues(m.scale.kind(code), total)
	v.Dim = m.Axes
	v.Offsets = []int{0, int(total)}
	buffer := make([]byte, min(total*size, chunkSize))
	for at := int64(0); at < total; {
		n := min(total-at, int64(len(buffer))/size)
		raw := buffer[:n*size]
		if err := m.hdu.readData(raw, at*size); err != nil {
			return Values{}, err
		}
		if err := v.decode(int(at), code, &m.scale, raw, int(n)); err != nil {
			return Values{}, err
		}
		at += n
	}
	return v, nil
}

// Float64s reads the image as float64, undefined elements being NaN.
func (m *Image) Float64s() ([]float64, error) {
	v, err := m.Values()
	if err != nil {
		return nil, err
	}
	return v.Float64s()
}

// chunkSize is how many bytes of data are read at a time.
const chunkSize = 256 << 10

// readData fills b from the given place in the HDU's data.
func (h *HDU) readData(b []byte, at int64) error {
	if n, err := h.file.r.ReadAt(b, h.dataOffset+at); n < len(b) {
		return fmt.Errorf("fits: %s: reading %d bytes of data: %w", h.Label(), len(b), err)
	}
	return nil
}
