package diag

import (
	"errors"
	"reflect"
	"strings"
	"testing"
)

func TestDiagnosticString(t *testing.T) {
	at := Pos{"visit.md", 9, 21}
	for _, c := range []struct {
		d    Diagnostic
		want string
	}{
		{Diagnostic{at, "wrong", "expected right", "rite"}, "visit.md:9:21: wrong; expected right; nearest known name: rite"},
		{Diagnostic{at, "wrong", "", ""}, "visit.md:9:21: wrong"},
		{Diagnostic{at, "wrong", "", "rite"}, "visit.md:9:21: wrong; nearest known name: rite"},
		{Diagnostic{Pos{File: "visit.md"}, "wrong", "expected right", ""}, "visit.md: wrong; expected right"},
		{Diagnostic{at, "two\nlines\r\nhere", "", ""}, "visit.md:9:21: two lines here"},
	} {
		if got := c.d.String(); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}

func TestListSort(t *testing.T) {
	var l List
	for _, c := range []struct{ line, col int }{{3, 1}, {1, 9}, {1, 2}, {1, 9}, {0, 0}} {
		l.Add(Pos{"r.md", c.line, c.col}, "b", "", "")
	}
	l.Add(Pos{"r.md", 1, 9}, "a", "", "")
	l.Add(Pos{"r.md", 1, 9}, "b", "expected more", "")
	l.Sort()
	const want = "r.md: b\nr.md:1:2: b\nr.md:1:9: a\nr.md:1:9: b\nr.md:1:9: b; expected more\nr.md:3:1: b"
	if l.Error() != want {
		t.Errorf("got\n%s\nwant\n%s", l.Error(), want)
	}
}

func TestListErr(t *testing.T) {
	var l List
	if err := l.Err(); err != nil {
		t.Errorf("an empty list is the error %v", err)
	}
	l.Sort()
	l.Add(Pos{}, "wrong", "", "")
	var back List
	if err := l.Err(); !errors.As(err, &back) || !reflect.DeepEqual(back, l) {
		t.Errorf("got %v", err)
	}
}

func TestNearest(t *testing.T) {
	known := []string{"clipSigma", "period", "midTransit", "raw", "TIME"}
	for name, want := range map[string]string{
		"clipSigm":                  "clipSigma",
		"clipsigma":                 "clipSigma",
		"peroid":                    "period",
		"midTransitTime":            "midTransit",
		"rwa":                       "raw",
		"time":                      "TIME",
		"row":                       "raw",
		"exposure":                  "",
		"period":                    "",
		"":                          "",
		"x":                         "",
		strings.Repeat("a", 10_000): "",
	} {
		if got := Nearest(name, known); got != want {
			t.Errorf("nearest to %.20q is %q, want %q", name, got, want)
		}
	}
	if got := Nearest("ab", []string{"ac", "aa"}); got != "aa" {
		t.Errorf("of two names as near, %q is chosen", got)
	}
	if got := Nearest("a", nil); got != "" {
		t.Errorf("got %q from no names", got)
	}
}
