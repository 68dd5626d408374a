package noise

import (
	"math"
	"testing"
)

// A depth fitted by generalised least squares in red noise: with the model that made
// the noise, intervals hold the truth as often as they say; with white errors they
// do not. The numbers of the shortfall stand in the package's documentation.
func TestCoverage(t *testing.T) {
	const (
		n, count   = 240, 2000
		depth      = 0.01
		white, red = 5e-4, 5e-4
		minute     = 1. / minutesPerDay
	)
	var data Data
	var shape []float64
	for i := range n {
		at := float64(i) * 2 * minute
		data.Time, data.Err = append(data.Time, at), append(data.Err, white)
		// A trapezoid of 2 h in the middle of 8 h, with an ingress of 12 min.
		edge := (60*minute - math.Abs(at-240*minute)) / (12 * minute)
		shape = append(shape, -math.Min(math.Max(edge, 0), 1))
	}
	columns := [][]float64{shape, ones(n)}
	for _, c := range []struct {
		name   string
		term   Term
		values []float64
	}{
		{"matern32", NewTerm("red", Matern32), []float64{red, 20 * minute}},
		{"exponential", NewTerm("red", Exponential), []float64{red, 20 * minute}},
		{"oscillator", NewTerm("red", Oscillator), []float64{red, 60 * minute, 1 / math.Sqrt2}},
		{"squaredExponential", NewTerm("red", SquaredExponential), []float64{red, 20 * minute}},
	} {
		right, err := newProcess(t, Model{}.Plus(c.term), data, false).At(c.values)
		if err != nil {
			t.Fatal(err)
		}
		wrong, err := newProcess(t, Model{}, data, false).At(nil)
		if err != nil {
			t.Fatal(err)
		}
		runs := count
		if c.name == SquaredExponential {
			runs = 500 // dense
		}
		var in, inWrong [2]int // within one and two standard deviations
		var short float64
		for k := range runs {
			y, err := right.Draw(uint64(k))
			if err != nil {
				t.Fatal(err)
			}
			for i := range y {
				y[i] += 1 + depth*shape[i]
			}
			f, err := right.LeastSquares(columns, y)
			if err != nil {
				t.Fatal(err)
			}
			w, err := wrong.LeastSquares(columns, y)
			if err != nil {
				t.Fatal(err)
			}
			inflated := w.Err[0] * math.Sqrt(w.Chi2/float64(w.Dof))
			short += f.Err[0] / inflated / float64(runs)
			for s, width := range []float64{1, 1.959964} {
				if math.Abs(f.Value[0]-depth) < width*f.Err[0] {
					in[s]++
				}
				if math.Abs(w.Value[0]-depth) < width*inflated {
					inWrong[s]++
				}
			}
		}
		covered(t, c.name+", 68%", in[0], runs, 0.682689)
		covered(t, c.name+", 95%", in[1], runs, 0.95)
		t.Logf("%s: with white errors %.1f%% and %.1f%%, errors %.2f times those of the matching model", c.name, 100*float64(inWrong[0])/float64(runs), 100*float64(inWrong[1])/float64(runs), 1/short)
		if inWrong[0] > runs/2 {
			t.Errorf("%s: white errors hold the truth in %d of %d cases; the documentation says that they do not", c.name, inWrong[0], runs)
		}
	}
}
