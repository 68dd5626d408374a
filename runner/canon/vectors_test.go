package canon

import (
	"bufio"
	"bytes"
	"encoding/hex"
	"encoding/json"
	"math"
	"os"
	"reflect"
	"sort"
	"strconv"
	"strings"
	"testing"
)

// lines reads a file of examples, three columns a line.
func lines(t *testing.T, file string) [][]string {
	t.Helper()
	f, err := os.Open("../../testdata/cbor/" + file)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var out [][]string
	for sc := bufio.NewScanner(f); sc.Scan(); {
		out = append(out, strings.SplitN(sc.Text(), " ", 3))
	}
	if len(out) == 0 {
		t.Fatalf("%s: no examples", file)
	}
	return out
}

func TestStandardExamples(t *testing.T) {
	for _, line := range lines(t, "rfc8949.txt") {
		data, err := hex.DecodeString(line[1])
		if err != nil {
			t.Fatal(err)
		}
		got, err := Tree(data, 1<<20)
		if line[0] == "no" {
			if err == nil {
				t.Errorf("%s (%s): accepted as %#v", line[1], line[2], got)
			}
			continue
		}
		want := parse(t, line[2])
		if err != nil {
			t.Errorf("%s: %v, expected %v", line[1], err, want)
			continue
		}
		if !same(got, want) {
			t.Errorf("%s: got %#v, expected %#v", line[1], got, want)
		}
		if line[1] == "a201020304" {
			want = map[int]int{1: 2, 3: 4}
		}
		if again := encode(t, want); !bytes.Equal(again, data) {
			t.Errorf("%v: encoded to %x, expected %x", want, again, data)
		}
	}
}

// parse reads a value as the examples write it.
func parse(t *testing.T, s string) any {
	if x, err := strconv.ParseFloat(s, 64); err == nil && strings.ContainsAny(s, ".eIN") {
		return x
	}
	d := json.NewDecoder(strings.NewReader(s))
	d.UseNumber()
	var v any
	if err := d.Decode(&v); err != nil {
		t.Fatalf("%s: %v", s, err)
	}
	return whole(v)
}

// whole turns JSON's numbers, all of them integers here, into integers.
func whole(v any) any {
	switch v := v.(type) {
	case json.Number:
		if i, err := v.Int64(); err == nil {
			return i
		}
		u, _ := strconv.ParseUint(string(v), 10, 64)
		return u
	case []any:
		for i := range v {
			v[i] = whole(v[i])
		}
	case map[string]any:
		for k := range v {
			v[k] = whole(v[k])
		}
	}
	return v
}

// same is equality in which NaN equals itself, and 0 does not equal -0.
func same(a, b any) bool {
	if x, ok := a.(float64); ok {
		y, ok := b.(float64)
		return ok && math.Float64bits(x) == math.Float64bits(y) || x != x && y != y
	}
	return reflect.DeepEqual(a, b)
}

// encode encodes a tree, see [Tree], whose keys are all text.
func encode(t *testing.T, v any) []byte {
	var b []byte
	switch v := v.(type) {
	case []any:
		b = appendHead(b, majorArray, uint64(len(v)))
		for _, x := range v {
			b = append(b, encode(t, x)...)
		}
	case map[string]any:
		entries := make([]string, 0, len(v))
		for k, x := range v {
			entries = append(entries, string(append(appendText(nil, k), encode(t, x)...)))
		}
		sort.Strings(entries) // no key's encoding is the beginning of another's
		b = appendHead(b, majorMap, uint64(len(v)))
		for _, e := range entries {
			b = append(b, e...)
		}
	default:
		var err error
		if b, err = Marshal(v); err != nil {
			t.Fatal(err)
		}
	}
	return b
}

// TestTypedArrays compares typed arrays with the tags of RFC 8746, tables 1
// and 3.
func TestTypedArrays(t *testing.T) {
	for _, line := range lines(t, "rfc8746.txt") {
		kind := line[1]
		cells := strings.Fields(line[2])
		data, err := hex.DecodeString(cells[1])
		if err != nil {
			t.Fatal(err)
		}
		k, ok := numberNamed(kind)
		if !ok || strconv.FormatUint(k.tag, 10) != line[0] {
			t.Errorf("%s: tag %d, expected %s", kind, k.tag, line[0])
		}
		slice := reflect.New(reflect.SliceOf(scalarTypes[k.kind]))
		if err := Unmarshal(data, slice.Interface()); err != nil {
			t.Errorf("%s: %v", kind, err)
			continue
		}
		for i, s := range strings.Split(cells[0], ",") {
			var got string
			switch x := slice.Elem().Index(i); {
			case x.CanFloat():
				got = strconv.FormatFloat(x.Float(), 'g', -1, 64)
			case x.CanInt():
				got = strconv.FormatInt(x.Int(), 10)
			default:
				got = strconv.FormatUint(x.Uint(), 10)
			}
			if got != s {
				t.Errorf("%s: element %d is %s, expected %s", kind, i, got, s)
			}
		}
		if again, err := Marshal(slice.Elem().Interface()); err != nil || !bytes.Equal(again, data) {
			t.Errorf("%s: encoded to %x, %v, expected %x", kind, again, err, data)
		}
	}
}
