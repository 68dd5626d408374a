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
