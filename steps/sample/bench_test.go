package sample

import (
	"fmt"
	"math"
	"testing"
)

// BenchmarkNUTS gives the cost of a leapfrog step beside that of the target itself,
// here some 40 ns, and of an effective draw.
func BenchmarkNUTS(b *testing.B) {
	const n = 10
	target := newNormalTarget(n)
	start := target.starts(b, 1)
	b.Run("target", func(b *testing.B) {
		g := make([]float64, n)
		for b.Loop() {
			clear(g)
			target.gradient(target.mean, g)
		}
	})
	for _, dense := range []bool{false, true} {
		b.Run(fmt.Sprintf("dense=%v", dense), func(b *testing.B) {
			evaluations, worth, seed := 0, 0.0, uint64(0)
			for b.Loop() {
				seed++
				d, err := NUTS(numbered(n, 0, 0), target.gradient, start, NUTSSettings{Seed: seed, Dense: dense})
				if err != nil {
					b.Fatal(err)
				}
				evaluations += d.Evaluations
				b.StopTimer()
				worth += math.Min(leastSize(b, d), 1000)
				b.StartTimer()
			}
			spent := float64(b.Elapsed().Nanoseconds())
			b.ReportMetric(spent/float64(evaluations), "ns/step")
			b.ReportMetric(spent/worth, "ns/effective-draw")
		})
	}
}

func BenchmarkEnsemble(b *testing.B) {
	target := newNormalTarget(5)
	start := target.starts(b, 32)
	g := make([]float64, 5)
	density := func(x []float64) float64 { return target.gradient(x, g) }
	b.Run("target", func(b *testing.B) {
		for b.Loop() {
			density(target.mean)
		}
	})
	b.Run("walkers", func(b *testing.B) {
		evaluations := 0
		for b.Loop() {
			d, err := Ensemble(numbered(5, 0, 0), density, start, EnsembleSettings{})
			if err != nil {
				b.Fatal(err)
			}
			evaluations += d.Evaluations
		}
		b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(evaluations), "ns/step")
	})
}

func BenchmarkNested(b *testing.B) {
	likelihood := normalLikelihood(5, 0.02)
	evaluations := 0
	for b.Loop() {
		_, e, err := Nested(numbered(5, 0, 1), nil, likelihood, NestedSettings{})
		if err != nil {
			b.Fatal(err)
		}
		evaluations += e.Evaluations
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(evaluations), "ns/evaluation")
}

func BenchmarkImportance(b *testing.B) {
	target := newNormalTarget(3)
	proposal := StudentT{Mean: target.mean, Degrees: 5}
	for k := range 3 {
		row := make([]float64, 3)
		row[k] = target.sd[k] * target.sd[k]
		proposal.Scale = append(proposal.Scale, row)
	}
	for b.Loop() {
		if _, _, err := Importance(numbered(3, 0, 0), target.density, proposal, 10000, 1); err != nil {
			b.Fatal(err)
		}
	}
}
