package spectrum

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
)

// point returns a measured point of a channel of width 0.1 um.
func point(index int, lo, depth, err float64) Point {
	return Point{
		Channel: lightcurve.Channel{Index: index, Lo: lo, Hi: lo + 0.1},
		Depth:   depth, DepthErr: err,
		RadiusRatio: math.Sqrt(depth), RadiusRatioErr: err / 2 / math.Sqrt(depth),
		Limb: []float64{0.3, 0.1}, LimbErr: []float64{0.01, 0},
		Chi2: 980, Dof: 990, Used: 1000, Masked: 3, Scatter: 4e-4,
	}
}

// failed returns the point of a channel without a depth.
func failed(index int, lo float64, flag string) Point {
	nan := math.NaN()
	p := point(index, lo, nan, nan)
	p.Limb, p.LimbErr, p.Chi2, p.Dof, p.Scatter, p.Flag = nil, nil, nan, 0, nan, flag
	return p
}

func TestAssemble(t *testing.T) {
	given := []Point{point(2, 1.2, 0.0102, 2e-5), point(0, 1.0, 0.0100, 1e-5), failed(1, 1.1, "")}
	shared := [][]float64{{4e-10, 2e-10, 9}, {2e-10, 1e-10, math.NaN()}, {9, 9, -1}}
	s, err := Assemble(given, shared)
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range s.Points {
		if p.Channel.Index != i {
			t.Errorf("point %d is channel %d; expected order of wavelength", i, p.Channel.Index)
		}
	}
	if given[2].Flag != "" || s.Points[1].Flag != "no depth" {
		t.Errorf("flags %q and %q", given[2].Flag, s.Points[1].Flag)
	}
	want := [][]float64{{1e-10 + 1e-10, math.NaN(), 2e-10}, {math.NaN(), math.NaN(), math.NaN()}, {2e-10, math.NaN(), 4e-10 + 4e-10}}
	for i := range want {
		for j := range want {
			if got := s.Cov[i][j]; math.Abs(got-want[i][j]) > 1e-24 || math.IsNaN(got) != math.IsNaN(want[i][j]) {
				t.Errorf("covariance (%d, %d) is %g, want %g", i, j, got, want[i][j])
			}
		}
	}
	sigma := s.Errors()
	if math.Abs(sigma[0]-math.Sqrt(2)*1e-5) > 1e-18 || !math.IsNaN(sigma[1]) {
		t.Errorf("errors %v", sigma)
	}
}

func TestAssembleUnusableDepths(t *testing.T) {
	inf := point(0, 1, math.Inf(1), 1e-5)
	loose := point(1, 2, 0.01, math.Inf(1))
	zero := point(2, 3, 0.01, 0)
	zero.Flag = "held"
	s, err := Assemble([]Point{inf, loose, zero}, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, flag := range []string{"no depth", "no depth", "held"} {
		if p := s.Points[i]; p.Good() || !math.IsNaN(p.Depth) || !math.IsNaN(p.DepthErr) || p.Flag != flag {
			t.Errorf("point %d: depth %g +- %g, flag %q", i, p.Depth, p.DepthErr, p.Flag)
		}
	}
}

func TestAssembleRefuses(t *testing.T) {
	a, b := point(0, 1.0, 0.01, 1e-5), point(1, 1.1, 0.01, 1e-5)
	overlapping := b
	overlapping.Channel.Lo = 1.05
	reversed := b
	reversed.Channel.Hi = 1.0
	nowhere := b
	nowhere.Channel.Hi = math.NaN()
	for _, tc := range []struct {
		points []Point
		shared [][]float64
		want   string
	}{
		{nil, nil, "no points"},
		{make([]Point, MaxPoints+1), nil, "4097 points; expected at most 4096"},
		{[]Point{a, a}, nil, "channels 0 and 0 both reach from 1 to 1.1 um"},
		{[]Point{overlapping, a}, nil, "channel 0 (1 to 1.1 um) overlaps channel 1"},
		{[]Point{a, reversed}, nil, "channel 1 reaches from 1.1 to 1 um"},
		{[]Point{a, nowhere}, nil, "expected an interval"},
		{[]Point{a, b}, [][]float64{{0, 0}}, "has 1 rows"},
		{[]Point{a, b}, [][]float64{{0, 0}, {0}}, "row 1 of the shared covariance has 1 elements"},
		{[]Point{a, b}, [][]float64{{-1, 0}, {0, 0}}, "element 0 of the diagonal"},
		{[]Point{a, b}, [][]float64{{1, math.NaN()}, {0, 1}}, "element (0, 1) of the shared covariance is NaN"},
		{[]Point{a, b}, [][]float64{{1, 0.1}, {0.2, 1}}, "expected a symmetric matrix"},
	} {
		if _, err := Assemble(tc.points, tc.shared); err == nil || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("error %v; want %q", err, tc.want)
		}
	}
	// Edges that touch up to rounding in single precision are accepted.
	b.Channel.Lo = float64(float32(1.1)) - 1e-7
	if _, err := Assemble([]Point{a, b}, nil); err != nil {
		t.Error(err)
	}
}

func TestErrorsWithoutCovariance(t *testing.T) {
	s := Spectrum{Points: []Point{point(0, 1, 0.01, 1e-5), failed(1, 1.1, "dead")}}
	if sigma := s.Errors(); sigma[0] != 1e-5 || !math.IsNaN(sigma[1]) {
		t.Errorf("errors %v", sigma)
	}
}
