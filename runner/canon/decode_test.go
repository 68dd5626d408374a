package canon

import (
	"encoding/hex"
	"math"
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
)

func unhex(t *testing.T, s string) []byte {
	t.Helper()
	b, err := hex.DecodeString(strings.ReplaceAll(s, " ", ""))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func TestRefusedBytes(t *testing.T) {
	type point struct{ A, B int8 }
	for _, c := range []struct {
		into any
		hex  string
		want string
	}{
		{0, "", "the bytes end in the middle of the value"},
		{0, "6161", "expected int, found text"},
		{0, "18 17", "the number 23 is in 1 bytes, not in its shortest form"},
		{0, "19 00ff", "the number 255 is in 2 bytes, not in its shortest form"},
		{0, "1a 00000001", "the number 1 is in 4 bytes, not in its shortest form"},
		{0, "1b 00000000ffffffff", "the number 4294967295 is in 8 bytes, not in its shortest form"},
		{0, "1b 80000000000000 00", "an integer is out of range for int"},
		{0, "3b 8000000000000000", "an integer is out of range for int"},
		{0, "1c", "the initial byte 0x1c has no meaning"},
		{0, "00 00", "1 bytes follow the end of the value"},
		{int8(0), "18 80", "an integer is out of range for int8"},
		{uint8(0), "19 0100", "256 is out of range for uint8"},
		{uint8(0), "20", "expected uint8, found an integer"},
		{0.0, "01", "expected float64, found an integer"},
		{0.0, "f6", "expected float64, found null"},
		{0.0, "fb 3ff0000000000000", "the float 1 is not in its shortest form"},
		{0.0, "fa 3f800000", "the float 1 is not in its shortest form"},
		{0.0, "f9 7e01", "the float NaN is not in its shortest form"},
		{0.0, "f9 fe00", "the float NaN is not in its shortest form"},
		{0.0, "fb 7ff8000000000001", "the float NaN is not in its shortest form"},
		{0.0, "fb 3ff0", "the bytes end in the middle of the value"},
		{float32(0), "fb 3ff199999999999a", "1.1 is no float32"},
		{true, "f7", "expected a truth value, found an unknown simple value"},
		{true, "f8 15", "expected a truth value, found an unknown simple value"},
		{"", "61 ff", `the text "\xff" is not valid UTF-8`},
		{"", "7f 6161 ff", "an item of indefinite length, expected the length at its head"},
		{"", "7b ffffffffffffffff", "an item of 18446744073709551615 bytes, but only 0 follow"},
		{"", "41 61", "expected text, found a byte string"},
		{[]float64{}, "63616263", "expected an array of float64, found text"},
		{[]float64{}, "81 f93c00", "expected an array of float64, found an array"},
		{[]float64{}, "d855 44 0000803f", "expected an array of float64, found an array of float32"},
		{[]float64{}, "d856 44 0000803f", "an array of float64 of 4 bytes, expected a multiple of 8"},
		{[]float64{}, "d856 48 0000", "an item of 8 bytes, but only 2 follow"},
		{[]float64{}, "d856 48 010000000000f87f", "[0]: NaN with the bits 0x7ff8000000000001, expected 0x7ff8000000000000"},
		{[]float64{}, "d856 80", "expected the bytes of an array of float64, found an array"},
		{[]float64{}, "d852 48 3ff0000000000000", "the tag 82 has no meaning here"},
		{[]float32{}, "d855 48 0000803f 0100c0ff", "[1]: NaN with the bits 0xffc00001, expected 0x7fc00000"},
		{[2]uint8{}, "d840 43 010203", "expected 2 numbers, found 3"},
		{[2]string{}, "81 60", "expected 2 elements, found 1"},
		{[]string{}, "9b 0000000100000000", "an array of 4294967296 elements, but only 0 bytes follow"},
		{[]string{}, "d856 40", "expected an array, found an array of float64"},
		{[]string{}, "d863 40", "expected an array, found an unknown tag"},
		{[][]string{}, "82 80 81 01", "[1][0]: expected text, found an integer"},
		{point{}, "a1 6141 01", ".B: the field is missing"},
		{point{}, "a2 6142 01 6141 01", ".A: the field is missing"},
		{point{}, "a2 6141 01 6141 01", ".A: the field is repeated or not in sorted order"},
		{point{}, "a2 6141 01 6143 01", `there is no field "C"`},
		{point{}, "a3 6141 01 6142 01 6143 01", `there is no field "C"`},
		{point{}, "a2 6141 01 6142 f5", ".B: expected int8, found a truth value"},
		{point{}, "a2 01 01 02 01", "expected the name of a field, found an integer"},
		{point{}, "a0", ".A: the field is missing"},
		{point{}, "80", "expected a map of the fields of a struct, found an array"},
		{map[string]int{}, "a2 6162 01 6161 01", `["a"]: the key is repeated or not in sorted order`},
		{map[string]int{}, "a2 6161 01 6161 01", `["a"]: the key is repeated or not in sorted order`},
		{map[string]int{}, "a1 01 01", "[key]: expected text, found an integer"},
		{map[uint8]int{}, "a1 01 60", "[1]: expected int, found text"},
		{map[int]int{}, "a2 20 00 00 00", "[0]: the key is repeated or not in sorted order"},
		{map[int]int{}, "ba 10000000", "a map of 268435456 elements, but only 0 bytes follow"},
	} {
		v := reflect.New(reflect.TypeOf(c.into))
		err := Unmarshal(unhex(t, c.hex), v.Interface())
		if err == nil || err.Error() != joint(c.want) {
			t.Errorf("%s into %T: %v; expected %s", c.hex, c.into, err, c.want)
		}
	}
}

// joint puts the package's name before an error, whether it begins with a path
// or not.
func joint(s string) string { return "canon: " + s }

func TestErrorPath(t *testing.T) {
	type series struct {
		Name, Unit string
		Value      string // []float64 in a light curve
	}
	type cube struct {
		Time     []float64
		Channels []lightcurve.Channel
		Flux     [][]float64
		Err      [][]float64
		Mask     [][]lightcurve.Flag
		Aux      []series
	}
	b, err := Marshal(cube{Aux: []series{{}, {"X", "pix", "wrong"}}})
	if err != nil {
		t.Fatal(err)
	}
	got := lightcurve.Cube{Time: []float64{42}}
	err = Unmarshal(b, &got)
	if want := "canon: .Aux[0].Value: expected an array of float64, found text"; err == nil || err.Error() != want {
		t.Errorf("%v; expected %s", err, want)
	}
	if len(got.Time) != 1 || got.Time[0] != 42 {
		t.Errorf("the value was changed to %+v, although decoding failed", got)
	}
}

func TestWrongTargets(t *testing.T) {
	var p *int
	for _, v := range []any{nil, 1, p} {
		if err := Unmarshal([]byte{1}, v); err == nil || !strings.Contains(err.Error(), "expected a pointer") {
			t.Errorf("into %#v: %v", v, err)
		}
	}
	if err := UnmarshalValue([]byte{1}, reflect.ValueOf(1)); err == nil {
		t.Error("a value that cannot be set was accepted")
	}
	var c chan int
	if err := Unmarshal([]byte{1}, &c); err == nil || !strings.Contains(err.Error(), "chan int cannot be encoded") {
		t.Errorf("into a channel: %v", err)
	}
}

// TestOneNaN checks that all NaNs, in scalars and arrays, are the same bytes.
func TestOneNaN(t *testing.T) {
	odd := math.Float64frombits(0xfff0dead0000beef)
	for _, pair := range [][2]any{
		{odd, math.NaN()}, {[]float64{odd}, []float64{math.NaN()}}, {[1]float64{odd}, [1]float64{math.NaN()}},
		{[]float32{math.Float32frombits(0xff800001)}, []float32{float32(math.NaN())}},
	} {
		a, _ := Marshal(pair[0])
		b, err := Marshal(pair[1])
		if err != nil || string(a) != string(b) {
			t.Errorf("%T: %x and %x (%v)", pair[0], a, b, err)
		}
	}
}
