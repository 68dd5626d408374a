package canon

import (
	"math"
	"reflect"
	"strings"
	"testing"
)

type gapChannel struct {
	Index  int
	Lo, Hi float64
}

type gapPoint struct {
	Channel gapChannel
	Depth   float64
	Single  float32
	Limb    []float64
	Pair    [2]float64
	Counts  [3]uint16
	Dof     int
	Mask    []uint8
	Ok      bool
	Labels  map[string]int
	Inner   struct {
		Flag string
		X    float64
	}
	Two  [2]gapChannel
	Flag string
}

// TestGap holds that a gap decodes to the type it stands in for, with no number
// in it that could be taken for a result.
func TestGap(t *testing.T) {
	type curve struct {
		Time    []float64
		Channel gapChannel
		Depth   float64
	}
	from := curve{[]float64{1, 2}, gapChannel{7, 1.5, 1.6}, 0.01}
	data, err := Marshal(from)
	if err != nil {
		t.Fatal(err)
	}
	layout := layoutOf(t, gapPoint{})
	b, err := Gap(layout, "no luck", layoutOf(t, from), data)
	if err != nil {
		t.Fatal(err)
	}
	var got gapPoint
	if err := Unmarshal(b, &got); err != nil {
		t.Fatal(err)
	}
	if got.Channel != from.Channel || got.Flag != "no luck" || got.Inner.Flag != "" {
		t.Errorf("the gap is %+v", got)
	}
	for i, x := range []float64{got.Depth, float64(got.Single), got.Pair[0], got.Pair[1], got.Inner.X, got.Two[1].Hi} {
		if !math.IsNaN(x) {
			t.Errorf("float %d is %v", i, x)
		}
	}
	if len(got.Limb)+len(got.Mask)+len(got.Labels) > 0 || got.Counts != [3]uint16{} || got.Ok || got.Dof != 0 {
		t.Errorf("the gap is %+v", got)
	}
	if again, err := Marshal(got); err != nil || string(again) != string(b) {
		t.Errorf("the bytes are not canonical: %v", err)
	}
	// From what tells nothing, nothing is taken.
	for _, from := range []any{1.5, "text", []float64{1}, struct{ Channel string }{"red"}} {
		data, err := Marshal(from)
		if err != nil {
			t.Fatal(err)
		}
		b, err := Gap(layout, "", layoutOf(t, from), data)
		if err == nil {
			err = Unmarshal(b, &got)
		}
		if err != nil || got.Channel.Index != 0 || !math.IsNaN(got.Channel.Lo) {
			t.Errorf("from %v: %+v, %v", from, got.Channel, err)
		}
	}
}

func TestGapRefuses(t *testing.T) {
	for _, layout := range []string{"", "chan int", "struct{X}", "[99999999999]float64", "[2000000]string", "[1000000][1000000]int", "[", "struct{A [300000]string; B [900000]string}",
		strings.Repeat("struct{A ", 100) + "int" + strings.Repeat("}", 100)} {
		if b, err := Gap(layout, "", "int", []byte{0}); err == nil {
			t.Errorf("%.40q is accepted, and gives %d bytes", layout, len(b))
		}
	}
	if _, err := Gap("float64", "", "struct{Channel int}", []byte{0xa1}); err == nil {
		t.Error("a truncated element is accepted")
	}
}

func TestFlagged(t *testing.T) {
	for layout, want := range map[string]bool{
		"struct{Depth float64; Flag string}": true, "struct{Flag int}": false, "string": false, "[]struct{Flag string}": false,
		"struct{In struct{Flag string}}": false, "struct{}": false, "struct{Flags string}": false,
	} {
		if got := Flagged(layout); got != want {
			t.Errorf("%s: %v", layout, got)
		}
	}
}

func layoutOf(t *testing.T, v any) string {
	t.Helper()
	l, err := Layout(reflect.TypeOf(v))
	if err != nil {
		t.Fatal(err)
	}
	return l
}
