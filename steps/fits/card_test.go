package fits

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

func record(s string) string { return fmt.Sprintf("%-80s", s) }

func TestParseCard(t *testing.T) {
	for _, c := range []struct {
		record string
		want   Card
	}{
		{"A       = 'it''s'              / text", Card{"A", String, "it's", "text"}},
		{"A       = ' lead  '", Card{"A", String, " lead", ""}},
		{"A       = ''", Card{"A", String, "", ""}},
		{"A       = 'x / y' / z", Card{"A", String, "x / y", "z"}},
		{"A       =                    T", Card{"A", Logical, "T", ""}},
		{"A       = F/false", Card{"A", Logical, "F", "false"}},
		{"A       =        -0017 / n", Card{"A", Integer, "-0017", "n"}},
		{"A       = 99999999999999999999", Card{"A", Integer, "99999999999999999999", ""}},
		{"A       = 1.", Card{"A", Real, "1.", ""}},
		{"A       = -.5D-3", Card{"A", Real, "-.5D-3", ""}},
		{"A       = 1E5", Card{"A", Real, "1E5", ""}},
		{"A       = ( 1 , -2.5 )", Card{"A", Complex, "( 1 , -2.5 )", ""}},
		{"A       =   / nothing", Card{"A", Undefined, "", "nothing"}},
		{"A       =", Card{"A", Undefined, "", ""}},
		{"A       = nan", Card{"A", Unreadable, "nan", ""}},
		{"A       = 0x10", Card{"A", Unreadable, "0x10", ""}},
		{"A       = 1e", Card{"A", Unreadable, "1e", ""}},
		{"HISTORY done 'with", Card{"HISTORY", Commentary, "done 'with", ""}},
		{"", Card{"", Commentary, "", ""}},
		{"HIERARCH A B  C= 5 / c", Card{"HIERARCH A B C", Integer, "5", "c"}},
		{"CONTINUE  'more&' / c", Card{"CONTINUE", String, "more&", "c"}},
	} {
		got, _, err := parseCard(record(c.record))
		if err != nil || got != c.want {
			t.Errorf("%q: got %+v, %v, expected %+v", c.record, got, err, c.want)
		}
	}
	for _, bad := range []string{"A       = 'open", "A       = 'open''", "\xff\xfe     = 1"} {
		if got, _, err := parseCard(record(bad)); err == nil {
			t.Errorf("%q: got %+v, expected an error", bad, got)
		}
	}
}

func TestHeaderGetters(t *testing.T) {
	h := header(t, "I       = 7", "BIG     = 9223372036854775808", "R       = 2.5D1", "S       = 'text'",
		"L       = T", "U       =  ", "Z       = (1, 2)", "HIERARCH DEEP NAME = 3", "HUGE    = 1E999")
	if v, err := h.Int("i"); v != 7 || err != nil {
		t.Error(v, err)
	}
	if v, err := h.Float("BIG"); v != 1<<63 || err != nil {
		t.Error(v, err)
	}
	if v, err := h.Float("R"); v != 25 || err != nil {
		t.Error(v, err)
	}
	if v, err := h.Int("deep name"); v != 3 || err != nil {
		t.Error(v, err)
	}
	if v, err := h.Complex("Z"); v != 1+2i || err != nil {
		t.Error(v, err)
	}
	if h.Has("U") || h.Has("NONE") || !h.Has("L") {
		t.Error("Has")
	}
	for _, c := range []struct {
		err  error
		want string
	}{
		{second(h.Int("BIG")), "keyword BIG = 9223372036854775808 is out of range"},
		{second(h.Int("R")), "keyword R = 2.5D1, expected an integer"},
		{second(h.Float("HUGE")), "keyword HUGE: the number 1E999 is out of range"},
		{second(h.Text("U")), "keyword U has no value, expected a string"},
		{second(h.Bool("BIGG")), "keyword BIGG is missing; nearest known name: BIG"},
	} {
		if c.err == nil || c.err.Error() != c.want {
			t.Errorf("got %v, expected %s", c.err, c.want)
		}
	}
}

func second[T any](_ T, err error) error { return err }

func header(t *testing.T, records ...string) *Header {
	t.Helper()
	text := ""
	for _, r := range records {
		text += record(r)
	}
	h, err := parseHeader(text, func(string, ...any) {})
	if err != nil {
		t.Fatal(err)
	}
	return &h
}

func TestDuplicateKeywordWarns(t *testing.T) {
	var warnings []string
	h, err := parseHeader(record("A       = 1")+record("A       = 2")+record("B       = 1")+record("B       = 1"),
		func(f string, args ...any) { warnings = append(warnings, fmt.Sprintf(f, args...)) })
	if err != nil {
		t.Fatal(err)
	}
	if v, _ := h.Int("A"); v != 1 || len(warnings) != 1 {
		t.Errorf("A = %d, warnings %q", v, warnings)
	}
}

// TestCardRoundTrip writes cards and reads them again.
func TestCardRoundTrip(t *testing.T) {
	var cards []Card
	for n := 0; n < 300; n++ { // every split position, quotes included
		cards = append(cards, StringCard("S", strings.Repeat("a", n%80)+strings.Repeat("'", n/3)+"b&", "c"))
	}
	cards = append(cards, IntCard("I", math.MinInt64, "smallest"), FloatCard("F", 5e-324, ""), FloatCard("F", 1, "one"),
		FloatCard("F", -1.7976931348623157e308, ""), FloatCard("N", math.NaN(), "none"), BoolCard("B", true, ""),
		Card{"Z", Complex, "(1, 2)", ""}, StringCard("E", "", ""), StringCard("HIERARCH LONG NAME", "v", "c"),
		CommentCard("HISTORY", "text"), CommentCard("", "blank"))
	for _, c := range cards {
		b, err := appendRecords(nil, c)
		if err != nil {
			t.Fatal(err)
		}
		if len(b)%cardSize != 0 {
			t.Fatalf("%+v takes %d bytes", c, len(b))
		}
		h, err := parseHeader(string(b), t.Errorf)
		if err != nil || len(h.Cards) != 1 {
			t.Fatalf("%+v: %d cards, %v", c, len(h.Cards), err)
		}
		got := h.Cards[0]
		if len(got.Comment) < len(c.Comment) { // cut for want of room
			got.Comment = c.Comment
		}
		if got != c {
			t.Errorf("got %+v, expected %+v", got, c)
		}
	}
}

func TestCardsThatCannotBeWritten(t *testing.T) {
	for _, c := range []Card{
		StringCard("lower", "x", ""), StringCard("END", "x", ""), StringCard("CONTINUE", "x", ""),
		StringCard("A", "µ", ""), StringCard("A", "line\nbreak", ""), IntCard("A\n", 1, ""),
		StringCard("HIERARCH LONG NAME", strings.Repeat("x", 70), ""), CommentCard("END", ""),
		{"A", Integer, "1.5", ""}, {"A", Unsigned, "1", ""}, {"A", Real, strings.Repeat("1", 90) + ".", ""},
	} {
		if b, err := appendRecords(nil, c); err == nil {
			t.Errorf("%+v was written as %q", c, b)
		}
	}
}
