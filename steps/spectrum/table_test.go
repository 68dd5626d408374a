package spectrum

import (
	"math"
	"testing"
)

func TestTable(t *testing.T) {
	s := sample(t)
	got := Table(s)
	if err := got.Check(); err != nil {
		t.Fatal(err)
	}
	if got.Rows() != 3 {
		t.Errorf("%d rows", got.Rows())
	}
	for _, c := range got.Columns {
		switch c.Name {
		case "depth_ppm":
			if math.Abs(c.Number[0]-10000) > 1e-9 || !math.IsNaN(c.Number[1]) {
				t.Errorf("depths %v", c.Number)
			}
		case "depth_err_ppm":
			if math.Abs(c.Number[0]-s.Errors()[0]*1e6) > 1e-12 {
				t.Errorf("errors %v", c.Number)
			}
		case "flag":
			if c.Text[0] != "" || c.Text[1] == "" {
				t.Errorf("flags %q", c.Text)
			}
		}
	}
}
