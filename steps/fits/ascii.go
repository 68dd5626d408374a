package fits

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// describeASCII reads TFORMn (Aw, Iw, Fw.d, Ew.d, Dw.d), TBCOLn and TNULLn of
// a column of an ASCII table (FITS 4.0 section 7.2).
func (c *Column) describeASCII(h *Header, warn func(string, ...any)) error {
	form := strings.TrimSpace(c.Form)
	var width, point int64
	var err error
	ok := form != "" && strings.ContainsRune("AIFED", rune(form[0]))
	if ok {
		w, d, _ := strings.Cut(form[1:], ".")
		if width, err = strconv.ParseInt(w, 10, 32); err != nil || width < 1 {
			ok = false
		}
		if d != "" {
			if point, err = strconv.ParseInt(d, 10, 16); err != nil || point < 0 {
				ok = false
			}
		}
	}
	if !ok {
		return fmt.Errorf("TFORM%d = '%.40s', expected Aw, Iw, Fw.d, Ew.d or Dw.d", c.Index, c.Form)
	}
	first, err := h.Int(key("TBCOL", c.Index))
	if err != nil {
		return err
	}
	if first < 1 || first > 1<<31 {
		return fmt.Errorf("TBCOL%d = %d, expected 1 or more", c.Index, first)
	}
	c.code, c.offset, c.size, c.Width, c.point = form[0], first-1, width, 1, int(point)
	if card, found := h.Lookup(key("TNULL", c.Index)); found && card.Kind == String {
		c.null, c.isNull = strings.Trim(card.Text, " "), true
	}
	if c.code == 'A' {
		c.Kind = String
		return nil
	}
	code := byte('D')
	if c.code == 'I' {
		code = 'K'
	}
	if c.scale, err = readScaling(h, key("TSCAL", c.Index), key("TZERO", c.Index), "", code, warn); err != nil {
		return err
	}
	if c.Kind = c.scale.kind(code); c.Kind == Unsigned {
		c.Kind = Real // the convention belongs to stored binary integers
	}
	return nil
}

// readASCII reads a column of an ASCII table. A field of spaces is undefined:
// Fortran would read it as zero, which would invent a measurement.
func (t *Table) readASCII(c *Column, first, end int) (Values, error) {
	rows := int64(end - first)
	v := newValues(c.Kind, rows)
	v.setEqualRows(rows, 1)
	err := t.eachField(c, first, end, func(row int, field []byte) error {
		i := row - first
		text := cutText(field)
		trimmed := strings.Trim(text, " ")
		if c.isNull && trimmed == c.null || trimmed == "" && c.Kind != String {
			v.setNull(i)
			if c.Kind == Real {
				v.Floats[i] = math.NaN()
			}
			return nil
		}
		switch c.Kind {
		case String:
			v.Strings[i] = strings.TrimRight(text, " ")
		case Integer:
			n, err := strconv.ParseInt(trimmed, 10, 64)
			if err != nil || !isInteger(trimmed) {
				return fmt.Errorf("%.40q is not an integer", trimmed)
			}
			v.Ints[i] = n
		default:
			x, err := c.parseReal(trimmed)
			if err != nil {
				return err
			}
			v.Floats[i] = c.scale.float(x)
		}
		return nil
	})
	return v, err
}

// parseReal reads a real. Without a decimal point the last digits of the
// mantissa stand behind an implied one (FITS 4.0 section 7.2.5).
func (c *Column) parseReal(text string) (float64, error) {
	if !isReal(text) && !isInteger(text) {
		return 0, fmt.Errorf("%.40q is not a number", text)
	}
	if c.code != 'I' && c.point > 0 && !strings.Contains(text, ".") {
		mantissa, exponent := text, ""
		if i := strings.IndexAny(text, "EDed"); i >= 0 {
			mantissa, exponent = text[:i], text[i:]
		}
		digits := trimSign(mantissa)
		sign := mantissa[:len(mantissa)-len(digits)]
		if pad := c.point - len(digits); pad > 0 {
			digits = strings.Repeat("0", pad) + digits
		}
		cut := len(digits) - c.point
		text = sign + digits[:cut] + "." + digits[cut:] + exponent
	}
	return parseFloat(text)
}
