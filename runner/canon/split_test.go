package canon

import (
	"bytes"
	"math"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
)

func TestSplitAndJoin(t *testing.T) {
	for _, v := range []any{
		[]float64{1, math.NaN(), math.Copysign(0, -1), 0.1, 1e300, math.Inf(1)}, []float32{1, 0.1, float32(math.NaN())},
		[]uint8{0, 23, 24, 255}, []flag{1, 200}, []uint16{1, 65535}, []uint32{1 << 31}, []uint64{1 << 63}, []uint{0, 1 << 40},
		[]int8{-128, 127}, []int16{-3, 300}, []int32{-1 << 31}, []int64{math.MinInt64, math.MaxInt64}, []int{-1, 0, 1000},
		[]float64(nil), []string{}, []string{"", "ä", "b"}, []bool{true, false}, smallCube().Channels, smallCube().Aux, smallCube().Flux, smallCube().Mask,
		[]lightcurve.Cube{smallCube(), {}}, []map[string]int{{"a": 1}, nil}, [][2]float64{{1, 2}}, [2]int16{5, -5},
	} {
		layout, err := Layout(reflect.TypeOf(v).Elem())
		if err != nil {
			t.Fatal(err)
		}
		whole, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		items, err := Split(layout, whole)
		if err != nil {
			t.Errorf("%T: %v", v, err)
			continue
		}
		if len(items) != reflect.ValueOf(v).Len() {
			t.Errorf("%T: %d items", v, len(items))
			continue
		}
		for i, item := range items {
			want, err := MarshalValue(reflect.ValueOf(v).Index(i))
			if err != nil || !bytes.Equal(item, want) {
				t.Errorf("%T: item %d is %x, expected %x (%v)", v, i, item, want, err)
			}
			if cap(item) != len(item) {
				t.Errorf("%T: item %d can be appended to over its neighbour", v, i)
			}
		}
		if joined, err := Join(layout, items); err != nil || !bytes.Equal(joined, whole) {
			t.Errorf("%T: joined to %x, expected %x (%v)", v, joined, whole, err)
		}
	}
}

func TestSplitRefuses(t *testing.T) {
	for _, c := range []struct{ layout, hex, want string }{
		{"float64", "81 f93c00", "expected an array of float64, found an array"},
		{"float64", "d856 40 00", "1 bytes follow"},
		{"string", "d856 40", "expected an array, found an array of float64"},
		{"string", "82 60", "an array of 2 elements, but only 1 bytes follow"},
		{"string", "82 60 61", "[1]: an item of 1 bytes, but only 0 follow"},
		{"string", "81 60 60", "1 bytes follow"},
		{"string", "81 40", "[0]: a byte string is no part of a value"},
		{"string", "81 f6", "[0]: expected a truth value, found null"},
		{"string", "9a ffffffff", "an array of 4294967295 elements, but only 0 bytes follow"},
		{"struct{A int}", "81 a2 6162 01 6161 01", `[0]["a"]: the key is repeated`},
		{"struct{A int}", "81 a2 01 01 6161 01", `[0]["a"]: a map has both text and integers`},
		{"[]float64", "81 d856 48 010000000000f87f", "[0][0]: NaN with the bits"},
		{"[]string", strings.Repeat("81", 100) + "80", "[0]: values nest more than 64 deep"},
	} {
		if items, err := Split(c.layout, unhex(t, c.hex)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %x, %v; expected %s", c.hex, items, err, c.want)
		}
	}
	for _, c := range []struct{ layout, hex, want string }{
		{"float64", "01", "canon: [1]: expected float64, found an integer"},
		{"uint8", "f93c00", "canon: [0]: expected uint8, found a float"},
		{"string", "60 60", "canon: [1]: 1 bytes follow"},
		{"string", "", "canon: [1]: the bytes end"},
		{"string", "18 01", "canon: [1]: the number 1 is in 1 bytes"},
	} {
		good, _ := Marshal(0.5)
		if joined, err := Join(c.layout, [][]byte{good, unhex(t, c.hex)}); err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%s: %x, %v; expected %s", c.hex, joined, err, c.want)
		}
	}
}

func TestLen(t *testing.T) {
	for _, v := range []any{[]float64{1, 2, 3}, []string{"a", ""}, []uint8{}, [][]int{{1}, {2}, nil}} {
		data, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		slice := reflect.ValueOf(v)
		layout, err := Layout(slice.Type().Elem())
		if err != nil {
			t.Fatal(err)
		}
		if n, err := Len(layout, data); err != nil || n != slice.Len() {
			t.Errorf("%v: got %d, %v; want %d", v, n, err, slice.Len())
		}
	}
	if n, err := Len("string", []byte{0x61, 'a'}); err == nil {
		t.Errorf("a text has the length %d as a slice", n)
	}
}
