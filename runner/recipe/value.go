package recipe

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Kind is what a value is by its notation.
//
//	number             5, -0.02, 2.4e-3: finite, decimal, with a point and no comma
//	text               quadratic, or in double quotes, inside which "" is a quote
//	boolean            true, false
//	list of numbers    1, 2, 3
//	list of texts      X, Y: at least one element is neither number nor boolean
//	list of booleans   true, false, true
//	grid               lo:hi:step, evenly spaced numbers, hi included if it is one of them
//
// Quotes make a text of anything and protect commas, semicolons and colons.
type Kind string

// Kinds of value.
const (
	Number   Kind = "number"
	Text     Kind = "text"
	Boolean  Kind = "boolean"
	Numbers  Kind = "list of numbers"
	Texts    Kind = "list of texts"
	Booleans Kind = "list of booleans"
	Grid     Kind = "grid"
)

// formOf says what was expected of a value that is not right.
func formOf(v Value) string {
	if _, _, _, ok := gridParts(v.Text); ok {
		return fmt.Sprintf("expected a grid lo:hi:step of at most %d numbers, with a step that leads from lo to hi", MaxGrid)
	}
	return "expected a number, a text, true or false, a list such as 1, 2, 3, or a grid lo:hi:step"
}

// Numeric reports whether a value of this kind is made of numbers.
func (k Kind) Numeric() bool { return k == Number || k == Numbers || k == Grid }

// allows reports whether an alternative of kind l can serve where a value of
// kind k does. A single element serves as a list of one; a number with a list
// for an alternative is taken for one written with the wrong separator.
func (k Kind) allows(l Kind) bool {
	switch k {
	case Numbers, Grid:
		return l.Numeric()
	case Text:
		return l == Text || l == Texts
	case Texts:
		return l != Grid
	case Booleans:
		return l == Boolean || l == Booleans
	}
	return k == l
}

func (k Kind) article() string { return "a " + string(k) }

// An item is an element of a value.
type item struct {
	text   string
	kind   Kind // Number, Text or Boolean
	number float64
}

// Kind tells what the value is. It is an error when the text is not a value,
// for example a number that is not finite, or a list with an empty element.
func (v Value) Kind() (Kind, error) {
	k, _, err := v.read()
	return k, err
}

// As gives the value as a Go type: float64, int, bool, string or a slice of
// one of them. A single element serves as a list of one, a number or boolean
// as a text, and a grid as a list of numbers. The error says what was expected.
func (v Value) As(goType string) (any, error) {
	kind, items, err := v.read()
	if err != nil {
		return nil, err
	}
	switch goType {
	case "float64":
		if kind != Number {
			return nil, v.unfit("a number such as 3.2", kind, items)
		}
		return items[0].number, nil
	case "int":
		if kind != Number {
			return nil, v.unfit("a whole number such as 21", kind, items)
		}
		return whole(items[0])
	case "bool":
		if kind != Boolean {
			return nil, v.unfit("true or false", kind, items)
		}
		return items[0].text == "true", nil
	case "string":
		if len(items) != 1 || kind == Grid {
			return nil, v.unfit("a text, in double quotes if it has commas or colons", kind, items)
		}
		return items[0].text, nil
	case "[]float64":
		if !kind.Numeric() {
			return nil, v.unfit("numbers such as 1, 2, 3 or a grid lo:hi:step", kind, items)
		}
		out := make([]float64, len(items))
		for i, it := range items {
			out[i] = it.number
		}
		return out, nil
	case "[]int":
		if !kind.Numeric() {
			return nil, v.unfit("whole numbers such as 1, 2, 3 or a grid lo:hi:step", kind, items)
		}
		out := make([]int, len(items))
		for i, it := range items {
			if out[i], err = whole(it); err != nil {
				return nil, err
			}
		}
		return out, nil
	case "[]string":
		if kind == Grid {
			return nil, v.unfit("texts such as X, Y, in double quotes if they have colons", kind, items)
		}
		out := make([]string, len(items))
		for i, it := range items {
			out[i] = it.text
		}
		return out, nil
	case "[]bool":
		if kind != Boolean && kind != Booleans {
			return nil, v.unfit("true or false, separated by commas", kind, items)
		}
		out := make([]bool, len(items))
		for i, it := range items {
			out[i] = it.text == "true"
		}
		return out, nil
	}
	return nil, fmt.Errorf("a setting cannot be a %s: expected float64, int, bool, string, or a slice of one of them", goType)
}

// unfit says that a value of some kind is not what was expected.
func (v Value) unfit(expected string, kind Kind, items []item) error {
	s := fmt.Sprintf("expected %s, found the %s %s", expected, kind, quote(v.Text))
	first, rest, _ := strings.Cut(v.Text, " ")
	if _, err := number(first); err == nil && kind == Text && rest != "" {
		s += " (a unit has a column of its own)"
	}
	if kind == Numbers && len(items) == 2 && strings.HasPrefix(expected, "a ") {
		s += " (numbers have a decimal point, not a comma)"
	}
	return errors.New(s)
}

