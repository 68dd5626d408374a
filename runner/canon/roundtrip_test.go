package canon

import (
	"bytes"
	"math"
	"math/rand"
	"reflect"
	"testing"
	"testing/quick"

	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// special are the floats that random ones miss.
var special = []float64{0, math.Copysign(0, -1), math.NaN(), math.Inf(1), math.Inf(-1), 1, 0.5, 65504, 1e300, 0x1p-24, math.Pi}

// strew replaces some floats of v by special ones and some slices by nil or
// empty ones.
func strew(rng *rand.Rand, v reflect.Value) {
	switch v.Kind() {
	case reflect.Float64, reflect.Float32:
		if rng.Intn(2) == 0 {
			v.SetFloat(special[rng.Intn(len(special))])
		}
	case reflect.Slice:
		if rng.Intn(8) == 0 {
			v.Set(reflect.MakeSlice(v.Type(), 0, rng.Intn(4)))
		}
		fallthrough
	case reflect.Array:
		for i := range v.Len() {
			strew(rng, v.Index(i))
		}
	case reflect.Struct:
		for i := range v.NumField() {
			strew(rng, v.Field(i))
		}
	}
}

// equal compares as the encoding does: NaN equals NaN, -0 differs from 0, and
// nil equals empty.
func equal(a, b reflect.Value) bool {
	switch a.Kind() {
	case reflect.Float64, reflect.Float32:
		x, y := a.Float(), b.Float()
		return math.Float64bits(x) == math.Float64bits(y) || x != x && y != y
	case reflect.Slice, reflect.Array:
		if a.Len() != b.Len() {
			return false
		}
		for i := range a.Len() {
			if !equal(a.Index(i), b.Index(i)) {
				return false
			}
		}
		return true
	case reflect.Map:
		if a.Len() != b.Len() {
			return false
		}
		for it := a.MapRange(); it.Next(); {
			if other := b.MapIndex(it.Key()); !other.IsValid() || !equal(it.Value(), other) {
				return false
			}
		}
		return true
	case reflect.Struct:
		for i := range a.NumField() {
			if !equal(a.Field(i), b.Field(i)) {
				return false
			}
		}
		return true
	}
	return a.Interface() == b.Interface()
}

func TestRoundTrip(t *testing.T) {
	rng := rand.New(rand.NewSource(1))
	for _, sample := range []any{wide{}, lightcurve.Cube{}, fit.Posterior{}, fit.CurveFit{}, spectrum.Spectrum{}, figure.Figure{}, []table.Column{}, map[int64][]string{}, [2][2]float64{}} {
		typ := reflect.TypeOf(sample)
		for range 40 {
			v := reflect.New(typ).Elem()
			random, ok := quick.Value(typ, rng)
			if !ok {
				t.Fatalf("%v: no random value", typ)
			}
			v.Set(random)
			strew(rng, v)
			b, err := MarshalValue(v)
			if err != nil {
				t.Fatalf("%v: %v", typ, err)
			}
			back := reflect.New(typ).Elem()
			if err := UnmarshalValue(b, back); err != nil {
				t.Fatalf("%v: %v\n%x", typ, err, b)
			}
			if !equal(v, back) {
				t.Fatalf("%v: decoded to another value:\n%+v\n%+v", typ, v, back)
			}
			again, err := MarshalValue(back)
			if err != nil || !bytes.Equal(b, again) {
				t.Fatalf("%v: encoded again to other bytes (%v)\n%x\n%x", typ, err, b, again)
			}
			if p, _ := planOf(typ); len(b) < p.min {
				t.Fatalf("%v: %d bytes, fewer than the smallest possible %d", typ, len(b), p.min)
			}
			tree, err := Tree(b, 1<<26)
			if err != nil {
				t.Fatalf("%v: as a tree: %v", typ, err)
			}
			if m, ok := tree.(map[string]any); ok && typ.Kind() == reflect.Struct && len(m) != typ.NumField() {
				t.Fatalf("%v: its tree has %d fields", typ, len(m))
			}
		}
	}
}

func smallCube() lightcurve.Cube {
	return lightcurve.Cube{
		Time:     []float64{1, 2},
		Channels: []lightcurve.Channel{{Index: 0, Lo: 0.6, Hi: 0.75}, {Index: 300, Lo: 0.75, Hi: 1}},
		Flux:     [][]float64{{1, math.NaN()}, {math.Copysign(0, -1), 2}},
		Err:      [][]float64{{1, 1}, nil},
		Mask:     [][]lightcurve.Flag{{0, lightcurve.Missing}, {lightcurve.Zero, 0}},
		Aux:      []lightcurve.Series{{Name: "X", Unit: "pix", Value: []float64{1, 2}}, {Name: "Größe"}},
	}
}

// TestEveryBit changes every bit of the encodings of two values: what is still
// accepted must be the one encoding of another value.
func TestEveryBit(t *testing.T) {
	full := wide{Text: "τ", Nums: []float64{1, math.NaN()}, Bools: []bool{true, false}, F: math.NaN(), F32: 0.1, I: -1000, U: 1 << 40,
		List: []Inner{{-1}, {70000}}, ByName: map[name][]float64{"a": {1}, "bb": nil}, ByInt: map[int8]Inner{-1: {1}, 1: {}, 100: {}}}
	for _, v := range []any{smallCube(), full} {
		b, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		accepted := 0
		for i := range b {
			for mask := 1; mask < 256; mask++ {
				b[i] ^= byte(mask)
				back := reflect.New(reflect.TypeOf(v))
				if Unmarshal(b, back.Interface()) == nil {
					accepted++
					if again, err := MarshalValue(back.Elem()); err != nil || !bytes.Equal(again, b) {
						t.Fatalf("byte %d changed by %#x was accepted, but is encoded otherwise (%v)", i, mask, err)
					}
				}
				b[i] ^= byte(mask)
			}
		}
		for n := range b {
			if err := Unmarshal(b[:n], reflect.New(reflect.TypeOf(v)).Interface()); err == nil {
				t.Errorf("%T: the first %d of %d bytes were accepted", v, n, len(b))
			}
		}
		if accepted == 0 || accepted > 255*len(b)*3/4 {
			t.Errorf("%T: %d of %d changes were accepted", v, accepted, 255*len(b))
		}
	}
}

// TestNoSharing checks that decoded values keep no part of their input.
func TestNoSharing(t *testing.T) {
	want := smallCube()
	b, err := Marshal(want)
	if err != nil {
		t.Fatal(err)
	}
	var got lightcurve.Cube
	if err := Unmarshal(b, &got); err != nil {
		t.Fatal(err)
	}
	tree, err := Tree(b, 1<<20)
	if err != nil {
		t.Fatal(err)
	}
	before := encode(t, tree)
	for i := range b {
		b[i] = 0xff
	}
	if !equal(reflect.ValueOf(got), reflect.ValueOf(want)) {
		t.Error("the value changed with the bytes that it was decoded from")
	}
	if !bytes.Equal(before, encode(t, tree)) {
		t.Error("the tree changed with the bytes that it was decoded from")
	}
}

// TestEmpty checks what the package comment says of nil and empty.
func TestEmpty(t *testing.T) {
	type pair struct {
		S []float64
		L []string
		M map[string]int
	}
	a, err := Marshal(pair{})
	if err != nil {
		t.Fatal(err)
	}
	b, err := Marshal(pair{[]float64{}, []string{}, map[string]int{}})
	if err != nil || !bytes.Equal(a, b) {
		t.Errorf("nil and empty differ: %x, %x (%v)", a, b, err)
	}
	got := pair{S: []float64{1}, L: []string{"x"}, M: map[string]int{"x": 1}}
	if err := Unmarshal(a, &got); err != nil || got.S != nil || got.L != nil || got.M == nil || len(got.M) != 0 {
		t.Errorf("empty values decode to %#v, %v", got, err)
	}
}
