package canon

import (
	"bytes"
	"errors"
	"io"
	"math"
	"reflect"
	"strings"
	"testing"
	"testing/iotest"

	"rimlight/steps/lightcurve"
)

// mass are values that take more than a piece.
func mass() []any {
	long := make([]float64, 100_000)
	flags := make([]uint8, 700_000)
	for i := range long {
		long[i] = float64(i) / 3
	}
	long[99_999] = math.NaN()
	words := map[string][]float64{}
	for i := range 30 {
		words[strings.Repeat("k", i*i*100)] = long[:i*1000]
	}
	return []any{
		lightcurve.Cube{Time: long, Flux: [][]float64{long, nil, long[:1]}, Mask: [][]lightcurve.Flag{flags}, Channels: make([]lightcurve.Channel, 5000)},
		words, strings.Repeat("größe ", 200_000), []string{strings.Repeat("x", 300_000), "", "y"},
		map[int]string{-5: "a", 3: strings.Repeat("b", 400_000), 200: "c"}, [40000]float64{7: 1}, []float32{1, 2}, make([]int16, 400_000),
	}
}

// TestStream holds that values are written and read piece by piece as they are
// at once, however the pieces fall.
func TestStream(t *testing.T) {
	for _, v := range append(mass(), smallCube(), wide{List: []Inner{{1}}, ByInt: map[int8]Inner{1: {2}}}, true, 1.5, "", int64(-1)) {
		want, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		var got bytes.Buffer
		if err := WriteValue(&got, reflect.ValueOf(v)); err != nil || !bytes.Equal(got.Bytes(), want) {
			t.Fatalf("%T: %v, %d bytes, want %d", v, err, got.Len(), len(want))
		}
		layout, err := Layout(reflect.TypeOf(v))
		if err != nil {
			t.Fatal(err)
		}
		sealed := Seal("t", layout, want)
		for name, src := range map[string]io.Reader{"whole": bytes.NewReader(sealed), "halves": iotest.HalfReader(bytes.NewReader(sealed)), "with the end": iotest.DataErrReader(bytes.NewReader(sealed))} {
			back := reflect.New(reflect.TypeOf(v)).Elem()
			if err := ReadSealed(src, int64(len(sealed))+1000, back); err != nil {
				t.Fatalf("%T, %s: %v", v, name, err)
			}
			if again, err := MarshalValue(back); err != nil || !bytes.Equal(again, want) {
				t.Errorf("%T, %s: came back otherwise (%v)", v, name, err)
			}
		}
	}
}

func TestStreamRefuses(t *testing.T) {
	long := make([]float64, 100_000)
	b, err := Marshal(long)
	if err != nil {
		t.Fatal(err)
	}
	good := Seal("[]float64", "[]float64", b)
	nan := bytes.Clone(good)
	copy(nan[len(nan)-8:], "\xff\xff\xff\xff\xff\xff\xff\xff")
	broken := errors.New("the disk is broken")
	for _, c := range []struct {
		src   io.Reader
		limit int64
		want  string
	}{
		{bytes.NewReader(good[:len(good)-1]), 1 << 30, "the bytes end in the middle of the value"},
		{bytes.NewReader(good), int64(len(good)) - 1, "but only"},
		{bytes.NewReader(append(bytes.Clone(good), 0)), 1 << 30, "1 bytes follow the end of the value"},
		{bytes.NewReader(nan), 1 << 30, "[99999]: NaN with the bits"},
		{io.MultiReader(bytes.NewReader(good[:500_000]), iotest.ErrReader(broken)), 1 << 30, broken.Error()},
		{strings.NewReader(""), 0, "no value of rimlight's"},
		{bytes.NewReader(Seal("[]int64", "[]int64", b)), 1 << 30, "the value has the layout []int64, expected []float64"},
	} {
		var back []float64
		err := ReadSealed(c.src, c.limit, reflect.ValueOf(&back).Elem())
		if err == nil || !strings.Contains(err.Error(), c.want) || back != nil {
			t.Errorf("got %v, want %q", err, c.want)
		}
	}
	if err := WriteValue(io.Discard, reflect.ValueOf([]string{"\xff"})); err == nil || !strings.Contains(err.Error(), "UTF-8") {
		t.Error(err)
	}
}

// TestPassedOver holds that fields can be left out in reading.
func TestPassedOver(t *testing.T) {
	cube := smallCube()
	cube.Flux = append(cube.Flux, make([]float64, 200_000))
	layout, err := Layout(reflect.TypeOf(cube))
	if err != nil {
		t.Fatal(err)
	}
	b, err := Marshal(cube)
	if err != nil {
		t.Fatal(err)
	}
	sealed := Seal("cube", layout, b)
	var back lightcurve.Cube
	if err := ReadSealed(iotest.HalfReader(bytes.NewReader(sealed)), int64(len(sealed)), reflect.ValueOf(&back).Elem(), "Flux", "Channels"); err != nil {
		t.Fatal(err)
	}
	cube.Flux, cube.Channels = nil, nil
	if want, got := reflect.ValueOf(cube), reflect.ValueOf(back); !equal(want, got) {
		t.Errorf("got %+v", back)
	}
	if err := ReadSealed(bytes.NewReader(sealed[:len(sealed)-100]), int64(len(sealed)), reflect.ValueOf(&back).Elem(), "Flux"); err == nil {
		t.Error("a value that is cut short was read")
	}
}

// TestStreamMemory holds that values pass without a second copy of them.
func TestStreamMemory(t *testing.T) {
	cube := lightcurve.Cube{Flux: make([][]float64, 400)}
	for i := range cube.Flux {
		cube.Flux[i] = make([]float64, 10_000)
	}
	if n := allocated(func() { WriteValue(io.Discard, reflect.ValueOf(cube)) }); n > 2<<20 {
		t.Errorf("writing 32 MB took %d bytes", n)
	}
	layout, err := Layout(reflect.TypeOf(cube))
	if err != nil {
		t.Fatal(err)
	}
	b, err := Marshal(cube)
	if err != nil {
		t.Fatal(err)
	}
	sealed := Seal("cube", layout, b)
	var back lightcurve.Cube
	if n := allocated(func() { err = ReadSealed(bytes.NewReader(sealed), int64(len(sealed)), reflect.ValueOf(&back).Elem()) }); n > len(sealed)*105/100+1<<20 || err != nil {
		t.Errorf("reading %d bytes took %d (%v)", len(sealed), n, err)
	}
}

func FuzzReadSealed(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, data []byte) {
		for _, v := range []any{new(lightcurve.Cube), new(wide), new([][]string), new(map[string]int8)} {
			p := reflect.ValueOf(v).Elem()
			layout, err := Layout(p.Type())
			if err != nil {
				t.Fatal(err)
			}
			sealed := Seal("t", layout, data)
			err = ReadSealed(iotest.OneByteReader(bytes.NewReader(sealed)), int64(len(sealed)), p)
			if want := Unmarshal(data, reflect.New(p.Type()).Interface()); len(data) > 0 && (err == nil) != (want == nil) {
				t.Errorf("%T: %v in pieces, %v at once", v, err, want)
			}
		}
	})
}
