package fits

import (
	"fmt"
	"strconv"
	"strings"
)

// cardSize is the length of a header record in bytes.
const cardSize = 80

// A Kind says what a header value, a column or an image is made of.
type Kind uint8

// Kinds of values. Header cards use those from Undefined to Unreadable,
// [Values] those from String on except Unreadable.
const (
	Undefined  Kind = iota // a keyword without a value
	Commentary             // COMMENT, HISTORY, a blank keyword: text without a value
	Unreadable             // a value that is none of the kinds below
	String                 // text
	Logical                // true or false
	Integer                // int64; in a card of any size
	Unsigned               // uint64, for columns and images stored with an offset of 2^63
	Real                   // float64
	Complex                // complex128
	Bits                   // a row of bits, as booleans
)

// String names the kind.
func (k Kind) String() string {
	names := [...]string{"undefined", "commentary", "unreadable", "string", "logical", "integer",
		"unsigned integer", "real", "complex", "bits"}
	if int(k) < len(names) {
		return names[k]
	}
	return "Kind(" + strconv.Itoa(int(k)) + ")"
}

// A Card is one keyword of a header. A string that is continued over several
// records (CONTINUE) is one card.
type Card struct {
	Key     string // upper case; "HIERARCH ..." for long names (the ESO convention)
	Kind    Kind   // Undefined to Complex, without Unsigned
	Text    string // the value: a string without its quotes, otherwise the characters as in the header
	Comment string
}

// StringCard makes a card that holds text, which may be of any length.
func StringCard(key, value, comment string) Card {
	return Card{key, String, value, comment}
}

// IntCard makes a card that holds an integer.
func IntCard(key string, value int64, comment string) Card {
	return Card{key, Integer, strconv.FormatInt(value, 10), comment}
}

// FloatCard makes a card that holds a real number, with all digits that it
// takes to read the same number again. A header cannot hold NaN or infinity:
// the card is then without a value.
func FloatCard(key string, value float64, comment string) Card {
	if value-value != 0 { // NaN or infinite
		return Card{key, Undefined, "", comment}
	}
	text := strconv.FormatFloat(value, 'G', -1, 64)
	if !strings.ContainsAny(text, ".E") {
		text += ".0"
	}
	return Card{key, Real, text, comment}
}

// BoolCard makes a card that holds true or false.
func BoolCard(key string, value bool, comment string) Card {
	text := "F"
	if value {
		text = "T"
	}
	return Card{key, Logical, text, comment}
}

// CommentCard makes a card of text without a value; key is COMMENT, HISTORY
// or "". Text of more than 72 characters takes several records.
func CommentCard(key, text string) Card {
	return Card{key, Commentary, text, ""}
}

// parseCard reads one record of 80 bytes. A problem that leaves the card
// usable comes back as a warning.
func parseCard(record string) (card Card, warning string, err error) {
	key := strings.TrimRight(record[:8], " ")
	value := record[8:]
	switch {
	case strings.HasPrefix(value, "= ") && key != "CONTINUE":
		value = value[2:]
	case key == "HIERARCH" && strings.Contains(value, "="):
		name, rest, _ := strings.Cut(value, "=")
		key, value = "HIERARCH "+strings.Join(strings.Fields(name), " "), rest
	case key == "CONTINUE":
		if !strings.HasPrefix(strings.TrimLeft(value, " "), "'") {
			return Card{Key: key, Kind: Commentary, Text: strings.TrimRight(value, " ")}, "", nil
		}
	default:
		card := Card{Key: key, Kind: Commentary, Text: strings.TrimRight(value, " ")}
		card.Key, warning, err = checkKey(key)
		return card, warning, err
	}
	if key, warning, err = checkKey(key); err != nil {
		return Card{}, "", err
	}
	card.Key = key
	card.Kind, card.Text, card.Comment, err = parseValue(value)
	if err != nil {
		return Card{}, "", fmt.Errorf("keyword %s: %w", key, err)
	}
	if card.Kind == Unreadable {
		warning = fmt.Sprintf("keyword %s has the value %q, which is neither a string nor a number", key, card.Text)
	}
	return card, warning, nil
}

