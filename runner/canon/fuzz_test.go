package canon

import (
	"bytes"
	"reflect"
	"runtime"
	"strconv"
	"testing"

	"rimlight/steps/lightcurve"
)

// allocated runs f and gives the bytes of memory that it took.
func allocated(f func()) int {
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	f()
	runtime.ReadMemStats(&after)
	return int(after.TotalAlloc - before.TotalAlloc)
}

// seed adds encodings to begin fuzzing with.
func seed(f *testing.F) {
	for _, v := range []any{smallCube(), wide{List: []Inner{{1}}, ByInt: map[int8]Inner{1: {2}}}, []string{"a"}, 1.5, []int16{1}, [][]uint8{{1}, {}}} {
		b, err := Marshal(v)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	f.Add([]byte{0x9a, 0x00, 0xff, 0xff, 0xff})
}

// integerKeys reports whether a tree may have come from a map with integer
// keys, which cannot be told from text in it.
func integerKeys(v any) bool {
	switch v := v.(type) {
	case []any:
		for _, x := range v {
			if integerKeys(x) {
				return true
			}
		}
	case map[string]any:
		for k, x := range v {
			_, err := strconv.ParseFloat(k, 64)
			if err == nil || integerKeys(x) {
				return true
			}
		}
	}
	return false
}

func FuzzTree(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, data []byte) {
		var tree any
		var err error
		const limit = 1 << 20
		if n := allocated(func() { tree, err = Tree(data, limit) }); n > 2*limit+64*len(data) {
			t.Errorf("%d bytes of memory for %d bytes of data", n, len(data))
		}
		if err == nil && !integerKeys(tree) {
			if again := encode(t, tree); !bytes.Equal(again, data) {
				t.Errorf("accepted %x, but encoded again to %x", data, again)
			}
		}
		for _, elem := range []string{"string", "float64", "struct{A int}"} {
			items, err := Split(elem, data)
			if err != nil {
				continue
			}
			if joined, err := Join(elem, items); err != nil || !bytes.Equal(joined, data) {
				t.Errorf("split and joined %x to %x (%v)", data, joined, err)
			}
		}
	})
}

func FuzzOpen(f *testing.F) {
	f.Add(Seal("int", "int", []byte{1}))
	f.Add(Seal("", "struct{Größe float64}", nil))
	f.Add(Seal("lightcurve.Channel", "struct{Index int}", bytes.Repeat([]byte{0xd9}, 300)))
	f.Fuzz(func(t *testing.T, data []byte) {
		typ, layout, value, err := Open(data)
		if err == nil && !bytes.Equal(Seal(typ, layout, value), data) {
			t.Errorf("opened and sealed %x otherwise", data)
		}
	})
}

func FuzzUnmarshalCube(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, data []byte) {
		for _, v := range []any{new(lightcurve.Cube), new(wide), new([][]string)} {
			var err error
			if n := allocated(func() { err = Unmarshal(data, v) }); n > 1<<15+100*len(data) {
				t.Errorf("%T: %d bytes of memory for %d bytes of data", v, n, len(data))
			}
			if err != nil {
				continue
			}
			if again, err := MarshalValue(reflect.ValueOf(v).Elem()); err != nil || !bytes.Equal(again, data) {
				t.Errorf("%T: accepted %x, but encoded again to %x (%v)", v, data, again, err)
			}
		}
	})
}
