package canon

import (
	"bytes"
	"fmt"
	"math/rand"
	"reflect"
	"strings"
	"testing"
	"testing/quick"

	"rimlight/steps/lightcurve"
)

// TestAnnouncements gives heads that announce far more than follows, in front
// of a little content: what is allocated must be in proportion to the content.
func TestAnnouncements(t *testing.T) {
	type large struct {
		Names  [64]string
		Cube   lightcurve.Cube
		Values [100]float64
		Lists  [50][]string
	}
	var heads [][]byte
	for _, n := range []uint64{1000, 1 << 20, 1<<32 + 1, 1 << 63, 1<<64 - 1} {
		for _, major := range []byte{majorBytes, majorText, majorArray, majorMap} {
			heads = append(heads, appendHead(nil, major, n))
		}
		for _, tag := range []uint64{64, 79, 86} {
			heads = append(heads, appendHead(appendHead(nil, majorTag, tag), majorBytes, n&^7))
		}
	}
	targets := []any{new([]large), new([][3]large), new(large), new([]lightcurve.Cube), new(map[string]large), new(map[int]string), new([]float64),
		new([]uint8), new([]flag), new([]string), new([]bool), new([][]bool), new([]map[string]bool), new(string), new([][][]float64), new([1 << 10]string)}
	for _, head := range heads {
		for _, fill := range []string{"", "\x00", "\x60", "\x80", "\xa0", "\xf4", "\x81", "\xd8\x56\x40"} {
			data := append(bytes.Clone(head), strings.Repeat(fill, 3000)...)
			for _, v := range targets {
				own := int(reflect.TypeOf(v).Elem().Size())
				if n := allocated(func() { Unmarshal(data, v) }); n > 1<<14+2*own+200*len(data) {
					t.Errorf("%x and %q into %T: %d bytes of memory for %d bytes of data", head, fill, v, n, len(data))
				}
			}
			if n := allocated(func() { Split("string", data) }); n > 1<<14+30*len(data) {
				t.Errorf("%x and %q split: %d bytes of memory for %d bytes of data", head, fill, n, len(data))
			}
			if n := allocated(func() { Tree(data, 1000) }); n > 1<<14 {
				t.Errorf("%x and %q as a tree of at most 1000 bytes: %d bytes of memory", head, fill, n)
			}
		}
	}
}

// TestDearest decodes the values that take the most memory for their bytes.
func TestDearest(t *testing.T) {
	for _, v := range []any{
		make([]string, 5000), make([][]bool, 5000), make([]map[string]string, 5000), make([][]map[string]bool, 5000), slices(5000, map[string][]string{"": nil}),
		slices(5000, map[string]struct{ A, B, C, D, E []bool }{"": {}}), slices(5000, struct{ A, B, C, D []string }{}),
	} {
		data, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		back := reflect.New(reflect.TypeOf(v))
		n := allocated(func() { err = Unmarshal(data, back.Interface()) })
		if err != nil {
			t.Fatal(err)
		}
		t.Logf("%T: %d bytes of memory for each byte", v, n/len(data))
		if n > 1<<14+200*len(data) {
			t.Errorf("%T: %d bytes of memory for %d bytes of data", v, n, len(data))
		}
	}
}

func slices[T any](n int, v T) []T {
	s := make([]T, n)
	for i := range s {
		s[i] = v
	}
	return s
}

// TestLongKeys checks that errors do not grow with the bytes they are about.
func TestLongKeys(t *testing.T) {
	data := appendHead(nil, majorMap, 1)
	data = append(appendText(data, strings.Repeat("k", 1<<20)), 0xf6)
	for _, err := range []error{Unmarshal(data, new(map[string]bool)), second(Tree(data, 1<<24)), second(Split("string", append([]byte{0x81}, data...)))} {
		if err == nil || len(err.Error()) > 300 {
			t.Errorf("%.400v", err)
		}
	}
}

func second[T any](_ T, err error) error { return err }

