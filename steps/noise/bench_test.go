package noise

import (
	"math/rand/v2"
	"syscall"
	"testing"
	"time"
)

// processorTime is what this process has used.
func processorTime() time.Duration {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}

// benchModels are models with values.
var benchModels = []struct {
	name   string
	model  Model
	values []float64
}{
	{"exponential", White(true, true).Plus(NewTerm("a", Exponential)), []float64{1, 1e-4, 3e-4, 0.02}},
	{"matern32", White(true, true).Plus(NewTerm("a", Matern32)), []float64{1, 1e-4, 3e-4, 0.02}},
	{"oscillator", White(true, true).Plus(NewTerm("a", Oscillator)), []float64{1, 1e-4, 3e-4, 0.02, 3}},
	{"sum of two", White(true, true).Plus(NewTerm("a", Matern32), NewTerm("b", Oscillator)), []float64{1, 1e-4, 3e-4, 0.02, 3e-4, 0.1, 3}},
	{"sum of three", White(true, true).Plus(NewTerm("a", Matern32), NewTerm("b", Oscillator), NewTerm("c", Exponential)), []float64{1, 1e-4, 3e-4, 0.02, 3e-4, 0.1, 3, 1e-4, 0.005}},
}

func newRand() *rand.Rand { return rand.New(rand.NewPCG(3, 4)) }

// irregular makes n unequal times with a gap, unequal errors and white residuals.
func irregular(n int) (Data, []float64) {
	rng := newRand()
	var d Data
	var r []float64
	t := 2460512.0
	for i := range n {
		t += 2e-5 * (0.5 + rng.Float64())
		if i == n/2 {
			t += 0.01
		}
		d.Time, d.Err = append(d.Time, t), append(d.Err, 3e-4*(0.5+rng.Float64()))
		r = append(r, 4e-4*rng.NormFloat64())
	}
	return d, r
}

// BenchmarkGradient is a likelihood of 20,000 samples, unequally spaced, with its
// whole gradient. cpu-ms/op is processor time, collector and all, which counts on a
// machine that does other things, too.
func BenchmarkGradient(b *testing.B) {
	data, residual := irregular(20000)
	for _, m := range benchModels {
		b.Run(m.name, func(b *testing.B) {
			p := newProcess(b, m.model, data, false)
			var g Gradient
			before := processorTime()
			for b.Loop() {
				if err := p.GradientInto(&g, m.values, residual); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(processorTime()-before)/1e6/float64(b.N), "cpu-ms/op")
		})
	}
}

func BenchmarkLogLikelihood(b *testing.B) {
	data, residual := irregular(20000)
	for _, m := range benchModels {
		b.Run(m.name, func(b *testing.B) {
			p := newProcess(b, m.model, data, false)
			before := processorTime()
			for b.Loop() {
				if _, err := p.LogLikelihood(m.values, residual); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(processorTime()-before)/1e6/float64(b.N), "cpu-ms/op")
		})
	}
}

// BenchmarkWhiten is one vector of 20,000 numbers, with and without what the first
// one costs.
func BenchmarkWhiten(b *testing.B) {
	data, residual := irregular(20000)
	p := newProcess(b, benchModels[2].model, data, false)
	vectors := make([][]float64, 20)
	for k := range vectors {
		vectors[k] = residual
	}
	c, err := p.At(benchModels[2].values)
	if err != nil {
		b.Fatal(err)
	}
	b.Run("factorisation", func(b *testing.B) {
		for b.Loop() {
			if _, err := p.At(benchModels[2].values); err != nil {
				b.Fatal(err)
			}
		}
	})
	b.Run("20 vectors", func(b *testing.B) {
		for b.Loop() {
			if _, err := c.Whiten(vectors); err != nil {
				b.Fatal(err)
			}
		}
	})
}

// BenchmarkDense is a likelihood of 2000 samples of three inputs, with gradient.
func BenchmarkDense(b *testing.B) {
	data, residual := irregular(2000)
	m := White(true, true).Plus(NewTerm("a", Matern32), NewTerm("b", SquaredExponential).Times(Matern52, "X", "Y"))
	rng := rand.New(rand.NewPCG(5, 6))
	for _, name := range []string{"X", "Y"} {
		s := make([]float64, len(residual))
		for i := range s {
			s[i] = rng.NormFloat64()
		}
		data.Inputs = append(data.Inputs, series(name, s))
	}
	p := newProcess(b, m, data, false)
	for b.Loop() {
		if _, err := p.Gradient([]float64{1, 1e-4, 3e-4, 0.02, 3e-4, 0.1, 1, 2}, residual); err != nil {
			b.Fatal(err)
		}
	}
}
