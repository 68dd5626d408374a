package worker

import (
	"fmt"
	"testing"
)

const masses = `
func Take(list []float64) (n float64) {
	n = float64(len(list))
	return
}

func Give(n float64) (list []float64) {
	list = make([]float64, int(n))
	return
}
`

// BenchmarkArgument is what it costs to send an argument of mass data and to
// decode it.
func BenchmarkArgument(b *testing.B) {
	for _, mb := range []int{1, 64} {
		b.Run(fmt.Sprintf("%dMB", mb), func(b *testing.B) {
			w := begin(b, Options{})
			if err := w.Load(code(masses)); err != nil {
				b.Fatal(err)
			}
			args := []Arg{Bytes(sealed(b, "[]float64", make([]float64, mb*1e6/8)))}
			b.SetBytes(int64(mb) * 1e6)
			for b.Loop() {
				if _, err := w.Call("Take", args, discard{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkResult is what it costs to encode a result of mass data and to take
// it in.
func BenchmarkResult(b *testing.B) {
	w := begin(b, Options{})
	if err := w.Load(code(masses)); err != nil {
		b.Fatal(err)
	}
	args := []Arg{Bytes(sealed(b, "float64", 8e6))}
	b.SetBytes(64e6)
	for b.Loop() {
		if _, err := w.Call("Give", args, discard{}); err != nil {
			b.Fatal(err)
		}
	}
}
