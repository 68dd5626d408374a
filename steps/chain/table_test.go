package chain

import (
	"math"
	"testing"
)

func TestTable(t *testing.T) {
	tab := Table("white light", []Summary{{Name: "impact", Median: 0.5, Lo68: 0.4, Hi68: 0.7, RHat: math.NaN()}, {Name: "midTransit", Unit: "d"}})
	if err := tab.Check(); err != nil {
		t.Fatal(err)
	}
	if tab.Rows() != 2 || tab.Columns[0].Text[1] != "midTransit" || tab.Columns[1].Text[1] != "d" {
		t.Errorf("%+v", tab.Columns[:2])
	}
	near(t, "minus", tab.Columns[3].Number[0], 0.1, 1e-12)
	near(t, "plus", tab.Columns[4].Number[0], 0.2, 1e-12)
	if empty := Table("", nil); empty.Check() != nil || empty.Rows() != 0 {
		t.Errorf("%+v", empty)
	}
}
