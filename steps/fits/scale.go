package fits

import (
	"math"
	"strconv"
)

// unsignedOffset is 2^63, the TZERO or BZERO by which unsigned 64-bit integers
// are stored as signed ones (FITS 4.0 table 19).
const unsignedOffset = 1 << 63

// scaling turns stored numbers into physical ones: zero + scale x stored.
type scaling struct {
	scale, zero float64
	exact       bool  // integers stay integers: scale is 1 and zero is offset
	offset      int64 // added to integers
	unsigned    bool  // exact, with an offset of 2^63
	hasNull     bool
	null        int64 // the stored integer that means undefined
}

// readScaling reads TSCALn, TZEROn and TNULLn, or BSCALE, BZERO and BLANK, for
// numbers stored with the given type code. An unusable keyword is an error,
// because values would be wrong without it.
func readScaling(h *Header, scaleKey, zeroKey, nullKey string, code byte, warn func(string, ...any)) (scaling, error) {
	s := scaling{scale: 1}
	var err error
	if h.Has(scaleKey) {
		if s.scale, err = h.Float(scaleKey); err != nil {
			return s, err
		}
	}
	if h.Has(zeroKey) {
		if s.zero, err = h.Float(zeroKey); err != nil {
			return s, err
		}
	}
	integer := code == 'B' || code == 'I' || code == 'J' || code == 'K'
	if nullKey != "" && h.Has(nullKey) {
		if !integer {
			warn("%s is ignored: only integers have an undefined value of their own", nullKey)
		} else if s.null, err = h.Int(nullKey); err != nil {
			return s, err
		} else {
			s.hasNull = true
		}
	}
	if integer && s.scale == 1 {
		s.setOffset(h, zeroKey, code)
	}
	return s, nil
}

// setOffset finds out whether adding zero keeps integers exact within int64 or
// uint64.
func (s *scaling) setOffset(h *Header, key string, code byte) {
	card, _ := h.Lookup(key)
	offset, err := strconv.ParseInt(card.Text, 10, 64)
	if card.Kind != Integer || err != nil {
		if s.zero != math.Trunc(s.zero) || math.Abs(s.zero) >= 1<<53 {
			s.exact = code == 'K' && s.zero == unsignedOffset
			s.unsigned = s.exact
			return
		}
		offset = int64(s.zero)
	}
	s.exact = offset == 0 || code != 'K' && offset > -1<<62 && offset < 1<<62
	s.offset = offset
}

// apply scales a number with a single rounding, which is the same on every
// processor and as close as the header's decimal numbers allow.
func (s *scaling) apply(stored float64) float64 {
	return math.FMA(s.scale, stored, s.zero)
}

// kind is the kind of the scaled values.
func (s *scaling) kind(code byte) Kind {
	switch code {
	case 'B', 'I', 'J', 'K':
		switch {
		case s.unsigned:
			return Unsigned
		case s.exact:
			return Integer
		}
		return Real
	case 'E', 'D':
		return Real
	case 'C', 'M':
		return Complex
	case 'L':
		return Logical
	case 'X':
		return Bits
	}
	return String
}
