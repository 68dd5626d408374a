package noise

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/optimize"
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

// Where the parameters of the noise are fitted to the same data as the depth, by
// maximum likelihood, and then held, intervals are a little too short.
func TestCoverageOfFittedNoise(t *testing.T) {
	const n, count, depth, minute = 240, 400, 0.01, 1. / minutesPerDay
	truth := []float64{5e-4, 20 * minute}
	var data Data
	var shape []float64
	for i := range n {
		at := float64(i) * 2 * minute
		data.Time, data.Err = append(data.Time, at), append(data.Err, 5e-4)
		edge := (60*minute - math.Abs(at-240*minute)) / (12 * minute)
		shape = append(shape, -math.Min(math.Max(edge, 0), 1))
	}
	columns := [][]float64{shape, ones(n)}
	p := newProcess(t, Model{}.Plus(NewTerm("red", Matern32)), data, false)
	made, err := p.At(truth)
	if err != nil {
		t.Fatal(err)
	}
	valuesOf := func(u []float64) []float64 {
		return []float64{truth[0] * math.Exp(u[0]), truth[1] * math.Exp(u[1])}
	}
	var in [2]int
	for k := range count {
		y, err := made.Draw(uint64(k))
		if err != nil {
			t.Fatal(err)
		}
		for i := range y {
			y[i] += 1 + depth*shape[i]
		}
		fit := func(u []float64) LinearFit {
			c, err := p.At(valuesOf(u))
			if err != nil {
				t.Fatal(err)
			}
			f, err := c.LeastSquares(columns, y)
			if err != nil {
				t.Fatal(err)
			}
			return f
		}
		// Within three of their own standard deviations, or so, of the truth.
		bound := func(u []float64) float64 { return 5e-2 * (u[0]*u[0] + u[1]*u[1]) }
		best, err := optimize.Minimize(optimize.Problem{
			Func: func(u []float64) float64 { return bound(u) - fit(u).LogLikelihood },
			Grad: func(grad, u []float64) {
				g, err := p.Gradient(valuesOf(u), fit(u).Residual)
				if err != nil {
					t.Fatal(err)
				}
				for k := range grad {
					grad[k] = 0.1*u[k] - g.ByLog[k]
				}
			},
		}, []float64{0, 0}, &optimize.Settings{GradientThreshold: 1e-4}, &optimize.BFGS{})
		if err != nil {
			t.Fatal(err)
		}
		f := fit(best.X)
		for s, width := range []float64{1, 1.959964} {
			if math.Abs(f.Value[0]-depth) < width*f.Err[0] {
				in[s]++
			}
		}
	}
	t.Logf("noise fitted and held: %.1f%% and %.1f%%", 100*float64(in[0])/count, 100*float64(in[1])/count)
	if in[0] < count*58/100 || in[0] > count*72/100 || in[1] < count*86/100 {
		t.Errorf("intervals hold the truth in %d and %d of %d cases", in[0], in[1], count)
	}
}
