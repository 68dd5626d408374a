package spectrum

import (
	"math"
	"testing"
)

func TestSummaryIndependent(t *testing.T) {
	points := []Point{point(0, 1, 0.0103, 2e-5), failed(1, 1.1, "dead channel"), point(2, 1.2, 0.0100, 1e-5)}
	points[2].Flag = "limb darkening at a bound"
	s, err := Assemble(points, nil)
	if err != nil {
		t.Fatal(err)
	}
	got := s.Summary()
	// By hand: weights 4 and 1.
	mean := (4*0.0100 + 0.0103) / 5
	chi2 := math.Pow((0.0100-mean)/1e-5, 2) + math.Pow((0.0103-mean)/2e-5, 2)
	if got.Channels != 3 || got.Good != 2 || got.Flagged != 2 || got.FlatDof != 1 || got.Lo != 1 || math.Abs(got.Hi-1.3) > 1e-12 {
		t.Errorf("%+v", got)
	}
	for _, c := range []struct{ got, want float64 }{
		{got.MedianErr, 1.5e-5}, {got.MeanDepth, mean}, {got.MeanDepthErr, 2e-5 / math.Sqrt(5)}, {got.FlatChi2, chi2},
	} {
		if math.Abs(c.got/c.want-1) > 1e-9 {
			t.Errorf("%.12g, want %.12g", c.got, c.want)
		}
	}
}

// TestSummaryCommonShift: a variance that all depths share widens the mean and
// leaves the test for flatness as it was.
func TestSummaryCommonShift(t *testing.T) {
	points := []Point{point(0, 1, 0.0100, 3e-5), point(1, 1.1, 0.01004, 1e-5), point(2, 1.2, 0.01001, 1e-5)}
	alone, err := Assemble(points, nil)
	if err != nil {
		t.Fatal(err)
	}
	const v = 1e-8
	shifted, err := Assemble(points, [][]float64{{v, v, v}, {v, v, v}, {v, v, v}})
	if err != nil {
		t.Fatal(err)
	}
	a, b := alone.Summary(), shifted.Summary()
	if math.Abs(a.FlatChi2/b.FlatChi2-1) > 1e-6 || math.Abs(a.MeanDepth-b.MeanDepth) > 1e-12 {
		t.Errorf("alone %+v, shifted %+v", a, b)
	}
	if want := math.Sqrt(a.MeanDepthErr*a.MeanDepthErr + v); math.Abs(b.MeanDepthErr/want-1) > 1e-6 {
		t.Errorf("error of the mean %g, want %g", b.MeanDepthErr, want)
	}
}

// TestSummaryOfMany: points alone, without a covariance, need no matrix.
func TestSummaryOfMany(t *testing.T) {
	s := Spectrum{Points: make([]Point, 100000), Cov: make([][]float64, 100000)}
	for i := range s.Points {
		s.Points[i] = point(i, float64(1+i), 0.01, 1e-5)
	}
	if got := s.Summary(); math.Abs(got.MeanDepth-0.01) > 1e-9 || math.Abs(got.MeanDepthErr/(1e-5/math.Sqrt(1e5))-1) > 1e-6 {
		t.Errorf("%+v", got)
	}
}

func TestSummaryOfNothing(t *testing.T) {
	for _, s := range []Spectrum{{}, {Points: []Point{failed(0, 1, "dead")}}} {
		got := s.Summary()
		if got.Good != 0 || !math.IsNaN(got.MeanDepth) || !math.IsNaN(got.MedianErr) {
			t.Errorf("%+v", got)
		}
	}
	// A covariance that is none: numbers that need it are missing, nothing fails.
	s := Spectrum{Points: []Point{point(0, 1, 0.01, 1), point(1, 1.1, 0.01, 1)}, Cov: [][]float64{{1, 5}, {5, 1}}}
	if got := s.Summary(); !math.IsNaN(got.FlatChi2) || got.MedianErr != 1 {
		t.Errorf("%+v", got)
	}
}
