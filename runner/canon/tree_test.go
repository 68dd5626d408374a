package canon

import (
	"math"
	"reflect"
	"strings"
	"testing"
)

func TestTree(t *testing.T) {
	type all struct {
		Flag   bool
		Int    int
		Big    uint64
		Depth  float64
		Text   string
		Flux   []float64
		Masks  [][]flag
		Names  []string
		Counts map[int]string
		Empty  []string
		None   []int32
	}
	b, err := Marshal(all{true, -5, math.MaxUint64, 0.01, "τ", []float64{1, 2}, [][]flag{{1}, nil}, []string{"a"}, map[int]string{-7: "m", 3: "p"}, nil, nil})
	if err != nil {
		t.Fatal(err)
	}
	got, err := Tree(b, 1<<16)
	if err != nil {
		t.Fatal(err)
	}
	want := map[string]any{
		"Flag": true, "Int": int64(-5), "Big": uint64(math.MaxUint64), "Depth": 0.01, "Text": "τ", "Flux": []float64{1, 2},
		"Masks": []any{[]uint8{1}, []uint8{}}, "Names": []any{"a"}, "Counts": map[string]any{"-7": "m", "3": "p"}, "Empty": []any{}, "None": []int32{},
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got %#v\nexpected %#v", got, want)
	}
}

func TestTreeLimit(t *testing.T) {
	for _, v := range []any{make([]float64, 1000), make([]string, 1000), []string{strings.Repeat("x", 8000)}, [][]int{make([]int, 500), make([]int, 500)}} {
		b, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := Tree(b, 6000); err == nil || !strings.Contains(err.Error(), "too large to be shown") {
			t.Errorf("%T: %v", v, err)
		}
		if _, err := Tree(b, 100_000); err != nil {
			t.Errorf("%T: %v", v, err)
		}
	}
}