// madeType makes a random type, at most depth deep, of those that can be
// encoded.
func madeType(rng *rand.Rand, depth int) reflect.Type {
	basic := []any{false, 0, int8(0), int16(0), int32(0), int64(0), uint(0), uint8(0), uint16(0), uint32(0), uint64(0), 0.0, float32(0), "", flag(0), name("")}
	form := rng.Intn(6)
	if depth == 0 {
		form = 0
	}
	switch form {
	case 1:
		return reflect.SliceOf(madeType(rng, depth-1))
	case 2:
		return reflect.ArrayOf(1+rng.Intn(4), madeType(rng, depth-1))
	case 3:
		return reflect.MapOf(reflect.TypeOf([]any{"", 0, uint8(0), int16(0), name("")}[rng.Intn(5)]), madeType(rng, depth-1))
	case 4, 5:
		var fields []reflect.StructField
		for i := range 1 + rng.Intn(5) {
			n := fmt.Sprintf("%c%s%d", 'A'+rng.Intn(26), strings.Repeat("x", rng.Intn(30)), i)
			fields = append(fields, reflect.StructField{Name: n, Type: madeType(rng, depth-1)})
		}
		return reflect.StructOf(fields)
	}
	return reflect.TypeOf(basic[rng.Intn(len(basic))])
}

// TestMadeTypes takes random values of random types there and back, and alters
// random bytes of them.
func TestMadeTypes(t *testing.T) {
	rng := rand.New(rand.NewSource(2))
	for range 300 {
		typ := madeType(rng, 4)
		v := reflect.New(typ).Elem()
		fill(rng, v)
		strew(rng, v)
		b, err := MarshalValue(v)
		if err != nil {
			t.Fatalf("%v: %v", typ, err)
		}
		back := reflect.New(typ).Elem()
		if err := UnmarshalValue(b, back); err != nil || !equal(v, back) {
			t.Fatalf("%v: decoded %+v to %+v (%v)", typ, v, back, err)
		}
		if p, _ := planOf(typ); len(b) < p.min {
			t.Fatalf("%v: %d bytes, fewer than the smallest possible %d", typ, len(b), p.min)
		}
		layout, err := Layout(typ)
		if err != nil {
			t.Fatal(err)
		}
		listed, err := Marshal(reflect.Append(reflect.MakeSlice(reflect.SliceOf(typ), 0, 2), v, back).Interface())
		if err != nil {
			t.Fatal(err)
		}
		items, err := Split(layout, listed)
		if err != nil || len(items) != 2 || !bytes.Equal(items[0], b) || !bytes.Equal(items[1], b) {
			t.Fatalf("%v: split %x to %x, expected twice %x (%v)", typ, listed, items, b, err)
		}
		if joined, err := Join(layout, items); err != nil || !bytes.Equal(joined, listed) {
			t.Fatalf("%v: joined to %x, expected %x (%v)", typ, joined, listed, err)
		}
		for range 100 {
			altered := bytes.Clone(b)
			altered[rng.Intn(len(b))] ^= byte(1 + rng.Intn(255))
			other := reflect.New(typ).Elem()
			if UnmarshalValue(altered, other) != nil {
				continue
			}
			if again, err := MarshalValue(other); err != nil || !bytes.Equal(again, altered) {
				t.Fatalf("%v: accepted %x, but encoded again to %x (%v)", typ, altered, again, err)
			}
		}
	}
}

// fill gives v a random value, at most a few elements long at each level.
func fill(rng *rand.Rand, v reflect.Value) {
	switch v.Kind() {
	case reflect.Slice:
		v.Set(reflect.MakeSlice(v.Type(), rng.Intn(4), 4))
		fallthrough
	case reflect.Array:
		for i := range v.Len() {
			fill(rng, v.Index(i))
		}
	case reflect.Map:
		v.Set(reflect.MakeMap(v.Type()))
		for range rng.Intn(4) {
			key, value := reflect.New(v.Type().Key()).Elem(), reflect.New(v.Type().Elem()).Elem()
			fill(rng, key)
			fill(rng, value)
			v.SetMapIndex(key, value)
		}
	case reflect.Struct:
		for i := range v.NumField() {
			fill(rng, v.Field(i))
		}
	default:
		if random, ok := quick.Value(v.Type(), rng); ok {
			v.Set(random)
		}
	}
}
