package fit

import (
	"encoding/json"
	"math"
	"os"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/floats"
)

type nistSet struct {
	Name      string      `json:"name"`
	Level     string      `json:"level"`
	Start1    []float64   `json:"start1"`
	Start2    []float64   `json:"start2"`
	Certified []string    `json:"certified"`
	SD        []string    `json:"certified_sd"`
	RSS       string      `json:"certified_rss"`
	Data      [][]float64 `json:"data"`
}

// nistModels are the model functions of the nonlinear sets, with x a data row's
// predictors.
var nistModels = map[string]func(b, x []float64) float64{
	"Bennett5": func(b, x []float64) float64 { return b[0] * math.Pow(b[1]+x[0], -1/b[2]) },
	"BoxBOD":   saturation,
	"Misra1a":  saturation,
	"Chwirut1": chwirut,
	"Chwirut2": chwirut,
	"DanWood":  func(b, x []float64) float64 { return b[0] * math.Pow(x[0], b[1]) },
	"ENSO": func(b, x []float64) float64 {
		a := 2 * math.Pi * x[0]
		return b[0] + b[1]*math.Cos(a/12) + b[2]*math.Sin(a/12) + b[4]*math.Cos(a/b[3]) + b[5]*math.Sin(a/b[3]) +
			b[7]*math.Cos(a/b[6]) + b[8]*math.Sin(a/b[6])
	},
	"Eckerle4": func(b, x []float64) float64 {
		z := (x[0] - b[2]) / b[1]
		return b[0] / b[1] * math.Exp(-z*z/2)
	},
	"Gauss1":   gauss,
	"Gauss2":   gauss,
	"Gauss3":   gauss,
	"Hahn1":    cubicRatio,
	"Thurber":  cubicRatio,
	"Kirby2":   func(b, x []float64) float64 { return horner(x[0], b[0], b[1], b[2]) / horner(x[0], 1, b[3], b[4]) },
	"Lanczos1": lanczos,
	"Lanczos2": lanczos,
	"Lanczos3": lanczos,
	"MGH09": func(b, x []float64) float64 {
		return b[0] * (x[0]*x[0] + x[0]*b[1]) / (x[0]*x[0] + x[0]*b[2] + b[3])
	},
	"MGH10": func(b, x []float64) float64 { return b[0] * math.Exp(b[1]/(x[0]+b[2])) },
	"MGH17": func(b, x []float64) float64 {
		return b[0] + b[1]*math.Exp(-x[0]*b[3]) + b[2]*math.Exp(-x[0]*b[4])
	},
	"Misra1b": func(b, x []float64) float64 { return b[0] * (1 - math.Pow(1+b[1]*x[0]/2, -2)) },
	"Misra1c": func(b, x []float64) float64 { return b[0] * (1 - 1/math.Sqrt(1+2*b[1]*x[0])) },
	"Misra1d": func(b, x []float64) float64 { return b[0] * b[1] * x[0] / (1 + b[1]*x[0]) },
	"Nelson":  func(b, x []float64) float64 { return b[0] - b[1]*x[0]*math.Exp(-b[2]*x[1]) },
	"Rat42":   func(b, x []float64) float64 { return b[0] / (1 + math.Exp(b[1]-b[2]*x[0])) },
	"Rat43":   func(b, x []float64) float64 { return b[0] / math.Pow(1+math.Exp(b[1]-b[2]*x[0]), 1/b[3]) },
	"Roszman1": func(b, x []float64) float64 {
		return b[0] - b[1]*x[0] - math.Atan(b[2]/(x[0]-b[3]))/math.Pi
	},
}

func saturation(b, x []float64) float64 { return b[0] * (1 - math.Exp(-b[1]*x[0])) }
func chwirut(b, x []float64) float64    { return math.Exp(-b[0]*x[0]) / (b[1] + b[2]*x[0]) }
func gauss(b, x []float64) float64 {
	p, q := (x[0]-b[3])/b[4], (x[0]-b[6])/b[7]
	return b[0]*math.Exp(-b[1]*x[0]) + b[2]*math.Exp(-p*p) + b[5]*math.Exp(-q*q)
}
func cubicRatio(b, x []float64) float64 {
	return horner(x[0], b[0], b[1], b[2], b[3]) / horner(x[0], 1, b[4], b[5], b[6])
}
func lanczos(b, x []float64) float64 {
	return b[0]*math.Exp(-b[1]*x[0]) + b[2]*math.Exp(-b[3]*x[0]) + b[4]*math.Exp(-b[5]*x[0])
}
func horner(x float64, c ...float64) float64 {
	y := 0.0
	for k := len(c) - 1; k >= 0; k-- {
		y = y*x + c[k]
	}
	return y
}

