package fits

import (
	"fmt"
	"strconv"
	"strings"

	"rimlight/steps/nearest"
)

// A Header is the list of cards of one HDU, without END. Keywords are looked
// up without regard to letter case; of a keyword that occurs twice the first
// counts.
type Header struct {
	Cards []Card
	first map[string]int // place of each keyword's first card
}

// Lookup returns the first card of a keyword. "HIERARCH " before a long name
// may be left out.
func (h *Header) Lookup(key string) (Card, bool) {
	key = strings.ToUpper(strings.Trim(key, " "))
	i, ok := h.first[key]
	if !ok {
		i, ok = h.first["HIERARCH "+key]
	}
	if !ok {
		return Card{}, false
	}
	return h.Cards[i], true
}

// Has reports whether a keyword is there and has a value.
func (h *Header) Has(key string) bool {
	card, ok := h.Lookup(key)
	return ok && card.Kind != Undefined && card.Kind != Commentary
}

// card finds a keyword that must be there and be of one of the given kinds.
func (h *Header) card(key string, want string, kinds ...Kind) (Card, error) {
	card, ok := h.Lookup(key)
	if !ok {
		known := make([]string, len(h.Cards))
		for i, c := range h.Cards {
			known[i] = c.Key
		}
		return Card{}, fmt.Errorf("keyword %s is missing%s", key, nearest.Hint(key, known))
	}
	for _, k := range kinds {
		if card.Kind == k {
			return card, nil
		}
	}
	if card.Kind == Undefined {
		return Card{}, fmt.Errorf("keyword %s has no value, expected %s", key, want)
	}
	return Card{}, fmt.Errorf("keyword %s = %.40s, expected %s", key, card.Text, want)
}

// Text returns a string value, without the spaces at its end.
func (h *Header) Text(key string) (string, error) {
	card, err := h.card(key, "a string", String)
	return card.Text, err
}

// Int returns an integer value; one beyond the range of int64 is an error.
func (h *Header) Int(key string) (int64, error) {
	card, err := h.card(key, "an integer", Integer)
	if err != nil {
		return 0, err
	}
	v, err := strconv.ParseInt(card.Text, 10, 64)
	if err != nil {
		return 0, fmt.Errorf("keyword %s = %.40s is out of range", key, card.Text)
	}
	return v, nil
}

// Float returns a real or integer value.
func (h *Header) Float(key string) (float64, error) {
	card, err := h.card(key, "a number", Real, Integer)
	if err != nil {
		return 0, err
	}
	v, err := parseFloat(card.Text)
	if err != nil {
		return 0, fmt.Errorf("keyword %s: %w", key, err)
	}
	return v, nil
}

// Bool returns a logical value.
func (h *Header) Bool(key string) (bool, error) {
	card, err := h.card(key, "T or F", Logical)
	return card.Text == "T", err
}

// Complex returns a complex value.
func (h *Header) Complex(key string) (complex128, error) {
	card, err := h.card(key, "a complex number (re, im)", Complex)
	if err != nil {
		return 0, err
	}
	re, im, _ := cutComplex(card.Text)
	x, err := parseFloat(re)
	if err != nil {
		return 0, fmt.Errorf("keyword %s: %w", key, err)
	}
	y, err := parseFloat(im)
	if err != nil {
		return 0, fmt.Errorf("keyword %s: %w", key, err)
	}
	return complex(x, y), nil
}

// textOr returns a string value, or "" when there is none.
func (h *Header) textOr(key string) string {
	if card, ok := h.Lookup(key); ok && card.Kind == String {
		return strings.Trim(card.Text, " ")
	}
	return ""
}

// parseHeader reads the records before END. Complaints that leave the header
// usable go to warn.
func parseHeader(text string, warn func(format string, args ...any)) (Header, error) {
	n := len(text) / cardSize
	h := Header{Cards: make([]Card, 0, n), first: make(map[string]int)}
	for i := 0; i < n; i++ {
		record := plainASCII(text[i*cardSize:(i+1)*cardSize], i, warn)
		card, warning, err := parseCard(record)
		if err != nil {
			return Header{}, fmt.Errorf("record %d of the header: %w", i+1, err)
		}
		if warning != "" {
			warn("record %d of the header: %s", i+1, warning)
		}
		if card.Kind == String && card.Key != "CONTINUE" && strings.HasSuffix(card.Text, "&") {
			used, err := joinContinued(&card, text[(i+1)*cardSize:])
			if err != nil {
				return Header{}, fmt.Errorf("record %d of the header: %w", i+2, err)
			}
			i += used
		}
		if old, twice := h.first[card.Key]; card.Kind != Commentary && card.Key != "CONTINUE" {
			switch {
			case !twice:
				h.first[card.Key] = len(h.Cards)
			case h.Cards[old].Text != card.Text:
				warn("keyword %s stands there twice with different values; the first, %.40s, is used",
					card.Key, h.Cards[old].Text)
			}
		}
		h.Cards = append(h.Cards, card)
	}
	return h, nil
}

// joinContinued appends the CONTINUE records at the start of text to a string
// that ends in an ampersand, and returns how many it took. An ampersand that
// no CONTINUE follows belongs to the string (FITS 4.0 section 4.2.1.2).
func joinContinued(card *Card, text string) (used int, err error) {
	var value, comment strings.Builder
	piece, note := card.Text, card.Comment
	for {
		comment.WriteString(note)
		if !strings.HasSuffix(piece, "&") || !strings.HasPrefix(text, "CONTINUE  ") {
			break
		}
		next, _, err := parseCard(text[:cardSize])
		if err != nil {
			return 0, err
		}
		if next.Kind != String {
			break
		}
		value.WriteString(piece[:len(piece)-1])
		piece, note = next.Text, next.Comment
		if note != "" && comment.Len() > 0 {
			note = " " + note
		}
		text = text[cardSize:]
		used++
	}
	value.WriteString(piece)
	card.Text, card.Comment = value.String(), comment.String()
	return used, nil
}

// plainASCII replaces bytes that a header must not hold by question marks,
// but leaves those in the keyword for parseCard to refuse.
func plainASCII(record string, i int, warn func(format string, args ...any)) string {
	clean := true
	for j := 0; j < len(record); j++ {
		if record[j] < ' ' || record[j] > '~' {
			clean = false
			break
		}
	}
	if clean {
		return record
	}
	b := []byte(record)
	for j := 8; j < len(b); j++ {
		if b[j] < ' ' || b[j] > '~' {
			b[j] = '?'
		}
	}
	warn("record %d of the header has bytes that are not printable ASCII; they are shown as ?", i+1)
	return string(b)
}
