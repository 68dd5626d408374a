package fits

import (
	"errors"
	"fmt"
	"strings"
)

// A Type says what an HDU holds.
type Type uint8

// Types of HDUs.
const (
	OtherHDU    Type = iota // an extension that this package cannot read
	ImageHDU                // an image, or nothing (NAXIS = 0)
	BinaryTable             // BINTABLE
	ASCIITable              // TABLE
)

// String names the type as messages do.
func (t Type) String() string {
	names := [...]string{"data of another kind", "an image", "a binary table", "an ASCII table"}
	if int(t) < len(names) {
		return names[t]
	}
	return fmt.Sprintf("Type(%d)", uint8(t))
}

// An HDU is one header with its data.
type HDU struct {
	Index   int    // from 0
	Name    string // EXTNAME; empty when there is none
	Version int64  // EXTVER; 1 when there is none
	Type    Type
	Header  Header
	Table   *Table // for BinaryTable and ASCIITable
	Image   *Image // for ImageHDU

	file       *File
	offset     int64 // of the header
	dataOffset int64
	dataSize   int64 // without padding
}

// Label names the HDU as messages do: "HDU 1 (LIGHTCURVES)".
func (h *HDU) Label() string {
	switch {
	case h.Name != "" && h.Version != 1:
		return fmt.Sprintf("HDU %d (%.68s,%d)", h.Index, h.Name, h.Version)
	case h.Name != "":
		return fmt.Sprintf("HDU %d (%.68s)", h.Index, h.Name)
	case h.Index == 0:
		return "HDU 0 (PRIMARY)"
	}
	return fmt.Sprintf("HDU %d", h.Index)
}

// setName takes name and version from the header.
func (h *HDU) setName() {
	h.Name = h.Header.textOr("EXTNAME")
	if v, err := h.Header.Int("EXTVER"); err == nil {
		h.Version = v
	}
}

// maxAxes and maxFields are the largest NAXIS and TFIELDS that the standard
// allows (FITS 4.0 sections 4.4.1.1 and 7.3.1).
const (
	maxAxes   = 999
	maxFields = 999
)

// checkSize finds the type of the HDU, checks the mandatory keywords and
// returns the size of the data in bytes by the formula of FITS 4.0 section
// 4.4.1.2: |BITPIX|/8 x GCOUNT x (PCOUNT + NAXIS1 x ... x NAXISm).
func (h *HDU) checkSize(warn func(string, ...any)) (int64, error) {
	order := []string{"SIMPLE", "BITPIX", "NAXIS"}
	if h.Index == 0 {
		simple, err := h.Header.Bool("SIMPLE")
		if err != nil {
			return 0, err
		}
		if !simple {
			warn("SIMPLE = F: the file says that it does not follow the FITS standard")
		}
		h.Type = ImageHDU
	} else {
		kind, err := h.Header.Text("XTENSION")
		if err != nil {
			return 0, err
		}
		switch strings.Trim(kind, " ") {
		case "IMAGE", "IUEIMAGE":
			h.Type = ImageHDU
		case "BINTABLE", "A3DTABLE":
			h.Type = BinaryTable
		case "TABLE":
			h.Type = ASCIITable
		}
		order[0] = "XTENSION"
	}
	bitpix, err := h.Header.Int("BITPIX")
	if err != nil {
		return 0, err
	}
	switch bitpix {
	case 8, 16, 32, 64, -32, -64:
	default:
		return 0, fmt.Errorf("BITPIX = %d, expected 8, 16, 32, 64, -32 or -64", bitpix)
	}
	naxis, err := h.Header.Int("NAXIS")
	if err != nil {
		return 0, err
	}
	if naxis < 0 || naxis > maxAxes {
		return 0, fmt.Errorf("NAXIS = %d, expected 0 to %d", naxis, maxAxes)
	}
	axes := make([]int64, naxis)
	for i := range axes {
		key := fmt.Sprintf("NAXIS%d", i+1)
		if axes[i], err = h.Header.Int(key); err != nil {
			return 0, err
		}
		if axes[i] < 0 {
			return 0, fmt.Errorf("%s = %d is negative", key, axes[i])
		}
		order = append(order, key)
	}
	parameters, groups, err := h.groupCounts(&order)
	if err != nil {
		return 0, err
	}
	for i, key := range order {
		if i >= len(h.Header.Cards) || h.Header.Cards[i].Key != key {
			warn("the mandatory keywords are not in the order that the standard prescribes: %s should be record %d", key, i+1)
			break
		}
	}
	if h.Index == 0 && naxis > 0 && axes[0] == 0 {
		if grouped, err := h.Header.Bool("GROUPS"); err == nil && grouped {
			h.Type = OtherHDU // random groups: NAXIS1 = 0 marks them and does not count
			axes = axes[1:]
		}
	}
	h.setAxes(bitpix, axes)
	return dataSize(bitpix, axes, parameters, groups)
}

// groupCounts reads PCOUNT and GCOUNT, which extensions must have.
func (h *HDU) groupCounts(order *[]string) (parameters, groups int64, err error) {
	groups = 1
	for _, c := range []struct {
		key   string
		value *int64
	}{{"PCOUNT", &parameters}, {"GCOUNT", &groups}} {
		if h.Index == 0 && !h.Header.Has(c.key) {
			continue
		}
		if *c.value, err = h.Header.Int(c.key); err != nil {
			return 0, 0, err
		}
		if *c.value < 0 {
			return 0, 0, fmt.Errorf("%s = %d is negative", c.key, *c.value)
		}
		if h.Index > 0 {
			*order = append(*order, c.key)
		}
	}
	return parameters, groups, nil
}

// setAxes prepares the description of an image. Axes too long for the file are
// found when the size is compared with it.
func (h *HDU) setAxes(bitpix int64, axes []int64) {
	if h.Type != ImageHDU {
		return
	}
	h.Image = &Image{BitPix: int(bitpix), hdu: h}
	for _, n := range axes {
		h.Image.Axes = append(h.Image.Axes, int(n))
	}
}

func dataSize(bitpix int64, axes []int64, parameters, groups int64) (int64, error) {
	elements, ok := int64(0), true
	if len(axes) > 0 {
		elements = 1
	}
	empty := false
	for _, n := range axes {
		empty = empty || n == 0
	}
	for _, n := range axes {
		if empty {
			elements = 0
			break
		}
		if elements, ok = mul(elements, n); !ok {
			return 0, errors.New("the header is damaged: the axes are too long to multiply")
		}
	}
	total, ok1 := add(elements, parameters)
	total, ok2 := mul(total, groups)
	total, ok3 := mul(total, max(bitpix, -bitpix)/8)
	if !ok1 || !ok2 || !ok3 {
		return 0, errors.New("the header is damaged: the data's size is too large to compute")
	}
	return total, nil
}

// describe reads the keywords that say how the data are laid out.
func (h *HDU) describe(warn func(string, ...any)) error {
	switch h.Type {
	case ImageHDU:
		return h.Image.describe(warn)
	case BinaryTable, ASCIITable:
		t, err := describeTable(h, warn)
		if err != nil {
			return err
		}
		h.Table = t
	}
	return nil
}
