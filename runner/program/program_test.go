package program

import (
	"fmt"
	"reflect"
	"strings"
	"testing"

	"rimlight/runner/diag"
	"rimlight/steps/lightcurve"
)

const sampleRecipe = `
// Split cuts a cube into curves. It is
// only an example.
//
// Second paragraph.
func Split(raw lightcurve.Cube, first, last int) (channels []lightcurve.Curve, count int, err error) {
	if last > len(raw.Channels) || first < 0 {
		return nil, 0, fmt.Errorf("channels %d to %d: there are %d", first, last, len(raw.Channels))
	}
	for i := first; i < last; i++ {
		channels = append(channels, lightcurve.Curve{Channel: raw.Channels[i], Time: raw.Time, Flux: raw.Flux[i]})
	}
	count = len(channels)
	return
}

// Level is the mean of a channel.
//
//each:channel in channels
func Level(channel lightcurve.Curve, limb summary) (level float64) {
	const scale = 1 / 2.0
	sum := 0.0
	for _, f := range channel.Flux {
		sum += f
	}
	return sum * scale * float64(limb.N) / float64(len(channel.Flux))
}

type summary struct {
	N    int
	Name string
}

func Summary(count int) (limb summary) { return summary{N: count, Name: "all"} }
`

func accept(t testing.TB, src string) *Program {
	t.Helper()
	p, diags := Check("r.md", []byte(src))
	if len(diags) > 0 {
		t.Fatal(diags)
	}
	return p
}

func TestSteps(t *testing.T) {
	p := accept(t, sampleRecipe)
	if len(p.Steps) != 3 {
		t.Fatalf("%d steps", len(p.Steps))
	}
	pos := func(line, col int) diag.Pos { return diag.Pos{File: "r.md", Line: line, Col: col} }
	split := p.Steps[0]
	split.Code, split.CodeHash = "", ""
	want := Step{
		Name:      "Split",
		Doc:       "Split cuts a cube into curves. It is\nonly an example.\n\nSecond paragraph.",
		Signature: "func Split(raw lightcurve.Cube, first int, last int) (channels []lightcurve.Curve, count int, err error)",
		Pos:       pos(6, 6),
		Params: []Var{
			{"raw", "rimlight/steps/lightcurve.Cube", pos(6, 12)}, {"first", "int", pos(6, 33)}, {"last", "int", pos(6, 40)},
		},
		Results:  []Var{{"channels", "[]rimlight/steps/lightcurve.Curve", pos(6, 51)}, {"count", "int", pos(6, 80)}},
		Err:      true,
		Packages: []string{"rimlight/steps/lightcurve"},
	}
	if !reflect.DeepEqual(split, want) {
		t.Errorf("got  %+v\nwant %+v", split, want)
	}
	level := p.Steps[1]
	if level.Doc != "Level is the mean of a channel." || level.Err || level.Params[1].Type != "summary" {
		t.Errorf("%+v", level)
	}
	if e := level.Each; e == nil || *e != (Each{"channel", "channels", pos(19, 1)}) {
		t.Errorf("each: %+v", level.Each)
	}
	if s := p.Steps[2]; s.Packages != nil || s.Each != nil {
		t.Errorf("%+v", s)
	}
}

func TestCode(t *testing.T) {
	code := accept(t, sampleRecipe).Steps[1].Code
	const want = `program 4
import rimlight/steps/lightcurve

func Level(channel lightcurve.Curve, limb summary) (level float64) {
	const scale untyped float = 1/2
	sum := 0.0
	for _, f := range channel.Flux {
		sum += f
	}
	return sum * scale * float64(limb.N) / float64(len(channel.Flux))
}

type summary struct{N int; Name string}
`
	if code != want {
		t.Errorf("got\n%s\nwant\n%s", code, want)
	}
}

func TestCallStep(t *testing.T) {
	m, err := accept(t, sampleRecipe).Compile()
	if err != nil {
		t.Fatal(err)
	}
	sig, err := m.Signature("Split")
	if err != nil {
		t.Fatal(err)
	}
	if want := reflect.TypeOf(func(lightcurve.Cube, int, int) ([]lightcurve.Curve, int, error) { return nil, 0, nil }); sig != want {
		t.Errorf("signature %v", sig)
	}
	cube := lightcurve.Cube{Time: []float64{1, 2}, Channels: []lightcurve.Channel{{Lo: 1, Hi: 2}, {Index: 1, Lo: 2, Hi: 3}}, Flux: [][]float64{{1, 3}, {5, 7}}}
	call := func(first, last int) ([]reflect.Value, error) {
		return m.Call("Split", []reflect.Value{reflect.ValueOf(cube), reflect.ValueOf(first), reflect.ValueOf(last)})
	}
	for range 3 { // named results start empty every time
		out, err := call(0, 2)
		if err != nil {
			t.Fatal(err)
		}
		curves := out[0].Interface().([]lightcurve.Curve)
		if len(out) != 2 || len(curves) != 2 || out[1].Int() != 2 || curves[1].Flux[1] != 7 || curves[1].Channel.Lo != 2 {
			t.Errorf("%v", out)
		}
	}
	_, err = call(0, 9)
	if e, ok := err.(*StepError); !ok || e.Step != "Split" || e.Text != "channels 0 to 9: there are 2" || e.Pos.Line != 6 {
		t.Errorf("%#v", err)
	}
	level, err := m.Signature("Level")
	if err != nil {
		t.Fatal(err)
	}
	limb := reflect.New(level.In(1)).Elem()
	limb.Field(0).SetInt(4)
	out, err := m.Call("Level", []reflect.Value{reflect.ValueOf(lightcurve.Curve{Flux: []float64{1, 2}}), limb})
	if err != nil || out[0].Float() != 3 {
		t.Errorf("%v %v", out, err)
	}
}

