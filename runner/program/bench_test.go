package program

import (
	"reflect"
	"testing"
)

func BenchmarkCheck(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, diags := Check("r.md", []byte(sampleRecipe)); len(diags) > 0 {
			b.Fatal(diags)
		}
	}
}

func BenchmarkCheckLong(b *testing.B) {
	src := []byte(sample{name: "random", shared: randomPrelude, body: randomProgram(1, 1)}.source())
	for b.Loop() {
		if _, diags := Check("r.md", src); len(diags) > 0 {
			b.Fatal(diags)
		}
	}
}

func BenchmarkCompile(b *testing.B) {
	p := accept(b, sampleRecipe)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := p.Compile(); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkCall(b *testing.B) {
	m, err := accept(b, "\nfunc Sum(xs []float64) (sum float64) {\n\tfor _, x := range xs {\n\t\tsum += x * x\n\t}\n\treturn sum\n}\n").Compile()
	if err != nil {
		b.Fatal(err)
	}
	args := []reflect.Value{reflect.ValueOf(make([]float64, 1000))}
	for b.Loop() {
		if _, err := m.Call("Sum", args); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkArguments calls functions of a recipe a thousand times. Integers and
// structs of them are handed on as they are, floating-point numbers and structs
// of them with their signs.
func BenchmarkArguments(b *testing.B) {
	const recipe = `
type ints struct{ X, Y int }
type floats struct{ X, Y float64 }

func ofInts(x, y int) int          { return x + y }
func ofFloats(x, y float64) float64 { return x + y }
func ofIntStruct(p ints) int        { return p.X + p.Y }
func ofFloatStruct(p floats) float64 { return p.X + p.Y }

func Ints(n int) (sum int) {
	for i := 0; i < n; i++ {
		sum = ofInts(sum, 1)
	}
	return sum
}

func Floats(n int) (sum float64) {
	for i := 0; i < n; i++ {
		sum = ofFloats(sum, 1)
	}
	return sum
}

func IntStructs(n int) (sum int) {
	p := ints{1, 2}
	for i := 0; i < n; i++ {
		sum += ofIntStruct(p)
	}
	return sum
}

func FloatStructs(n int) (sum float64) {
	p := floats{1, 2}
	for i := 0; i < n; i++ {
		sum += ofFloatStruct(p)
	}
	return sum
}
`
	m, err := accept(b, recipe).Compile()
	if err != nil {
		b.Fatal(err)
	}
	args := []reflect.Value{reflect.ValueOf(1000)}
	for _, step := range []string{"Ints", "Floats", "IntStructs", "FloatStructs"} {
		b.Run(step, func(b *testing.B) {
			for b.Loop() {
				if _, err := m.Call(step, args); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
