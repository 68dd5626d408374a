package chain

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func scan(s, format string, into ...any) int {
	n, _ := fmt.Sscanf(s, format, into...)
	return n
}

// autoregressive makes stationary chains of unit variance with the lag-one
// autocorrelation rho.
func autoregressive(seed uint64, rho float64, chains, n int) []float64 {
	rng := rand.New(rand.NewPCG(seed, 1))
	x := make([]float64, 0, chains*n)
	for range chains {
		at := rng.NormFloat64()
		for range n {
			x = append(x, at)
			at = rho*at + math.Sqrt(1-rho*rho)*rng.NormFloat64()
		}
	}
	return x
}

// The effective size of an autoregressive chain is N (1-rho) / (1+rho).
func TestAutoregressive(t *testing.T) {
	const chains, n = 4, 1 << 15
	for _, rho := range []float64{-0.5, 0, 0.5, 0.9, 0.98} {
		x := autoregressive(3, rho, chains, n)
		size, err := MeanESS(x, chains)
		if err != nil {
			t.Fatal(err)
		}
		// Sokal (1997): the relative variance of the estimated time is about
		// 2 (2 W + 1) / N, for a sum over W lags, which is a few times.
		time := (1 + rho) / (1 - rho)
		tolerance := 4 * math.Sqrt(2*(2*6*max(time, 1)+1)/(chains*n))
		near(t, fmt.Sprintf("rho %g", rho), size, chains*n/time, tolerance)
		tau, err := AutocorrelationTime(x, chains)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "time", tau, time, 2*tolerance)
		if rhat, err := RHat(x, chains); err != nil || rhat > 1.01 {
			t.Errorf("rho %g: R-hat %g, %v", rho, rhat, err)
		}
	}
}

// Errors that are claimed are errors that are made.
func TestErrorsCover(t *testing.T) {
	const trials, chains, n, rho = 400, 4, 500, 0.7
	var mean, median, upper, sd float64 // mean squares of deviation over claimed error
	for i := range trials {
		x := autoregressive(uint64(100+i), rho, chains, n)
		s, err := Summaries(Draws{Names: []string{"x"}, Chains: chains, Length: n, X: x})
		if err != nil {
			t.Fatal(err)
		}
		q, err := QuantileError(x, chains, 0.95)
		if err != nil {
			t.Fatal(err)
		}
		sorted := slices.Clone(x)
		slices.Sort(sorted)
		square := func(x float64) float64 { return x * x / trials }
		mean += square(s[0].Mean / s[0].MeanError)
		median += square(s[0].Median / s[0].MedianError)
		sd += square((s[0].SD - 1) / s[0].SDError)
		upper += square((quantile(sorted, 0.95) - 1.6448536269514722) / q)
	}
	// The mean of 400 squares of normal numbers scatters by 0.07; the rest allows
	// for what is uncertain about the errors.
	for name, v := range map[string]float64{"mean": mean, "median": median, "upper": upper, "sd": sd} {
		if v < 0.75 || v > 1.3 {
			t.Errorf("%s: mean square error in units of the claimed one is %.3f", name, v)
		}
	}
}

func TestRHatSees(t *testing.T) {
	const chains, n = 4, 1000
	still := autoregressive(1, 0.3, chains, n)
	shifted, wide, drift := slices.Clone(still), slices.Clone(still), slices.Clone(still)
	heavy := slices.Clone(still)
	for i := range n {
		shifted[i] += 0.5
		wide[i] *= 2
		for c := range chains {
			drift[c*n+i] += float64(i) / n
			// Cauchy numbers, one chain of another location.
			z := heavy[c*n+i]
			p := 0.5 * math.Erfc(-z/math.Sqrt2)
			heavy[c*n+i] = math.Tan(math.Pi * (p - 0.5))
			if c == 0 {
				heavy[c*n+i] += 1
			}
		}
	}
	for name, x := range map[string][]float64{"shifted": shifted, "wide": wide, "drift": drift, "heavy": heavy} {
		if rhat, err := RHat(x, chains); err != nil || rhat < 1.02 {
			t.Errorf("%s: R-hat %g, %v", name, rhat, err)
		}
	}
	if rhat, err := RHat(still, chains); err != nil || rhat > 1.005 {
		t.Errorf("still: R-hat %g, %v", rhat, err)
	}
	// It depends on ranks alone, that of the folded draws apart.
	monotone := slices.Clone(still)
	for i, v := range monotone {
		monotone[i] = math.Exp(3 * v)
	}
	a, _ := BulkESS(still, chains)
	b, _ := BulkESS(monotone, chains)
	if a != b {
		t.Errorf("bulk effective sample size of exp(3 x) %g, of x %g", b, a)
	}
}

// Of many short chains, groups are compared.
func TestNestedRHat(t *testing.T) {
	const chains, n = 32, 40
	x := autoregressive(5, 0.8, chains, n)
	alone, err := RHat(x, chains)
	if err != nil {
		t.Fatal(err)
	}
	grouped, err := NestedRHat(x, chains, 8)
	if err != nil {
		t.Fatal(err)
	}
	for i := range 8 * n {
		x[i]++
	}
	apart, err := NestedRHat(x, chains, 8)
	if err != nil {
		t.Fatal(err)
	}
	if alone < 1.05 || grouped > 1.03 || apart < 1.1 {
		t.Errorf("R-hat of 32 chains %.3f, of 4 groups %.3f, with one apart %.3f", alone, grouped, apart)
	}
	if _, err := NestedRHat(x, chains, 5); err == nil {
		t.Error("groups of 5 of 32 were accepted")
	}
}

func TestRefused(t *testing.T) {
	good := autoregressive(1, 0, 1, 20)
	bad := slices.Clone(good)
	bad[3] = math.NaN()
	for name, err := range map[string]error{
		"NaN":      second(RHat(bad, 1)),
		"constant": second(RHat(make([]float64, 20), 1)),
		"short":    second(BulkESS(good, 4)),
		"uneven":   second(TailESS(good, 3)),
		"none":     second(MeanESS(good, 0)),
		"outside":  second(QuantileESS(good, 1, 1)),
		"empty":    second(MeanError(nil, 1)),
	} {
		if err == nil {
			t.Errorf("%s was accepted", name)
		}
	}
}

func second(_ float64, err error) error { return err }

func BenchmarkSummary(b *testing.B) {
	d := Draws{Names: []string{"x"}, Chains: 4, Length: 1000, X: autoregressive(1, 0.5, 4, 1000)}
	for b.Loop() {
		if _, err := Summaries(d); err != nil {
			b.Fatal(err)
		}
	}
}
