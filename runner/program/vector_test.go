package program

import (
	"math"
	"testing"
	"time"

	"rimlight/steps/vector"
)

// Two models over whole columns as a recipe writes them. Settling takes an
// exponential of every element; leak is three multiplications and additions, next
// to which the cost of going from column to column shows most.
const columnModels = `
func Settling(time, x, p []float64) (flux []float64, err error) {
	t := vector.Of(time).Shift(-time[0])
	ramp := t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
	return ramp.Mul(t.Scale(p[2]).Shift(1)).AddScaled(p[3], vector.Of(x).Shift(-12)).Values()
}

func Leak(time, x, p []float64) (flux []float64, err error) {
	t := vector.Of(time).Shift(-time[0])
	return t.Scale(p[2]).Shift(1).AddScaled(p[3], vector.Of(x).Shift(-12)).Values()
}
`

// The same, compiled.
func compiledSettling(time, x, p []float64) ([]float64, error) {
	t := vector.Of(time).Shift(-time[0])
	ramp := t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
	return ramp.Mul(t.Scale(p[2]).Shift(1)).AddScaled(p[3], vector.Of(x).Shift(-12)).Values()
}

func compiledLeak(time, x, p []float64) ([]float64, error) {
	t := vector.Of(time).Shift(-time[0])
	return t.Scale(p[2]).Shift(1).AddScaled(p[3], vector.Of(x).Shift(-12)).Values()
}

// The same as one compiled loop without package vector.
func loopSettling(time, x, p []float64) ([]float64, error) {
	flux := make([]float64, len(time))
	for i, t := range time {
		t -= time[0]
		flux[i] = (p[0]*math.Exp(-t/p[1])+1)*(p[2]*t+1) + p[3]*(x[i]-12)
	}
	return flux, nil
}

func loopLeak(time, x, p []float64) ([]float64, error) {
	flux := make([]float64, len(time))
	for i, t := range time {
		flux[i] = p[2]*(t-time[0]) + 1 + p[3]*(x[i]-12)
	}
	return flux, nil
}

type columnModel = func(time, x, p []float64) ([]float64, error)

func columnArguments() (time, x, p []float64) {
	for i := range 6000 {
		time = append(time, 2460100.2+4e-5*float64(i))
		x = append(x, 12+0.01*math.Sin(float64(i)))
	}
	return time, x, []float64{2e-3, 0.015, -1e-3, 0.01}
}

func interpretedModel(t testing.TB, step string) columnModel {
	t.Helper()
	m, err := accept(t, columnModels).Compile()
	if err != nil {
		t.Fatal(err)
	}
	return m.funcs[step].Interface().(columnModel)
}

// TestColumnModel demands the same bits of the interpreted and the compiled
// model, and about the same of the loop.
func TestColumnModel(t *testing.T) {
	when, x, p := columnArguments()
	for _, c := range []struct {
		step           string
		compiled, loop columnModel
	}{{"Settling", compiledSettling, loopSettling}, {"Leak", compiledLeak, loopLeak}} {
		got, err := interpretedModel(t, c.step)(when, x, p)
		if err != nil {
			t.Fatal(err)
		}
		compiled, _ := c.compiled(when, x, p)
		loop, _ := c.loop(when, x, p)
		for i := range got {
			if got[i] != compiled[i] || math.Abs(got[i]-loop[i]) > 1e-15 {
				t.Fatalf("%s: element %d is %v, compiled %v, in a loop %v", c.step, i, got[i], compiled[i], loop[i])
			}
		}
	}
}

// BenchmarkColumnModel states what models of 6000 integrations cost
// interpreted: by themselves, and in units of the same code compiled and of one
// compiled loop. The three take turns, and the ratios are of the quickest turns,
// which other work on the machine disturbs least.
func BenchmarkColumnModel(b *testing.B) {
	when, x, p := columnArguments()
	for _, c := range []struct {
		step           string
		compiled, loop columnModel
	}{{"Settling", compiledSettling, loopSettling}, {"Leak", compiledLeak, loopLeak}} {
		models := []columnModel{interpretedModel(b, c.step), c.compiled, c.loop}
		b.Run(c.step, func(b *testing.B) {
			least := []time.Duration{time.Hour, time.Hour, time.Hour}
			for b.Loop() {
				for k, model := range models {
					start := time.Now()
					if _, err := model(when, x, p); err != nil {
						b.Fatal(err)
					}
					least[k] = min(least[k], time.Since(start))
				}
			}
			b.ReportMetric(float64(least[0].Nanoseconds()), "ns/interpreted")
			b.ReportMetric(float64(least[0])/float64(least[1]), "interpreted/compiled")
			b.ReportMetric(float64(least[0])/float64(least[2]), "interpreted/loop")
		})
	}
}