func whole(it item) (int, error) {
	if it.number != math.Trunc(it.number) || math.Abs(it.number) > 1<<53 {
		text := it.text
		if text == "" {
			text = strconv.FormatFloat(it.number, 'g', -1, 64)
		}
		return 0, fmt.Errorf("expected a whole number such as 21, found %s", text)
	}
	return int(it.number), nil
}

// read takes the value apart.
func (v Value) read() (Kind, []item, error) {
	if strings.TrimSpace(v.Text) == "" {
		return "", nil, errors.New(`it is empty; an empty text is written ""`)
	}
	parts := splitQuoted(v.Text, ',')
	if len(parts) == 1 {
		if lo, hi, step, ok := gridParts(parts[0]); ok {
			numbers, err := grid(lo, hi, step)
			items := make([]item, len(numbers))
			for i, x := range numbers {
				items[i] = item{kind: Number, number: x}
			}
			return Grid, items, err
		}
		it, err := readItem(parts[0])
		return it.kind, []item{it}, err
	}
	items := make([]item, 0, len(parts))
	kind := Kind("")
	for i, part := range parts {
		if strings.TrimSpace(part) == "" {
			return "", nil, fmt.Errorf("element %d of the list is empty", i+1)
		}
		if _, _, _, ok := gridParts(part); ok {
			return "", nil, fmt.Errorf("element %d of the list is a grid, and a grid stands alone", i+1)
		}
		it, err := readItem(part)
		if err != nil {
			return "", nil, fmt.Errorf("element %d of the list: %w", i+1, err)
		}
		items = append(items, it)
		of := map[Kind]Kind{Number: Numbers, Boolean: Booleans, Text: Texts}[it.kind]
		if kind != "" && kind != of {
			of = Texts
		}
		kind = of
	}
	return kind, items, nil
}

func readItem(s string) (item, error) {
	s = bare(s)
	if rest, ok := strings.CutPrefix(s, `"`); ok {
		var b strings.Builder
		for {
			in, after, closed := strings.Cut(rest, `"`)
			b.WriteString(in)
			if !closed {
				return item{}, errors.New("a double quote is not closed")
			}
			if after == "" {
				return item{text: b.String(), kind: Text}, nil
			}
			if after[0] != '"' {
				return item{}, errors.New("text goes on after the closing double quote")
			}
			b.WriteByte('"')
			rest = after[1:]
		}
	}
	if s == "true" || s == "false" {
		return item{text: s, kind: Boolean}, nil
	}
	x, err := number(s)
	if err == errNoNumber {
		return item{text: s, kind: Text}, nil
	}
	return item{text: s, kind: Number, number: x}, err
}

// splitQuoted splits at a separator, but not inside double quotes that open at
// the start of an element.
func splitQuoted(s string, sep byte) []string {
	var parts []string
	start, quoted, fresh := 0, false, true
	for i := 0; i < len(s); i++ {
		switch c := s[i]; {
		case quoted:
			quoted = c != '"'
		case c == '"' && (fresh || i > 0 && s[i-1] == '"'):
			quoted, fresh = true, false
		case c == sep:
			parts = append(parts, s[start:i])
			start, fresh = i+1, true
		case c == ',' || c == ';':
			fresh = true
		case c != ' ' && c != '\t':
			fresh = false
		}
	}
	return append(parts, s[start:])
}

// errNoNumber says that a text does not look like a number at all.
var errNoNumber = errors.New("it is not a number")

// number reads a decimal number. It returns errNoNumber for what is no number,
// and another error for what is meant to be one and cannot be.
func number(s string) (float64, error) {
	if minus, rest := strings.Contains(s, "\u2212"), strings.ReplaceAll(s, "\u2212", "-"); minus {
		if _, err := number(rest); err == nil {
			return 0, errors.New("it is written with the minus sign U+2212, where a hyphen is expected")
		}
	}
	switch strings.ToLower(strings.TrimLeft(s, "+-")) {
	case "nan", "inf", "infinity":
		return 0, fmt.Errorf("%s is not a finite number", s)
	}
	if !decimalForm(s) {
		return 0, errNoNumber
	}
	x, err := strconv.ParseFloat(s, 64)
	mantissa, _, _ := strings.Cut(strings.ToLower(s), "e")
	switch {
	case math.IsInf(x, 0):
		return 0, fmt.Errorf("%s is beyond the largest number", quoteLong(s))
	case x == 0 && strings.ContainsAny(mantissa, "123456789"):
		return 0, fmt.Errorf("%s is below the smallest number", quoteLong(s))
	case err != nil:
		return 0, errNoNumber
	}
	return x, nil
}

// decimalForm reports whether s is digits with an optional sign, point and
// exponent.
func decimalForm(s string) bool {
	digits := func() bool {
		n := len(s)
		s = strings.TrimLeft(s, "0123456789")
		return len(s) < n
	}
	sign := func() {
		if s != "" && (s[0] == '+' || s[0] == '-') {
			s = s[1:]
		}
	}
	sign()
	ok := digits()
	if strings.HasPrefix(s, ".") {
		s = s[1:]
		ok = digits() || ok
	}
	if ok && s != "" && (s[0] == 'e' || s[0] == 'E') {
		s = s[1:]
		sign()
		ok = digits()
	}
	return ok && s == ""
}

func quoteLong(s string) string { return strings.Trim(quote(s), `"`) }
