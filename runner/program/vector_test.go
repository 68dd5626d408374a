package program

import (
	"math"
	"testing"
	"time"

	"rimlight/steps/vector"
)

// A model over whole columns as a recipe writes it: settling, a slope, and a
// leak of the pointing.
const columnModel = `
func Model(time, x, p []float64) (flux []float64, err error) {
	t := vector.Of(time).Shift(-time[0])
	ramp := t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
	return ramp.Mul(t.Scale(p[2]).Shift(1)).AddScaled(p[3], vector.Of(x).Shift(-12)).Values()
}
`

// The same, compiled.
func compiledModel(time, x, p []float64) ([]float64, error) {
	t := vector.Of(time).Shift(-time[0])
	ramp := t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1)
	return ramp.Mul(t.Scale(p[2]).Shift(1)).AddScaled(p[3], vector.Of(x).Shift(-12)).Values()
}

// The same as one compiled loop without package vector.
func loopModel(time, x, p []float64) ([]float64, error) {
	flux := make([]float64, len(time))
	for i, t := range time {
		t -= time[0]
		flux[i] = (p[0]*math.Exp(-t/p[1])+1)*(p[2]*t+1) + p[3]*(x[i]-12)
	}
	return flux, nil
}

func columnArguments() (time, x, p []float64) {
	for i := range 6000 {
		time = append(time, 2460100.2+4e-5*float64(i))
		x = append(x, 12+0.01*math.Sin(float64(i)))
	}
	return time, x, []float64{2e-3, 0.015, -1e-3, 0.01}
}

// BenchmarkColumnModel states what a model of 6000 integrations costs
// interpreted: itself, and in units of the same code compiled and of one compiled
// loop. The three take turns, and the ratios are of the quickest turns, which
// other work on the machine disturbs least.
func BenchmarkColumnModel(b *testing.B) {
	m, err := accept(b, columnModel).Compile()
	if err != nil {
		b.Fatal(err)
	}
	interpreted := m.funcs["Model"].Interface().(func(time, x, p []float64) ([]float64, error))
	models := []func(time, x, p []float64) ([]float64, error){interpreted, compiledModel, loopModel}
	least := []time.Duration{time.Hour, time.Hour, time.Hour}
	when, x, p := columnArguments()
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
}