// problem builds the least-squares problem of a set, with derivatives by central
// differences of sixth order, good to about 12 digits.
func (s nistSet) problem() leastSquares {
	model := nistModels[s.Name]
	n := len(s.Certified)
	eval := func(b, res []float64) bool {
		ok := true
		for i, row := range s.Data {
			y := row[0]
			if s.Name == "Nelson" {
				y = math.Log(y)
			}
			res[i] = model(b, row[1:]) - y
			ok = ok && res[i]-res[i] == 0
		}
		return ok
	}
	p := leastSquares{rows: len(s.Data), lo: make([]float64, n), hi: make([]float64, n), tolerance: 1e-20, steps: 2000}
	for k := range n {
		p.lo[k], p.hi[k] = math.Inf(-1), math.Inf(1)
	}
	p.residuals = func(b, res []float64, jac [][]float64) bool {
		ok := eval(b, res)
		if jac == nil || !ok {
			return ok
		}
		at, r := make([]float64, n), make([]float64, len(s.Data))
		for k := range jac {
			copy(at, b)
			h := 2e-4 * math.Abs(b[k])
			if h == 0 {
				h = 1e-6
			}
			clear(jac[k])
			for m, weight := range []float64{3. / 4, -3. / 20, 1. / 60} {
				for _, sign := range []float64{1, -1} {
					at[k] = b[k] + sign*float64(m+1)*h
					if !eval(at, r) {
						return false
					}
					floats.AddScaled(jac[k], sign*weight/h, r)
				}
			}
		}
		return true
	}
	return p
}

// digits is the number of common digits of got and want.
func digits(got, want float64) float64 {
	if got == want {
		return 15
	}
	return min(15, -math.Log10(math.Abs(got/want-1)))
}

// TestNIST fits the nonlinear sets of the NIST Statistical Reference Datasets
// from both starts. From the second, nearer one every set must reach six digits
// in parameters and standard deviations; from the first, all but those named.
func TestNIST(t *testing.T) {
	text, err := os.ReadFile("../../testdata/nist/nist_nls.json")
	if err != nil {
		t.Fatal(err)
	}
	var sets []nistSet
	if err := json.Unmarshal(text, &sets); err != nil {
		t.Fatal(err)
	}
	if len(sets) != len(nistModels) {
		t.Fatalf("%d sets, %d models", len(sets), len(nistModels))
	}
	// Known to fail from the far start: the first step leaves the valley.
	hardFromFirst := map[string]bool{"BoxBOD": true, "MGH10": true, "MGH17": true}
	for _, s := range sets {
		p := s.problem()
		for which, start := range [][]float64{s.Start1, s.Start2} {
			m := p.solve(start)
			held := make([]bool, len(m.x))
			cov, _ := factorise(m.jac, m.res, held, columns(len(m.x), p.rows)).covariance()
			value, sd := 15.0, 15.0
			for k := range m.x {
				value = min(value, digits(m.x[k], parse(t, s.Certified[k])))
				sd = min(sd, digits(math.Sqrt(cov[k][k]*m.sum/float64(len(s.Data)-len(m.x))), parse(t, s.SD[k])))
			}
			t.Logf("%-9s %-7s start %d: %4.1f digits of parameters, %4.1f of sd, %4.1f of sum; %d iterations, %s",
				s.Name, s.Level, which+1, value, sd, digits(m.sum, parse(t, s.RSS)), m.steps, m.status)
			if s.Name == "Lanczos1" {
				sd = value // its residuals are rounding errors, and so are their sums
			}
			if ok := value >= 6 && sd >= 6; !ok && (which == 1 || !hardFromFirst[s.Name]) {
				t.Errorf("%s from start %d: %.1f digits of parameters, %.1f of standard deviations, want 6 (%s)", s.Name, which+1, value, sd, m.status)
			}
		}
	}
}

