package simulate

import (
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"rimlight/steps/lightcurve"
)

func TestContinuous(t *testing.T) {
	began := time.Now()
	cube, truth, err := Make(Continuous(1))
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("simulated in %s", time.Since(began))
	if len(cube.Time) != 3000 || len(cube.Channels) != 80 || len(cube.Aux) != 2 {
		t.Fatalf("%d integrations, %d channels, %d auxiliaries", len(cube.Time), len(cube.Channels), len(cube.Aux))
	}
	dead, missing, zero := 0, 0, 0
	for k := range cube.Channels {
		if truth.Dead[k] {
			dead++
			continue
		}
		for _, f := range cube.Mask[k] {
			if f&lightcurve.Missing != 0 {
				missing++
			}
			if f&lightcurve.Zero != 0 {
				zero++
			}
		}
		if d := truth.Depth[k]; d < 0.012 || d > 0.015 {
			t.Errorf("channel %d: depth %g", k, d)
		}
		if noise := cube.Err[k][10] / cube.Flux[k][10]; !math.IsNaN(noise) && cube.Flux[k][10] > 0 && (noise < 200e-6 || noise > 1600e-6) {
			t.Errorf("channel %d: noise per integration %.0f ppm", k, noise*1e6)
		}
	}
	if dead != 3 {
		t.Errorf("%d dead channels, expected 3", dead)
	}
	samples := 77 * 3000.0
	for name, c := range map[string][2]float64{"missing": {float64(missing), 0.0005 * samples}, "zero": {float64(zero), 0.0001 * samples}} {
		if math.Abs(c[0]-c[1]) > 5*math.Sqrt(c[1]) {
			t.Errorf("%s samples: %g, expected about %g", name, c[0], c[1])
		}
	}
	again, _, _ := Make(Continuous(1))
	for k := range cube.Flux {
		if !slices.EqualFunc(cube.Flux[k], again.Flux[k], func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }) {
			t.Fatalf("channel %d differs the second time", k)
		}
	}
	other, _, _ := Make(Continuous(2))
	if other.Flux[5][7] == cube.Flux[5][7] {
		t.Error("another seed gave the same flux")
	}
	table, err := truth.CSV()
	if lines := strings.Count(string(table), "\n"); err != nil || lines != 81 {
		t.Errorf("the truth has %d lines, error %v", lines, err)
	}
	truth.U2 = truth.U2[1:]
	if _, err := truth.CSV(); err == nil || !strings.Contains(err.Error(), "79 u2") {
		t.Errorf("a truth with a u2 missing: error %v", err)
	}
}

// TestStream pins the random numbers: a seed means the same data for good.
func TestStream(t *testing.T) {
	s := Continuous(7)
	s.Integrations, s.Channels, s.DeadChannels = 10, 2, 0
	cube, _, err := Make(s)
	if err != nil {
		t.Fatal(err)
	}
	got := []float64{cube.Aux[0].Value[0], cube.Aux[1].Value[9], cube.Flux[0][0], cube.Flux[1][9]}
	want := []float64{4.6879247854188266, 4.4388425198250747, 12403991.166263478, 5426092.6335213929}
	for i := range got {
		if math.Abs(got[i]-want[i]) > 1e-9*math.Abs(want[i]) {
			t.Errorf("value %d of the stream is %.17g, expected %.17g", i, got[i], want[i])
		}
	}
}