func TestCallErrors(t *testing.T) {
	m, err := accept(t, sampleRecipe).Compile()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		step string
		args []reflect.Value
		want string
	}{
		{"Splitt", nil, "r.md: there is no step Splitt; nearest known name: Split"},
		{"Summary", nil, "step Summary takes 1 arguments, not 0"},
		{"Summary", []reflect.Value{reflect.ValueOf("x")}, "argument 1 of step Summary is a string, not a int"},
		{"Summary", []reflect.Value{{}}, "argument 1 of step Summary is missing"},
	} {
		if _, err := m.Call(c.step, c.args); err == nil || err.Error() != c.want {
			t.Errorf("%v, want %s", err, c.want)
		}
	}
	if _, err := m.Signature("x"); err == nil {
		t.Error("signature of a step that is not there")
	}
}

func TestPanics(t *testing.T) {
	const src = `
func Index(n int) (x float64) {
	values := []float64{1, 2, 3}
	return helper(values, n)
}

func helper(values []float64, n int) float64 {
	// deeper
	return 2 * values[n]
}

func Later(n int) (x float64) {
	values := []float64{1}
	for i := 0; i < n; i++ {
		if i > 3 {
			x += helper(values, 0)
			x += values[i]
		}
	}
	switch {
	case n > 2:
		x++
	}
	return x
}

func Divide(n int) (x int) { return 1 / n }

func Explicit(n int) (x int) {
	panic(fmt.Sprintf("n is %d", n))
}

func Write(n int) (x map[string]int) {
	x["a"] = n
	return x
}

func Sorted(n int) (x []int) {
	x = []int{3, 1, 2}
	sort.SliceStable(x, func(i, j int) bool {
		return x[i+n] < x[j+n]
	})
	return x
}
`
	m, err := accept(t, src).Compile()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		step string
		n    int
		line int
		text string
	}{
		{"Index", 7, 9, "index out of range"}, {"Later", 9, 17, "index out of range"}, {"Divide", 0, 27, "divide by zero"}, {"Explicit", 3, 30, "n is 3"},
		{"Write", 1, 34, "nil map"}, {"Sorted", 9, 41, "index out of range"},
	} {
		_, err := m.Call(c.step, []reflect.Value{reflect.ValueOf(c.n)})
		p, ok := err.(*PanicError)
		if !ok || p.Step != c.step || !strings.Contains(p.Text, c.text) || p.Pos.Line != c.line || p.Pos.File != "r.md" {
			t.Errorf("%s: %v, want a panic in line %d: %s", c.step, err, c.line, c.text)
		}
	}
	// A panic leaves the machine usable.
	out, err := m.Call("Index", []reflect.Value{reflect.ValueOf(2)})
	if err != nil || out[0].Float() != 6 {
		t.Errorf("%v %v", out, err)
	}
}

// TestNames checks that names of packages and of Go serve as names of values:
// wiring makes parameters called limb, orbit or spectrum natural.
func TestNames(t *testing.T) {
	const src = `
func Limb(table []float64) (limb []float64, err error) {
	len := len(table)
	for i, float64 := range table {
		limb = append(limb, float64*2)
		i++
	}
	check := min(len, 2)
	if check != 2 {
		return nil, errors.New("short")
	}
	return limb, nil
}

func min(a, b int) int {
	if a < b {
		return a
	}
	return b
}

func Named(lightcurve lightcurve.Cube) (table table.Table, check check.Check, err error) {
	table.Title = "cube"
	check.Value = float64(len(lightcurve.Time))
	lightcurve.Time = nil
	return
}

func Fit(limb []float64) (fit float64) {
	orbit := func(math float64) (string float64) { string = math + 1; return }
	return orbit(limb[0])
}
`
	m, err := accept(t, src).Compile()
	if err != nil {
		t.Fatal(err)
	}
	out, err := m.Call("Limb", []reflect.Value{reflect.ValueOf([]float64{1, 2, 3})})
	if err != nil || fmt.Sprint(out[0]) != "[2 4 6]" {
		t.Fatalf("%v %v", out, err)
	}
	named, err := m.Call("Named", []reflect.Value{reflect.ValueOf(lightcurve.Cube{Time: []float64{1}})})
	if err != nil || named[0].Field(0).String() != "cube" || named[1].FieldByName("Value").Float() != 1 {
		t.Fatalf("%v %v", named, err)
	}
	out, err = m.Call("Fit", []reflect.Value{out[0]})
	if err != nil || out[0].Float() != 3 {
		t.Fatalf("%v %v", out, err)
	}
}

func TestImports(t *testing.T) {
	for src, want := range map[string]string{
		"\nimport \"math\"\n\nfunc F() (x float64) { return math.Sqrt(2) }\n":                                                 "",
		"\nimport (\n\t\"math/cmplx\"\n\t\"rimlight/steps/lightcurve\"\n)\n\nfunc F() (x float64) { return cmplx.Abs(1i) }\n": "",
		"\nimport m \"math\"\n":                             "r.md:2:8: an import cannot rename a package; imports are implied: use the package under its own name",
		"\nimport \"mth\"\n":                                "nearest known name: math",
		"\npackage recipe\n":                                "r.md:2:1: a recipe has no package clause; leave it out",
		"\nimport \"unsafe\"\n":                             "package unsafe is not available to recipes",
		"\nimport \"C\"\n":                                  "package C is not available to recipes",
		"\n/*line x.go:1*/ func F() (x int) { return 1 }\n": "is not allowed",
	} {
		_, diags := Check("r.md", []byte(src))
		if got := diags.Error(); want == "" && got != "" || !strings.Contains(got, want) {
			t.Errorf("%q: got %s, want %s", src, got, want)
		}
	}
}