// checkKey returns the keyword in upper case. Characters that the standard
// does not allow are an error when they cannot be printed (the record is then
// no text at all), and otherwise a warning.
func checkKey(key string) (upper, warning string, err error) {
	upper = strings.ToUpper(key)
	for i := 0; i < len(upper); i++ {
		c := upper[i]
		switch {
		case c < ' ' || c > '~':
			return "", "", fmt.Errorf("a record starts with bytes that are not text (%q): the header is damaged", key)
		case 'A' <= c && c <= 'Z', '0' <= c && c <= '9', c == '-', c == '_':
		case strings.HasPrefix(upper, "HIERARCH "):
		default:
			return upper, fmt.Sprintf("keyword %q has characters other than A-Z, 0-9, - and _", key), nil
		}
	}
	if upper != key && !strings.HasPrefix(upper, "HIERARCH ") {
		warning = fmt.Sprintf("keyword %q is not in upper case", key)
	}
	return upper, warning, nil
}

// parseValue reads what stands behind the value indicator: a value in free
// format and a comment behind a slash (FITS 4.0 section 4.2).
func parseValue(s string) (kind Kind, text, comment string, err error) {
	s = strings.Trim(s, " ")
	if strings.HasPrefix(s, "'") {
		text, rest, ok := cutQuoted(s)
		if !ok {
			return 0, "", "", fmt.Errorf("the string %.40s has no closing quote", s)
		}
		return String, text, trimComment(rest), nil
	}
	end := strings.IndexByte(s, '/')
	if end < 0 {
		end = len(s)
	}
	text, comment = strings.TrimRight(s[:end], " "), trimComment(s[end:])
	return classify(text), text, comment, nil
}

func trimComment(s string) string {
	return strings.Trim(strings.TrimPrefix(strings.TrimLeft(s, " "), "/"), " ")
}

// cutQuoted takes the quoted string at the start of s: doubled quotes become
// one, spaces at the end are dropped. ok is false without a closing quote.
func cutQuoted(s string) (text, rest string, ok bool) {
	for i := 1; i < len(s); i++ {
		if s[i] != '\'' {
			continue
		}
		if i+1 < len(s) && s[i+1] == '\'' {
			i++
			continue
		}
		text = strings.TrimRight(s[1:i], " ")
		return strings.ReplaceAll(text, "''", "'"), s[i+1:], true
	}
	return "", "", false
}

// classify says of which kind an unquoted value is.
func classify(text string) Kind {
	switch {
	case text == "":
		return Undefined
	case text == "T" || text == "F":
		return Logical
	case isInteger(text):
		return Integer
	case isReal(text):
		return Real
	}
	if _, _, ok := cutComplex(text); ok {
		return Complex
	}
	return Unreadable
}

// cutComplex splits "(re, im)".
func cutComplex(text string) (re, im string, ok bool) {
	if !strings.HasPrefix(text, "(") || !strings.HasSuffix(text, ")") {
		return "", "", false
	}
	re, im, ok = strings.Cut(text[1:len(text)-1], ",")
	re, im = strings.Trim(re, " "), strings.Trim(im, " ")
	return re, im, ok && (isInteger(re) || isReal(re)) && (isInteger(im) || isReal(im))
}

func isInteger(s string) bool {
	s = trimSign(s)
	return s != "" && strings.Trim(s, "0123456789") == ""
}

// isReal accepts digits with a decimal point or an exponent E or D. Lower-case
// exponents are not standard but cannot be misunderstood.
func isReal(s string) bool {
	s = trimSign(s)
	mantissa := s
	if i := strings.IndexAny(s, "EDed"); i >= 0 {
		mantissa = s[:i]
		if !isInteger(s[i+1:]) {
			return false
		}
	}
	whole, fraction, _ := strings.Cut(mantissa, ".")
	digits := whole + fraction
	return digits != "" && strings.Trim(digits, "0123456789") == ""
}

func trimSign(s string) string {
	if s != "" && (s[0] == '+' || s[0] == '-') {
		return s[1:]
	}
	return s
}

// parseFloat converts the text of an integer or a real.
func parseFloat(s string) (float64, error) {
	exponent := strings.NewReplacer("D", "E", "d", "e")
	v, err := strconv.ParseFloat(exponent.Replace(s), 64)
	if err != nil {
		return 0, fmt.Errorf("the number %.40s is out of range", s)
	}
	return v, nil
}
