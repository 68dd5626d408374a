package canon

import (
	"reflect"
	"strings"
	"testing"
	"time"

	"rimlight/steps/lightcurve"
)

type flag uint8
type name string
type column []float64

type Inner struct{ Z int32 }

// wide has a part of every form.
type wide struct {
	B      bool
	I      int
	I8     int8
	U      uint
	U16    uint16
	F      float64
	F32    float32
	Text   string
	Name   name
	Nums   []float64
	Col    column
	Flags  [][]flag
	I16s   []int16
	Ints   []int
	Fixed  [3]float32
	FixedF [2]flag
	Pair   [2]string
	Bools  []bool
	Inner
	List   []Inner
	ByName map[name][]float64
	ByInt  map[int8]Inner
	Deep   [][][]Inner
	Long   map[string]string
}

func TestLayout(t *testing.T) {
	for _, c := range []struct {
		value any
		want  string
	}{
		{0.0, "float64"},
		{lightcurve.Cube{}, "struct{Time []float64; Channels []struct{Index int; Lo float64; Hi float64}; Flux [][]float64; Err [][]float64; " +
			"Mask [][]uint8; Aux []struct{Name string; Unit string; Value []float64}}"},
		{wide{}.Fixed, "[3]float32"},
		{wide{}.ByName, "map[string][]float64"},
		{wide{}.ByInt, "map[int8]struct{Z int32}"},
		{struct{ Inner }{}, "struct{Inner struct{Z int32}}"},
		{[]name{}, "[]string"},
		{struct{}{}, "struct{}"},
	} {
		if got, err := Layout(reflect.TypeOf(c.value)); err != nil || got != c.want {
			t.Errorf("%T: %s, %v; expected %s", c.value, got, err, c.want)
		}
	}
}

// TestLayoutOfMadeTypes checks that a type made at run time and one declared
// are the same to readers.
func TestLayoutOfMadeTypes(t *testing.T) {
	var fields []reflect.StructField
	for _, n := range []string{"Index", "Lo", "Hi"} {
		f := reflect.StructField{Name: n, Type: reflect.TypeFor[float64]()}
		if n == "Index" {
			f.Type = reflect.TypeFor[int]()
		}
		fields = append(fields, f)
	}
	made := reflect.New(reflect.StructOf(fields)).Elem()
	a, _ := Layout(made.Type())
	if b, _ := Layout(reflect.TypeFor[lightcurve.Channel]()); a != b {
		t.Errorf("layouts %s and %s differ", a, b)
	}
	want := lightcurve.Channel{Index: 3, Lo: 0.6, Hi: 0.75}
	b, err := Marshal(want)
	if err != nil {
		t.Fatal(err)
	}
	if err := UnmarshalValue(b, made); err != nil {
		t.Fatal(err)
	}
	b, err = MarshalValue(made)
	if err != nil {
		t.Fatal(err)
	}
	var got lightcurve.Channel
	if err := Unmarshal(b, &got); err != nil || got != want {
		t.Errorf("%+v, %v; expected %+v", got, err, want)
	}
}

type recursive struct{ Kids []recursive }

func TestRefusedTypes(t *testing.T) {
	deep := reflect.TypeFor[float64]()
	for range maxDepth {
		deep = reflect.SliceOf(deep)
	}
	for _, c := range []struct {
		typ  reflect.Type
		want string
	}{
		{reflect.TypeFor[*int](), "canon: a value of type *int cannot be encoded"},
		{reflect.TypeFor[struct{ A []struct{ F func() } }](), "canon: .A[].F: a value of type func()"},
		{reflect.TypeFor[[]any](), "canon: []: a value of type interface {}"},
		{reflect.TypeFor[map[string]chan int](), "canon: []: a value of type chan int"},
		{reflect.TypeFor[struct{ a int }](), "canon: .a: an unexported field"},
		{reflect.TypeFor[time.Time](), "canon: .wall: an unexported field"},
		{reflect.TypeFor[complex128](), "canon: a value of type complex128"},
		{reflect.TypeFor[uintptr](), "canon: a value of type uintptr"},
		{reflect.TypeFor[map[float64]int](), "canon: a map with keys of type float64"},
		{reflect.TypeFor[map[[2]int]int](), "canon: a map with keys of type [2]int"},
		{reflect.TypeFor[recursive](), "canon: .Kids[]: canon.recursive contains itself"},
		{reflect.TypeFor[[]struct{}](), "canon: []: a value of type struct {} has no content"},
		{reflect.TypeFor[[1 << 40]bool](), "canon: an array of 1099511627776 bytes"},
		{deep, "canon: " + strings.Repeat("[]", maxDepth) + ": types nest more than 64 deep"},
		{nil, "canon: there is no value"},
	} {
		for range 2 { // the second time from memory
			if _, err := Layout(c.typ); err == nil || !strings.HasPrefix(err.Error(), c.want) {
				t.Errorf("%v: %v; expected %s", c.typ, err, c.want)
			}
		}
	}
	if _, err := Marshal(nil); err == nil {
		t.Error("nil was encoded")
	}
	if _, err := Marshal(struct{ A []name }{[]name{"a", "\xff"}}); err == nil || !strings.HasPrefix(err.Error(), "canon: .A[1]: text that is not valid UTF-8") {
		t.Errorf("text that is not UTF-8: %v", err)
	}
	if _, err := Marshal(map[string]string{"k": "\xff"}); err == nil || !strings.HasPrefix(err.Error(), `canon: ["k"]: text that is not`) {
		t.Errorf("text that is not UTF-8: %v", err)
	}
}

// TestHugeLayout checks that types whose layouts double with every line of
// source are refused, and soon.
func TestHugeLayout(t *testing.T) {
	start := time.Now()
	_, err := Layout(reflect.TypeFor[twice8[twice8[twice8[float64]]]]())
	if err == nil || !strings.Contains(err.Error(), "has more parts than can be encoded") {
		t.Errorf("%.200v", err)
	}
	if d := time.Since(start); d > 2*time.Second {
		t.Errorf("it took %v to say so", d)
	}
}

type twice[T any] struct{ A, B []T }
type twice4[T any] struct{ A twice[twice[twice[twice[T]]]] }
type twice8[T any] struct{ A twice4[twice4[T]] }
