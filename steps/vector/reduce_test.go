package vector

import (
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"
)

// exactSum is the sum of finite numbers, rounded once.
func exactSum(x []float64) float64 {
	s := new(big.Float).SetPrec(2200)
	for _, a := range x {
		s.Add(s, new(big.Float).SetPrec(2200).SetFloat64(a))
	}
	out, _ := s.Float64()
	return out
}

// TestSumIsAccurate bounds the rounding error of a pairwise sum: at most 63 additions in
// a run and one per halving (Higham 1993), each half a unit of the sum of
// absolute values.
func TestSumIsAccurate(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 1))
	for _, n := range []int{1, 2, 63, 64, 65, 129, 1000, 6000, 100_000} {
		x, y, product := make([]float64, n), make([]float64, n), make([]float64, n)
		absolute := 0.0
		for i := range x {
			x[i], y[i] = rng.NormFloat64()*math.Exp(5*rng.NormFloat64()), rng.NormFloat64()
			product[i] = x[i] * y[i]
			absolute += math.Abs(x[i])
		}
		steps := 64 + math.Log2(float64(n))
		if got, want := Of(x).Sum(), exactSum(x); math.Abs(got-want) > steps*0x1p-53*absolute {
			t.Errorf("sum of %d numbers is off by %g", n, got-want)
		}
		if got, want := Of(x).Dot(Of(y)), Of(product).Sum(); got != want {
			t.Errorf("dot product %g, sum of products %g", got, want)
		}
	}
	// A plain loop over these is off by 1e-9.
	if got := Full(1_000_000, 0.1).Sum(); math.Abs(got-1e5) > 1e-10 {
		t.Errorf("a million times 0.1 is %.12f", got)
	}
}

func TestReductions(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 1))
	for range 300 {
		checkReductions(t, numbers(rng, rng.IntN(200)))
		x := make([]float64, rng.IntN(300))
		for i := range x {
			x[i] = 5 + rng.NormFloat64()
		}
		checkReductions(t, x)
	}
}

// checkReductions holds the reductions against their definitions.
func checkReductions(t *testing.T, x []float64) {
	t.Helper()
	v, n := Of(x), len(x)
	before := slices.Clone(x)
	if n == 0 {
		for k, s := range []float64{v.Mean(), v.StdDev(), v.Median(), v.MAD(), v.Min(), v.Max()} {
			if !math.IsNaN(s) {
				t.Errorf("number %d of an empty column is %g", k, s)
			}
		}
		if v.Sum() != 0 || v.Norm() != 0 || v.Dot(v) != 0 {
			t.Error("sums of an empty column are not 0")
		}
		return
	}
	for _, a := range x {
		if math.IsNaN(a) {
			for k, s := range []float64{v.Sum(), v.Mean(), v.StdDev(), v.Median(), v.MAD(), v.Min(), v.Max(), v.Norm(), v.Dot(v)} {
				if !math.IsNaN(s) {
					t.Errorf("number %d of a column with NaN is %g: %v", k, s, x)
				}
			}
			return
		}
	}
	median := func(x []float64) float64 { // by counting, not by sorting
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, a := range x {
			below, notAbove := 0, 0
			for _, b := range x {
				if b < a {
					below++
				}
				if b <= a {
					notAbove++
				}
			}
			if notAbove >= (len(x)+1)/2 {
				lo = min(lo, a)
			}
			if below <= len(x)/2 {
				hi = max(hi, a)
			}
		}
		if lo == hi {
			return lo
		}
		return lo/2 + hi/2
	}
	center := median(x)
	if got := v.Median(); !same(got, center) && got != center {
		t.Errorf("median %g, want %g", got, center)
	}
	deviation := make([]float64, n)
	lo, hi, squares, largest := x[0], x[0], 0.0, 0.0
	finite := true
	for i, a := range x {
		deviation[i] = math.Abs(a - center)
		finite = finite && a-a == 0
		lo, hi = math.Min(lo, a), math.Max(hi, a)
		largest = math.Max(largest, math.Abs(a))
	}
	if got := v.MAD(); !slices.ContainsFunc(deviation, math.IsNaN) && got != median(deviation) {
		t.Errorf("MAD %g, want %g", got, median(deviation))
	}
	if v.Min() != lo || v.Max() != hi {
		t.Errorf("from %g to %g, want %g to %g", v.Min(), v.Max(), lo, hi)
	}
	if !finite {
		return
	}
	if largest > 1e-100 && largest < 1e100 {
		sum, mean := exactSum(x), exactSum(x)/float64(n)
		spread := 0.0
		for _, a := range x {
			squares += a * a
			spread += (a - mean) * (a - mean)
		}
		near := func(name string, got, want float64) {
			if math.Abs(got-want) > 1e-13*float64(n)*largest {
				t.Errorf("%s of %d numbers up to %g is %g, want %g", name, n, largest, got, want)
			}
		}
		near("sum", v.Sum(), sum)
		near("mean", v.Mean(), mean)
		near("norm", v.Norm(), math.Sqrt(squares))
		if n > 1 {
			near("standard deviation", v.StdDev(), math.Sqrt(spread/float64(n-1)))
		}
	}
	if norm := v.Norm(); !(norm >= largest) {
		t.Errorf("norm %g of numbers up to %g", norm, largest)
	}
	if !sameAll(before, x) {
		t.Error("the operand was changed")
	}
}

func TestNormHasNoOverflow(t *testing.T) {
	if got := Of([]float64{3e200, 4e200}).Norm(); math.Abs(got/5e200-1) > 1e-15 {
		t.Errorf("norm %g", got)
	}
	if got := Of([]float64{3e-200, 4e-200}).Norm(); math.Abs(got/5e-200-1) > 1e-15 {
		t.Errorf("norm %g", got)
	}
	if got := Of([]float64{1, math.Inf(-1)}).Norm(); !math.IsInf(got, 1) {
		t.Errorf("norm %g", got)
	}
}
