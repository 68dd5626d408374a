package table

import (
	"math"
	"testing"
)

func TestCSV(t *testing.T) {
	in, err := New("t",
		Number("time", "d", "", 3, []float64{0.1, math.NaN(), 1e300, -1.0 / 3}),
		Text("note", "", []string{"plain", `a "quote", a comma`, "two\nlines", ""}),
		Number("x", "", "", 0, []float64{math.Inf(1), math.Inf(-1), 0, 5}))
	if err != nil {
		t.Fatal(err)
	}
	got, err := in.CSV()
	if err != nil {
		t.Fatal(err)
	}
	want := "time [d],note,x\n0.1,plain,inf\nnan,\"a \"\"quote\"\", a comma\",-inf\n1e+300,\"two\nlines\",0\n-0.3333333333333333,,5\n"
	if string(got) != want {
		t.Errorf("got:\n%s\nwant:\n%s", got, want)
	}
	in.Columns[0].Number = in.Columns[0].Number[:2]
	if _, err := in.CSV(); err == nil {
		t.Error("columns of different length were written")
	}
}
