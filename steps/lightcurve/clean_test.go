package lightcurve

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// noisy returns a cube of one channel of n samples of shape(i) with normal noise
// of the given standard deviation.
func noisy(n int, sigma float64, seed uint64, shape func(i int) float64) Cube {
	rng := rand.New(rand.NewPCG(seed, 1))
	c := Cube{Channels: []Channel{{0, 1, 1.1}}, Flux: make([][]float64, 1), Err: make([][]float64, 1), Mask: make([][]Flag, 1)}
	for i := range n {
		c.Time = append(c.Time, float64(i)*1e-4)
		c.Flux[0] = append(c.Flux[0], shape(i)+sigma*rng.NormFloat64())
		c.Err[0] = append(c.Err[0], sigma)
		c.Mask[0] = append(c.Mask[0], 0)
	}
	return c
}

// join puts the channels of cubes of equal times into one.
func join(cubes ...Cube) Cube {
	out := Cube{Time: cubes[0].Time}
	for j, c := range cubes {
		out.Channels = append(out.Channels, Channel{j, 1 + float64(j), 2 + float64(j)})
		out.Flux = append(out.Flux, c.Flux[0])
		out.Err = append(out.Err, c.Err[0])
		out.Mask = append(out.Mask, c.Mask[0])
	}
	return out
}

// trapezoid is a transit of 2% depth with sharp corners and steep sides: ten
// samples for the whole of ingress.
func trapezoid(i int) float64 {
	from := math.Abs(float64(i) - 1000)
	return 1 - 0.02*math.Max(0, math.Min(1, (400-from)/10))
}

func flagged(mask []Flag) (at []int) {
	for i, f := range mask {
		if f != 0 {
			at = append(at, i)
		}
	}
	return at
}

func TestMaskOutliersFindsSpikes(t *testing.T) {
	cube := noisy(2000, 3e-4, 7, trapezoid)
	spikes := []int{0, 3, 405, 595, 600, 601, 1000, 1402, 1999}
	for _, i := range spikes {
		cube.Flux[0][i] += 0.02
	}
	before := cube.Clone()
	clean, err := MaskOutliers(cube, RunningMedian{Window: 21, Sigma: 5})
	if err != nil {
		t.Fatal(err)
	}
	if got := flagged(clean.Mask[0]); !slices.Equal(got, spikes) {
		t.Errorf("flagged %v, want %v", got, spikes)
	}
	if !slices.Equal(clean.Flux[0], before.Flux[0]) {
		t.Error("fluxes changed")
	}
	if len(flagged(cube.Mask[0])) != 0 || !slices.Equal(cube.Flux[0], before.Flux[0]) {
		t.Error("the input was modified")
	}
}

func TestMaskOutliersSparesSteepSides(t *testing.T) {
	// Nearly noise-free: any corner bias of the running median is many sigma.
	cube := noisy(2000, 1e-6, 8, trapezoid)
	clean, err := MaskOutliers(cube, RunningMedian{Window: 21, Sigma: 6})
	if err != nil {
		t.Fatal(err)
	}
	if got := flagged(clean.Mask[0]); len(got) != 0 {
		t.Errorf("flagged %v of a clean transit", got)
	}
	// A steep start-up transient.
	cube = noisy(2000, 2e-5, 9, func(i int) float64 { return 1 + 0.003*math.Exp(-float64(i)/60) })
	clean, err = MaskOutliers(cube, RunningMedian{Window: 21, Sigma: 6})
	if err != nil {
		t.Fatal(err)
	}
	if got := flagged(clean.Mask[0]); len(got) != 0 {
		t.Errorf("flagged %v of a settling start", got)
	}
}

func TestMaskOutliersFalseAlarmRate(t *testing.T) {
	// Beyond 4 sigma lie 6.3e-5 of normal samples; the noise of the running median
	// itself about doubles that.
	cube := noisy(100_000, 1e-3, 10, func(int) float64 { return 1 })
	clean, err := MaskOutliers(cube, RunningMedian{Window: 21, Sigma: 4})
	if err != nil {
		t.Fatal(err)
	}
	if got := len(flagged(clean.Mask[0])); got > 25 {
		t.Errorf("%d of 100000 normal samples flagged at 4 sigma, want about 13", got)
	}
}

func TestMaskOutliersWithoutErrors(t *testing.T) {
	cube := noisy(500, 1e-3, 11, func(int) float64 { return 1 })
	cube.Flux[0][100] = 2
	for i := range cube.Err[0] {
		cube.Err[0][i] = math.NaN()
		cube.Mask[0][i] = Missing
	}
	clean, err := MaskOutliers(cube, RunningMedian{Window: 21, Sigma: 5})
	if err != nil {
		t.Fatal(err)
	}
	clean, factors, err := RescaleErrors(clean)
	if err != nil {
		t.Fatal(err)
	}
	if !math.IsNaN(factors[0]) {
		t.Errorf("factor %g, want NaN", factors[0])
	}
	if got := flagged(clean.Mask[0]); !slices.Equal(got, []int{100}) {
		t.Errorf("flagged %v, want [100]", got)
	}
	if e := clean.Err[0][0]; math.Abs(e/1e-3-1) > 0.15 {
		t.Errorf("error %g, want about 1e-3", e)
	}
}

func TestMaskOutliersRefusesBadRules(t *testing.T) {
	cube := noisy(10, 1, 1, func(int) float64 { return 1 })
	for _, rule := range []RunningMedian{{}, {20, 5}, {3, 5}, {21, 0}, {21, math.NaN()}, {21, math.Inf(1)}, {-21, 5}} {
		if _, err := MaskOutliers(cube, rule); err == nil {
			t.Errorf("%+v was accepted", rule)
		}
	}
	cube.Mask[0] = cube.Mask[0][:5]
	if _, err := MaskOutliers(cube, RunningMedian{21, 5}); err == nil {
		t.Error("a mask of another length was accepted")
	}
}

func TestRunningMedianAgainstSorting(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	for _, n := range []int{0, 1, 2, 3, 5, 50} {
		value := make([]float64, n)
		for i := range value {
			value[i] = math.Round(4 * rng.NormFloat64()) // ties are likely
		}
		for i, got := range runningMedian(value, 9) {
			half := min(4, max(min(i, n-1-i), edgeHalf))
			want := medianInPlace(slices.Clone(value[max(0, i-half):min(n, i+half+1)]))
			if got != want {
				t.Errorf("n=%d i=%d: %g, want %g", n, i, got, want)
			}
		}
	}
}

func BenchmarkMaskOutliers(b *testing.B) {
	one := noisy(3000, 1e-3, 1, func(int) float64 { return 1 })
	cube := join(one, one, one, one, one, one, one, one, one, one)
	for b.Loop() {
		if _, err := MaskOutliers(cube, RunningMedian{21, 5}); err != nil {
			b.Fatal(err)
		}
	}
}
