package recipe

import (
	"math"
	"reflect"
	"strings"
	"testing"
)

func TestValueAs(t *testing.T) {
	for _, c := range []struct {
		text, typ string
		want      any
	}{
		{"3.2147", "float64", 3.2147},
		{"-0.5e-3", "float64", -0.5e-3},
		{"+.5", "float64", 0.5},
		{"5.", "float64", 5.0},
		{"-0", "float64", math.Copysign(0, -1)},
		{"1.7976931348623157e308", "float64", math.MaxFloat64},
		{"5e-324", "float64", 5e-324},
		{"0e999", "float64", 0.0},
		{"21", "int", 21},
		{"1e6", "int", 1000000},
		{"2.0", "int", 2},
		{"-9007199254740992", "int", -1 << 53},
		{"true", "bool", true},
		{"false", "bool", false},
		{"quadratic", "string", "quadratic"},
		{"`quadratic`", "string", "quadratic"},
		{`"a, b"`, "string", "a, b"},
		{`"say ""a"", b"`, "string", `say "a", b`},
		{`""`, "string", ""},
		{"5", "string", "5"},
		{"true", "string", "true"},
		{"a:b", "string", "a:b"},
		{`"1:2:1"`, "string", "1:2:1"},
		{"1, 2.5, -3", "[]float64", []float64{1, 2.5, -3}},
		{"7", "[]float64", []float64{7}},
		{"1, 2", "[]int", []int{1, 2}},
		{"5:9:2", "[]int", []int{5, 7, 9}},
		{"X, Y", "[]string", []string{"X", "Y"}},
		{"X", "[]string", []string{"X"}},
		{`"X, 1", 2`, "[]string", []string{"X, 1", "2"}},
		{"true, false", "[]bool", []bool{true, false}},
		{"true", "[]bool", []bool{true}},
		{"0:1:0.1", "[]float64", []float64{0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1}},
		{"0.6:1.25:0.3", "[]float64", []float64{0.6, 0.9, 1.2}},
		{"1:-1:-0.5", "[]float64", []float64{1, 0.5, 0, -0.5, -1}},
		{"3:3:1", "[]float64", []float64{3}},
		{"0:1:0.33333333333", "[]float64", []float64{0, 0.33333333333, 0.66666666666, 1}},
		{"1e3:2e3:5e2", "[]float64", []float64{1000, 1500, 2000}},
	} {
		got, err := Value{c.text}.As(c.typ)
		if err != nil || !reflect.DeepEqual(got, c.want) {
			t.Errorf("%q as %s: got %v, %v; want %v", c.text, c.typ, got, err, c.want)
		}
	}
	x, _ := Value{"-0"}.As("float64")
	if !math.Signbit(x.(float64)) {
		t.Error("-0 loses its sign")
	}
}

func TestValueAsRefuses(t *testing.T) {
	for _, c := range []struct{ text, typ, want string }{
		{"abc", "float64", `expected a number such as 3.2, found the text "abc"`},
		{"5 d", "float64", `expected a number such as 3.2, found the text "5 d" (a unit has a column of its own)`},
		{"3,2147", "float64", `expected a number such as 3.2, found the list of numbers "3,2147" (numbers have a decimal point, not a comma)`},
		{"true", "float64", `expected a number such as 3.2, found the boolean "true"`},
		{"0x10", "float64", `expected a number such as 3.2, found the text "0x10"`},
		{"1_000", "float64", `expected a number such as 3.2, found the text "1_000"`},
		{"2.5", "int", "expected a whole number such as 21, found 2.5"},
		{"1e17", "int", "expected a whole number such as 21, found 1e17"},
		{"0:1:0.5", "[]int", "expected a whole number such as 21, found 0.5"},
		{"1", "bool", `expected true or false, found the number "1"`},
		{"True", "bool", `expected true or false, found the text "True"`},
		{"a, b", "string", `expected a text, in double quotes if it has commas or colons, found the list of texts "a, b"`},
		{"1:3:1", "string", `expected a text, in double quotes if it has commas or colons, found the grid "1:3:1"`},
		{"a, 1", "[]float64", `expected numbers such as 1, 2, 3 or a grid lo:hi:step, found the list of texts "a, 1"`},
		{"1:5", "[]float64", `expected numbers such as 1, 2, 3 or a grid lo:hi:step, found the text "1:5"`},
		{"1:3:1", "[]string", `expected texts such as X, Y, in double quotes if they have colons, found the grid "1:3:1"`},
		{"1", "time.Duration", "a setting cannot be a time.Duration: expected float64, int, bool, string, or a slice of one of them"},
		{"1, NaN", "[]float64", "element 2 of the list: NaN is not a finite number"},
		{"", "string", `it is empty; an empty text is written ""`},
	} {
		got, err := Value{c.text}.As(c.typ)
		if err == nil || err.Error() != c.want {
			t.Errorf("%q as %s: got %v, %v\nwant %s", c.text, c.typ, got, err, c.want)
		}
	}
}

func TestValueKind(t *testing.T) {
	for text, want := range map[string]Kind{
		"5": Number, "a": Text, `"5"`: Text, "true": Boolean, "1, 2": Numbers, "1, a": Texts, "true, 1": Texts,
		"true, false": Booleans, "0:1:0.5": Grid, "a:b:c": Text, "1 : 3 : 1": Grid,
	} {
		if got, err := (Value{text}).Kind(); err != nil || got != want {
			t.Errorf("%q is a %s (%v), want a %s", text, got, err, want)
		}
	}
	for _, text := range []string{
		"nan", "-Inf", "+infinity", "1e999", "-1e-999", "\u22125", "1,, 2", ",", "1,", `"a`, `"a" b`, "1, 2:3:1", "1:2:0", "2:1:1", "1:2:-1",
		"0:1e300:1e-300", "-1e308:1e308:1e300", "1e17:100000000000000064:1", "0:inf:1", "12:30:00",
	} {
		if k, err := (Value{text}).Kind(); err == nil {
			t.Errorf("%q is accepted as a %s", text, k)
		}
	}
}

func TestGridBound(t *testing.T) {
	v, err := Value{"0:999999:1"}.As("[]float64")
	if err != nil || len(v.([]float64)) != MaxGrid {
		t.Fatalf("got %T, %v", v, err)
	}
	if _, err := (Value{"0:1000000:1"}).As("[]float64"); err == nil {
		t.Error("a grid beyond the bound is accepted")
	}
}

func FuzzValue(f *testing.F) {
	for _, s := range []string{"5", "-1e-3", `"a, ""b""", c`, "0:1:0.1", "1, 2", "true", "1:2:0", "\u22121", "`x`", "1,,2", "5:1e9:1e3"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		v := Value{s}
		kind, err := v.Kind()
		for _, typ := range []string{"float64", "int", "bool", "string", "[]float64", "[]int", "[]string", "[]bool"} {
			x, asErr := v.As(typ)
			if err != nil && asErr == nil {
				t.Errorf("%q has no kind (%v), and serves as %s", s, err, typ)
			}
			if asErr != nil {
				continue
			}
			if typ == "[]float64" && (len(x.([]float64)) == 0 || len(x.([]float64)) > max(MaxGrid, len(s))) {
				t.Errorf("%q gives %d numbers", s, len(x.([]float64)))
			}
			if typ == "float64" && (kind != Number || math.IsNaN(x.(float64)) || math.IsInf(x.(float64), 0)) {
				t.Errorf("%q is the number %v", s, x)
			}
		}
		if parts := splitQuoted(s, ';'); strings.Join(parts, ";") != s {
			t.Errorf("%q splits into %q", s, parts)
		}
	})
}
