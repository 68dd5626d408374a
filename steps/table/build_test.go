package table

import (
	"strings"
	"testing"
)

func TestNew(t *testing.T) {
	words := Text("flag", "why", []string{"a", "b"})
	numbers := Number("depth", "", "of the transit", 4, []float64{1, 2})
	got, err := New("points", words, numbers)
	if err != nil {
		t.Fatal(err)
	}
	if got.Rows() != 2 || got.Columns[1].Digits != 4 {
		t.Errorf("%+v", got)
	}
	if empty, err := New("nothing"); err != nil || empty.Rows() != 0 {
		t.Errorf("a table without columns: %d rows, %v", empty.Rows(), err)
	}
	if none, err := New("no rows", Text("a", "", nil), Number("b", "d", "", 0, nil)); err != nil || none.Rows() != 0 {
		t.Errorf("a table without rows: %d rows, %v", none.Rows(), err)
	}
}

func TestNewRefuses(t *testing.T) {
	one := Number("x", "", "", 0, []float64{1})
	for want, columns := range map[string][]Column{
		"column 2 has no name":          {one, Number("", "", "", 0, []float64{1})},
		`two columns are named "x"`:     {one, one},
		"has text and numbers":          {{Name: "both", Text: []string{"a"}, Number: []float64{1}}},
		`is text and has unit "d"`:      {{Name: "t", Unit: "d", Text: []string{"a"}}},
		"asks for 18 digits":            {Number("y", "", "", 18, []float64{1})},
		`column "y" has 2 rows; expect`: {one, Number("y", "", "", 0, []float64{1, 2})},
	} {
		_, err := New("t", columns...)
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("error %v; want %q", err, want)
		}
	}
}
