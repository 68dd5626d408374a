package fits

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// describeBinary reads TFORMn, TDIMn and the scaling of a column of a binary
// table.
func (c *Column) describeBinary(h *Header, warn func(string, ...any)) error {
	repeat, code, rest, ok := cutForm(strings.TrimSpace(c.Form))
	if !ok || !strings.ContainsRune("LXBIJKAEDCMPQ", rune(code)) {
		return fmt.Errorf("TFORM%d = '%.40s', expected a repeat count and one of the letters L X B I J K A E D C M P Q", c.Index, c.Form)
	}
	c.code, c.count = code, repeat
	if code == 'P' || code == 'Q' {
		if repeat > 1 || rest == "" || !strings.ContainsRune("LXBIJKAEDCM", rune(rest[0])) {
			return fmt.Errorf("TFORM%d = '%.40s', expected 1%ct or 0%ct with t one of L X B I J K A E D C M", c.Index, c.Form, code, code)
		}
		c.Variable, c.wide, c.code = true, code == 'Q', rest[0]
		c.size = repeat * elementSize(code)
	} else {
		if code == 'A' {
			c.substrings(rest)
		}
		if c.size, ok = storedSize(code, c.count); !ok {
			return fmt.Errorf("TFORM%d = '%.40s': the repeat count is too large: the header is damaged", c.Index, c.Form)
		}
	}
	var err error
	if c.scale, err = readScaling(h, key("TSCAL", c.Index), key("TZERO", c.Index), key("TNULL", c.Index), c.code, warn); err != nil {
		return err
	}
	c.Kind = c.scale.kind(c.code)
	if h.Has(key("TDIM", c.Index)) && !c.Variable && c.count > 0 {
		c.setDim(h.textOr(key("TDIM", c.Index)), warn)
	}
	c.setWidth()
	return nil
}

// cutForm splits "12X", "PE(3)" or "8A" into repeat count (1 when there is
// none), letter and rest.
func cutForm(form string) (repeat int64, code byte, rest string, ok bool) {
	digits := len(form) - len(strings.TrimLeft(form, "0123456789"))
	if digits == len(form) {
		return 0, 0, "", false
	}
	repeat = 1
	if digits > 0 {
		n, err := strconv.ParseInt(form[:digits], 10, 64)
		if err != nil {
			n = math.MaxInt64 // more than any file holds: refused with the row's size
		}
		repeat = n
	}
	return repeat, form[digits], form[digits+1:], true
}

// substrings reads the old convention rAw: strings of w characters each. Aw
// alone is one such string.
func (c *Column) substrings(rest string) {
	c.text = c.count
	w, err := strconv.ParseInt(rest, 10, 64)
	if err != nil || w <= 0 {
		return
	}
	if c.count == 1 {
		c.count, c.text = w, w
	} else if w <= c.count {
		c.text = w
	}
}

// setDim reads TDIMn = '(l,m,...)'. One that does not fit the repeat count
// cannot be used and only costs the column its shape.
func (c *Column) setDim(text string, warn func(string, ...any)) {
	inner, ok := strings.CutPrefix(strings.TrimSpace(text), "(")
	inner, ok2 := strings.CutSuffix(inner, ")")
	dim, product := []int{}, int64(1)
	ok = ok && ok2 && len(inner) < 4*maxAxes
	if ok {
		for _, field := range strings.Split(inner, ",") {
			n, err := strconv.ParseInt(strings.TrimSpace(field), 10, 64)
			if product, ok = mul(product, n); err != nil || n < 1 || !ok {
				ok = false
				break
			}
			dim = append(dim, int(n))
		}
	}
	if !ok || product > c.count {
		warn("TDIM%d = '%.40s' does not fit TFORM%d = '%.40s' and is ignored", c.Index, text, c.Index, c.Form)
		return
	}
	if c.code == 'A' {
		c.text, dim = int64(dim[0]), dim[1:]
		if len(dim) == 0 {
			c.count = c.text // one string; what follows it has no meaning
		}
	}
	if len(dim) > 0 {
		c.Dim = dim
	}
}

// setWidth computes the number of elements in a row.
func (c *Column) setWidth() {
	switch {
	case c.Variable:
		return
	case c.Dim != nil:
		c.Width = 1
		for _, n := range c.Dim {
			c.Width *= n
		}
	case c.code != 'A':
		c.Width = int(c.count)
	case c.text == 0: // 0A: one empty string
		c.Width = 1
	default:
		c.Width = int(c.count / c.text)
		if c.Width == 0 || c.count == c.text {
			c.Width = 1
		}
	}
}