func parse(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// line is the problem of fitting weights × (a + b t) to y.
func line(t, y, weight []float64) leastSquares {
	return leastSquares{
		rows: len(t), lo: []float64{math.Inf(-1), math.Inf(-1)}, hi: []float64{math.Inf(1), math.Inf(1)},
		residuals: func(x, res []float64, jac [][]float64) bool {
			for i := range t {
				res[i] = (x[0] + x[1]*t[i] - y[i]) * weight[i]
				if jac != nil {
					jac[0][i], jac[1][i] = weight[i], t[i]*weight[i]
				}
			}
			return true
		},
	}
}

// TestLine compares a linear fit with the closed form of the weighted normal
// equations.
func TestLine(t *testing.T) {
	x := []float64{1, 2, 4, 7, 9}
	y := []float64{3.1, 4.9, 9.2, 15.1, 18.7}
	w := []float64{1, 2, 1, 0.5, 3}
	var s, sx, sy, sxx, sxy float64
	for i := range x {
		v := w[i] * w[i]
		s, sx, sy, sxx, sxy = s+v, sx+v*x[i], sy+v*y[i], sxx+v*x[i]*x[i], sxy+v*x[i]*y[i]
	}
	det := s*sxx - sx*sx
	p := line(x, y, w)
	m := p.solve([]float64{-100, 50})
	cov, determined := factorise(m.jac, m.res, make([]bool, 2), columns(2, p.rows)).covariance()
	for _, c := range []struct{ got, want float64 }{
		{m.x[0], (sxx*sy - sx*sxy) / det}, {m.x[1], (s*sxy - sx*sy) / det},
		{cov[0][0], sxx / det}, {cov[1][1], s / det}, {cov[0][1], -sx / det}, {cov[1][0], -sx / det},
	} {
		if math.Abs(c.got/c.want-1) > 1e-12 {
			t.Errorf("%.15g, want %.15g", c.got, c.want)
		}
	}
	if m.status != statusConverged || !determined[0] || !determined[1] {
		t.Errorf("status %s, determined %v", m.status, determined)
	}

	// With the slope limited to at most 1, the constant is the weighted mean of y - t.
	p.hi[1] = 1
	m = p.solve([]float64{0, 0})
	if want := (sy - sx) / s; m.x[1] != 1 || math.Abs(m.x[0]-want) > 1e-9 || !m.atEdge[1] || m.status != statusConverged {
		t.Errorf("limited fit %v at edge %v (%s), want [%g 1]", m.x, m.atEdge, m.status, want)
	}
}

// TestUndetermined fits a line whose slope has no effect.
func TestUndetermined(t *testing.T) {
	p := line([]float64{0, 0, 0}, []float64{1, 2, 3}, []float64{1, 1, 1})
	m := p.solve([]float64{0, 5})
	cov, determined := factorise(m.jac, m.res, make([]bool, 2), columns(2, p.rows)).covariance()
	if math.Abs(m.x[0]-2) > 1e-12 || m.x[1] != 5 || m.status != statusConverged {
		t.Errorf("fit %v (%s), want [2 5]", m.x, m.status)
	}
	if !determined[0] || determined[1] || math.Abs(cov[0][0]-1./3) > 1e-12 {
		t.Errorf("determined %v, covariance %v", determined, cov)
	}
}

// TestInvalid checks that places where the model cannot be computed are backed
// away from, and named when the search starts there.
func TestInvalid(t *testing.T) {
	p := leastSquares{rows: 1, lo: []float64{math.Inf(-1)}, hi: []float64{math.Inf(1)},
		residuals: func(x, res []float64, jac [][]float64) bool {
			res[0] = math.Log(x[0])
			if jac != nil {
				jac[0][0] = 1 / x[0]
			}
			return x[0] > 0
		}}
	if m := p.solve([]float64{20}); math.Abs(m.x[0]-1) > 1e-9 || m.status != statusConverged { // the full step is to a negative x
		t.Errorf("fit %v (%s), want 1", m.x, m.status)
	}
	if m := p.solve([]float64{-1}); m.status != statusInvalid {
		t.Errorf("status %q from an invalid start", m.status)
	}
}

func BenchmarkFactorise(b *testing.B) {
	const n, rows = 9, 3000
	jac, work := columns(n, rows), columns(n, rows)
	for k := range jac {
		for i := range rows {
			jac[k][i] = math.Cos(float64(k*i) / 100)
		}
	}
	held := make([]bool, n)
	for b.Loop() {
		factorise(jac, jac[0], held, work)
	}
}
