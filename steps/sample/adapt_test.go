package sample

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestWindows(t *testing.T) {
	for n := 1; n < 3000; n++ {
		skip, lengths := windows(n)
		sum := skip
		for _, l := range lengths {
			if l < 1 {
				t.Fatalf("a warm-up of %d has windows %v", n, lengths)
			}
			sum += l
		}
		if sum > n || sum < n*8/10 {
			t.Fatalf("a warm-up of %d has %d + %v", n, skip, lengths)
		}
	}
	skip, lengths := windows(1000)
	if skip != 75 || len(lengths) != 5 || lengths[0] != 25 || lengths[4] != 500 {
		t.Errorf("a warm-up of 1000 has %d + %v", skip, lengths)
	}
}

// Dual averaging finds the root of a noisy decreasing function.
func TestStepSize(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	size := newStepSize(0.8, 1e-3)
	step := 1e-3
	for range 2000 {
		step = size.update(min(max(math.Exp(-step)+0.1*rng.NormFloat64(), 0), 1))
	}
	if want := -math.Log(0.8); math.Abs(size.final()/want-1) > 0.1 {
		t.Errorf("step %.3f, want %.3f", size.final(), want)
	}
}

// After adaptation, draws have unit covariance in the metric's coordinates.
func TestMetric(t *testing.T) {
	const n, count = 3, 4000
	rng := rand.New(rand.NewPCG(1, 2))
	var draws []float64
	for range count {
		a, b, c := rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
		draws = append(draws, 1e6+a, 1e-3*(a+0.1*b), 5*c)
	}
	for _, dense := range []bool{false, true} {
		m := newMetric(n, dense)
		for range 4 { // each window knows what the one before has learnt
			m.adapt(draws)
		}
		y := append([]float64(nil), draws...)
		var square [n * n]float64
		for i := range count {
			row := y[i*n : (i+1)*n]
			row[0] -= 1e6
			m.solve(row)
			for k := range n {
				for l := range n {
					square[k*n+l] += row[k] * row[l] / count
				}
			}
		}
		for k := range n {
			for l := range n {
				want := 0.0
				if k == l {
					want = 1
				}
				if (k == l || dense) && math.Abs(square[k*n+l]-want) > 0.01 {
					t.Errorf("dense %v: covariance %d, %d is %.4f", dense, k, l, square[k*n+l])
				}
			}
		}
	}
	// Gradients of a normal distribution give its scales from a few draws anywhere.
	m := newMetric(2, true)
	m.rescale([]float64{100, 0, 101, 3, 103, 5}, []float64{-1e4, 0, -1.01e4, -3e-8, -1.03e4, -5e-8}) // -100 u, -1e-8 u
	if math.Abs(m.factor[0]-0.1) > 1e-6 || math.Abs(m.factor[3]-1e4) > 1e-2 {
		t.Errorf("scales %g and %g, want 0.1 and 10000", m.factor[0], m.factor[3])
	}
}