// TestNoiseAndDepth holds the simulated data against closed forms: with limb
// darkening and systematics off, the mean flux between second and third
// contact falls by the depth, and the scatter is that of the electrons.
func TestNoiseAndDepth(t *testing.T) {
	s := Continuous(3)
	s.Settling, s.Drift, s.Leak, s.OutlierShare, s.MissingShare, s.ZeroShare, s.DeadChannels, s.ExcessNoise = 0, 0, 0, 0, 0, 0, 0, 0
	cube, truth, err := Make(s)
	if err != nil {
		t.Fatal(err)
	}
	for _, k := range []int{10, 40} {
		var out, in []float64
		for i, tm := range cube.Time {
			if z := s.separation(tm); z > 1.2 {
				out = append(out, cube.Flux[k][i])
			} else if z < 0.45 { // near the middle
				in = append(in, cube.Flux[k][i])
			}
		}
		mo, so := moments(out)
		mi, _ := moments(in)
		if want := cube.Err[k][0]; math.Abs(so/want-1) > 4/math.Sqrt(2*float64(len(out))) {
			t.Errorf("channel %d: scatter %g, expected %g", k, so, want)
		}
		u1, u2 := truth.U1[k], truth.U2[k]
		mu := math.Sqrt(1 - 0.42*0.42)
		want := truth.Depth[k] * (1 - u1*(1-mu) - u2*(1-mu)*(1-mu)) / (1 - u1/3 - u2/6)
		if got := 1 - mi/mo; math.Abs(got-want) > 4*so/mo/math.Sqrt(float64(len(in)))+0.03*want {
			t.Errorf("channel %d: depth in the middle %g, expected about %g", k, got, want)
		}
	}
}

// TestLongExposures holds the mean over a long exposure against that of many
// short ones.
func TestLongExposures(t *testing.T) {
	s := Continuous(4)
	s.Integrations, s.Cadence, s.Exposure, s.Start = 12, 900, 900, s.MidTransit-0.08
	if s.parts() < 5 {
		t.Errorf("an exposure of %g s is cut into %d parts", s.Exposure, s.parts())
	}
	q := newRule(nodes)
	for i, z := range s.separations([]float64{s.MidTransit - 0.075, s.MidTransit - 0.067, s.MidTransit - 0.055, s.MidTransit}) {
		at := []float64{-0.075, -0.067, -0.055, 0}[i]
		got, want := 0.0, 0.0
		for _, x := range z {
			got += q.blocked(0.115, x, 0.4, 0.2) / float64(len(z))
		}
		const n = 3000
		for k := range n {
			x := s.separation(s.MidTransit + at + 900./86400*((float64(k)+0.5)/n-0.5))
			want += q.blocked(0.115, x, 0.4, 0.2) / n
		}
		if math.Abs(got-want) > 3e-7 {
			t.Errorf("%g d from mid-transit: mean %.10g, expected %.10g", at, got, want)
		}
	}
}

func moments(x []float64) (mean, sd float64) {
	for _, v := range x {
		mean += v
	}
	mean /= float64(len(x))
	for _, v := range x {
		sd += (v - mean) * (v - mean)
	}
	return mean, math.Sqrt(sd / float64(len(x)-1))
}

func TestWrongScenarios(t *testing.T) {
	for name, change := range map[string]func(s *Scenario){
		"Integrations":          func(s *Scenario) { s.Integrations = 3 },
		"Channels":              func(s *Scenario) { s.Channels = 0 },
		"Integrations*Channels": func(s *Scenario) { s.Integrations, s.Channels = 1e6, 1e5 },
		"WaveHi":                func(s *Scenario) { s.WaveHi = s.WaveLo },
		"Exposure":              func(s *Scenario) { s.Exposure = s.Cadence * 2 },
		"AxisRatio":             func(s *Scenario) { s.AxisRatio = math.NaN() },
		"Eccentricity":          func(s *Scenario) { s.Eccentricity = 1 },
		"DeadChannels":          func(s *Scenario) { s.DeadChannels = 1000 },
		"band 1":                func(s *Scenario) { s.Bands = []Band{{0, 1, 0}} },
		"shorten Exposure":      func(s *Scenario) { s.Integrations, s.Channels, s.Period, s.AxisRatio, s.Depth = 1e6, 5, 0.1, 1e3, 0 },
		"a depth of -0.0":       func(s *Scenario) { s.Depth, s.Slope, s.Bands = 0.01, 0, []Band{{1, 1e9, -0.03}} },
	} {
		s := Continuous(1)
		change(&s)
		if _, _, err := Make(s); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("%s: got error %v", name, err)
		}
	}
}

func BenchmarkMake(b *testing.B) {
	for range b.N {
		if _, _, err := Make(Continuous(1)); err != nil {
			b.Fatal(err)
		}
	}
}
