package vector

import (
	"math"
	"slices"
	"strings"
	"testing"
)

// same reports whether two numbers have the same bits, all NaN being one.
func same(a, b float64) bool {
	return math.Float64bits(a) == math.Float64bits(b) || math.IsNaN(a) && math.IsNaN(b)
}

func sameAll(a, b []float64) bool { return slices.EqualFunc(a, b, same) }

// values demands a column without a fault.
func values(t testing.TB, v V) []float64 {
	t.Helper()
	x, err := v.Values()
	if err != nil {
		t.Fatal(err)
	}
	return x
}

func TestMake(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		name string
		got  V
		want []float64
	}{
		{"zero value", V{}, nil},
		{"Of", Of([]float64{1, 2}), []float64{1, 2}},
		{"Full", Full(3, 0.5), []float64{0.5, 0.5, 0.5}},
		{"empty Full", Full(0, 1), nil},
		{"Linspace", Linspace(-1, 1, 5), []float64{-1, -0.5, 0, 0.5, 1}},
		{"falling Linspace", Linspace(2, 0, 3), []float64{2, 1, 0}},
		{"one number", Linspace(3, 9, 1), []float64{3}},
		{"no number", Linspace(3, 9, 0), nil},
		{"Concat", Concat(Of([]float64{1}), V{}, Of([]float64{inf, 3})), []float64{1, inf, 3}},
		{"nothing joined", Concat(), nil},
		{"Repeat", Of([]float64{1, 2}).Repeat(2), []float64{1, 2, 1, 2}},
		{"Repeat of nothing", V{}.Repeat(math.MaxInt), nil},
		{"no Repeat", Of([]float64{1}).Repeat(0), nil},
	} {
		if got := values(t, c.got); !sameAll(got, c.want) {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
	if x := values(t, Linspace(0.1, 0.7, 1001)); x[0] != 0.1 || x[1000] != 0.7 || !slices.IsSorted(x) {
		t.Error("ends or order of Linspace")
	}
}

// TestFaults provokes every fault and demands that it comes out of what is
// computed from it.
func TestFaults(t *testing.T) {
	two, three := Of([]float64{1, 2}), Of([]float64{1, 2, 3})
	on := Mask{On: []bool{true}}
	for _, c := range []struct {
		got  V
		want string
	}{
		{two.Add(three), "Add of columns of 2 and 3 elements; expected the same length"},
		{two.Sub(three), "Sub of columns of 2 and 3"},
		{two.Mul(three), "Mul of columns of 2 and 3"},
		{two.Div(three), "Div of columns of 2 and 3"},
		{two.AddScaled(2, three), "AddScaled of columns of 2 and 3"},
		{Combine([]float64{1, 2}, two, three), "Combine of columns of 2 and 3"},
		{Combine([]float64{1}, two, two), "Combine of 2 columns with 1 coefficients"},
		{Combine(nil), "Combine of 0 columns with 0 coefficients; expected one for each of at least one"},
		{two.Polynomial(make([]float64, 101)), "Polynomial of 101 coefficients; expected at most 100"},
		{two.Clamp(2, 1), "Clamp to [2, 1]; expected the lower limit first"},
		{two.Clamp(math.NaN(), 1), "Clamp to [NaN, 1]"},
		{Full(-1, 0), "Full of -1 elements; expected a number from 0 up"},
		{Full(math.MaxInt, 0), "Full of more than 10000000 elements"},
		{Linspace(0, 1, MaxLength+1), "Linspace of more than"},
		{two.Repeat(-1), "Repeat of -1 times"},
		{two.Repeat(math.MaxInt), "Repeat of 2 elements 9223372036854775807 times"},
		{two.Gather([]int{0, 2}), "Gather of element 2; expected indices from 0 to below 2"},
		{two.Gather([]int{-1}), "Gather of element -1"},
		{two.Interpolate(two, three), "Interpolate of columns of 2 and 3"},
		{two.Interpolate(V{}, V{}), "Interpolate between no points"},
		{two.Interpolate(Of([]float64{1, 1}), two), "Interpolate between points at x, whose element 1 is 1; expected finite and increasing numbers"},
		{two.Interpolate(Of([]float64{math.NaN(), 1}), two), "whose element 0 is NaN"},
		{two.Interpolate(Of([]float64{1, math.Inf(1)}), two), "whose element 1 is +Inf"},
		{two.Keep(on), "Keep of a column of 2 elements with a mask of 1"},
		{on.Select(two, two), "Select of a column of 2 elements with a mask of 1"},
		{on.Select(Of([]float64{1}), two), "Select of a column of 2 elements with a mask of 1"},
		{on.And(two.Less(1)).Numbers(), "And of masks of 1 and 2 elements"},
		{on.Or(two.Less(1)).Numbers(), "Or of masks of 1 and 2 elements"},
	} {
		x, err := c.got.Values()
		if x != nil || err == nil || !strings.HasPrefix(err.Error(), "vector: ") || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v, error %v; want %q", x, err, c.want)
			continue
		}
		carry(t, c.got)
	}
	huge := Full(MaxLength/2+1, 0)
	if got := Concat(huge, huge); !strings.Contains(got.Fault, "Concat of more than") {
		t.Errorf("fault %q", got.Fault)
	}
}

// carry demands that everything computed from a faulty column has its fault.
func carry(t *testing.T, bad V) {
	t.Helper()
	good, mask := V{}, bad.Less(0)
	for k, v := range []V{
		bad.Add(good), good.Add(bad), bad.Sub(good), bad.Mul(good), bad.Div(good), bad.AddScaled(1, good), good.AddScaled(1, bad),
		bad.Scale(1), bad.Shift(1), bad.Exp(), bad.Log(), bad.Sqrt(), bad.Pow(2), bad.Sin(), bad.Cos(), bad.Abs(), bad.Floor(), bad.Neg(),
		bad.Reciprocal(), bad.Clamp(0, 1), bad.Polynomial(nil), Combine([]float64{1}, bad), Combine([]float64{1, 1}, good, bad),
		bad.CumulativeSum(), bad.Diff(), bad.Gather(nil), bad.Repeat(1), Concat(good, bad),
		bad.Interpolate(good, good), good.Interpolate(bad, good), good.Interpolate(good, bad),
		bad.Keep(Mask{}), good.Keep(mask), mask.Select(good, good), Mask{}.Select(bad, good), Mask{}.Select(good, bad),
		mask.Numbers(), mask.Not().Numbers(), mask.And(Mask{}).Numbers(), Mask{}.Or(mask).Numbers(),
	} {
		if v.X != nil || v.Fault != bad.Fault {
			t.Errorf("result %d: %v, fault %q; want %q", k, v.X, v.Fault, bad.Fault)
		}
	}
	for k, s := range []float64{
		bad.Sum(), bad.Mean(), bad.StdDev(), bad.Median(), bad.MAD(), bad.Min(), bad.Max(), bad.Norm(), bad.Dot(good), good.Dot(bad),
	} {
		if !math.IsNaN(s) {
			t.Errorf("number %d is %g, not NaN", k, s)
		}
	}
	if mask.Count() != 0 {
		t.Error("count of a faulty mask")
	}
}
