package sheet

import (
	"math"
	"reflect"
	"strings"
	"testing"
)

func TestRead(t *testing.T) {
	s, err := Read([]byte("\xef\xbb\xbf# comment\nA, \"B\",c\r\n1,, -2.5e3\n\n# another\n\"3\",nan,inf\n"), "test")
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(s.Names, []string{"A", "B", "c"}) || !reflect.DeepEqual(s.Line, []int{3, 6}) {
		t.Errorf("names %q, lines %v", s.Names, s.Line)
	}
	if i, err := s.Find("C"); i != 2 || err != nil || !reflect.DeepEqual(s.Column(i), []float64{-2500, math.Inf(1)}) {
		t.Errorf("column C: %d, %v", i, err)
	}
	if b := s.Column(1); !math.IsNaN(b[0]) || !math.IsNaN(b[1]) {
		t.Errorf("column B: %v", b)
	}
	if r := s.Row(1); len(r) != 3 || r[0] != 3 {
		t.Errorf("row 1: %v", r)
	}
	if _, err := s.Find("AA"); err == nil || err.Error() != `no column "AA", but A, B, c; nearest known name: A` {
		t.Errorf("unknown column: %v", err)
	}
}

func TestReadNames(t *testing.T) {
	for _, name := range []string{"caf\xe9", strings.Repeat("x", maxName+1)} {
		_, err := Read([]byte("a,"+name+"\n1,2\n"), "test")
		if err == nil || !strings.Contains(err.Error(), "test: line 1, column 3: the column name") {
			t.Errorf("column name %.20q: error %v", name, err)
		}
	}
}

func FuzzRead(f *testing.F) {
	f.Add([]byte("a,b\n1,2\n# c\n,nan\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		s, err := Read(data, "fuzz")
		if err != nil {
			if !strings.HasPrefix(err.Error(), "fuzz: ") {
				t.Errorf("%v does not say where", err)
			}
			return
		}
		for i := range s.Names {
			if len(s.Column(i)) != len(s.Line) {
				t.Errorf("column %d has %d rows, expected %d", i, len(s.Column(i)), len(s.Line))
			}
		}
	})
}
