package fits

import (
	"fmt"
	"strings"
)

// longestText is the number of characters, doubled quotes counted twice, of a
// string that fits one record.
const longestText = cardSize - 12

// appendRecords appends a card as one or more records of 80 bytes. Comments
// are cut where they do not fit. Text must be printable ASCII.
func appendRecords(b []byte, c Card) ([]byte, error) {
	if err := checkText(c.Key, c.Key+c.Text+c.Comment); err != nil {
		return nil, err
	}
	if c.Kind == Commentary {
		return appendCommentary(b, c)
	}
	prefix, err := cardPrefix(c.Key)
	if err != nil {
		return nil, err
	}
	var value string
	switch c.Kind {
	case String:
		quoted := strings.ReplaceAll(c.Text, "'", "''")
		if len(quoted) > cardSize-len(prefix)-2 {
			if len(prefix) != 10 {
				return nil, fmt.Errorf("keyword %.60s: the text of %d characters does not fit behind the long name", c.Key, len(quoted))
			}
			return appendContinued(b, prefix, quoted, c.Comment), nil
		}
		value = fmt.Sprintf("%-20s", fmt.Sprintf("'%-8s'", quoted))
	case Logical, Integer, Real, Complex:
		if classify(c.Text) != c.Kind {
			return nil, fmt.Errorf("keyword %.60s: %.40q is not of kind %s", c.Key, c.Text, c.Kind)
		}
		value = fmt.Sprintf("%20s", c.Text)
	case Undefined:
		value = strings.Repeat(" ", 20)
	default:
		return nil, fmt.Errorf("keyword %.60s: a value of kind %s cannot be written", c.Key, c.Kind)
	}
	if len(prefix) != 10 { // a long name needs the room
		value = strings.Trim(value, " ")
	}
	if len(prefix)+len(value) > cardSize {
		return nil, fmt.Errorf("keyword %.60s: the value does not fit into a record of %d characters", c.Key, cardSize)
	}
	return appendRecord(b, prefix+value, c.Comment), nil
}

// appendRecord appends one record, with as much of the comment as fits.
func appendRecord(b []byte, record, comment string) []byte {
	if comment != "" && len(record)+4 <= cardSize {
		record += " / " + comment
	}
	if len(record) > cardSize {
		record = record[:cardSize]
	}
	return append(b, fmt.Sprintf("%-80s", record)...)
}

// cardPrefix is the keyword with the value indicator.
func cardPrefix(name string) (string, error) {
	if len(name) >= 1 && len(name) <= 8 && isKeyword(name) {
		if name == "END" || name == "CONTINUE" {
			return "", fmt.Errorf("keyword %s is written by itself", name)
		}
		return fmt.Sprintf("%-8s= ", name), nil
	}
	words := strings.Fields(strings.TrimPrefix(name, "HIERARCH "))
	long := strings.Join(words, " ")
	for _, w := range words {
		if !isKeyword(w) {
			long = ""
			break
		}
	}
	if long == "" || len(long) > 55 {
		return "", fmt.Errorf("keyword %.60q cannot be written, expected capital letters, digits, - and _", name)
	}
	return "HIERARCH " + long + " = ", nil
}

func isKeyword(s string) bool {
	return strings.Trim(s, "ABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_") == ""
}

// appendCommentary splits text over records of the same keyword.
func appendCommentary(b []byte, c Card) ([]byte, error) {
	if c.Key != "" && (len(c.Key) > 8 || !isKeyword(c.Key)) || c.Key == "END" || c.Key == "CONTINUE" {
		return nil, fmt.Errorf("keyword %.60q cannot hold a comment, expected COMMENT, HISTORY or none", c.Key)
	}
	text := c.Text
	for {
		n := min(len(text), cardSize-8)
		b = append(b, fmt.Sprintf("%-8s%-72s", c.Key, text[:n])...)
		if text = text[n:]; text == "" {
			return b, nil
		}
	}
}

// appendContinued splits a quoted text over CONTINUE records, never between
// the two halves of a doubled quote.
func appendContinued(b []byte, prefix, quoted, comment string) []byte {
	for len(quoted) > longestText {
		n := longestText - 1 // room for the ampersand
		if quotes := n - len(strings.TrimRight(quoted[:n], "'")); quotes%2 == 1 {
			n--
		}
		b = appendRecord(b, prefix+"'"+quoted[:n]+"&'", "")
		quoted = quoted[n:]
		prefix = "CONTINUE  "
	}
	return appendRecord(b, prefix+"'"+quoted+"'", comment)
}

// checkText refuses what a header must not hold.
func checkText(key, text string) error {
	for i := 0; i < len(text); i++ {
		if text[i] < ' ' || text[i] > '~' {
			return fmt.Errorf("keyword %.60s: %.40q has characters that are not printable ASCII", key, text)
		}
	}
	return nil
}
