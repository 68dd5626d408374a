package noise

import (
	"math"
	"slices"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
)

func TestParametersAndEquation(t *testing.T) {
	m := White(true, true).Plus(
		NewTerm("red", Matern32),
		NewTerm("gran", Oscillator),
		NewTerm("det", SquaredExponential, "X", "Y").Times(Exponential, Time),
	)
	d := Data{Time: []float64{1, 2}, Err: []float64{1, 1}, Inputs: []lightcurve.Series{
		{Name: "X", Unit: "pix", Value: []float64{1, 2}}, {Name: "Y", Unit: "pix", Value: []float64{1, 2}},
	}}
	p := newProcess(t, m, d, false)
	var got []string
	for _, parameter := range p.Parameters() {
		got = append(got, parameter.Name+" "+parameter.Unit)
	}
	want := []string{"errorScale ", "jitter ", "red.sigma ", "red.timescale d", "gran.sigma ", "gran.period d", "gran.quality ",
		"det.sigma ", "det.length.X pix", "det.length.Y pix", "det.timescale d"}
	if !slices.Equal(got, want) {
		t.Errorf("parameters %q, want %q", got, want)
	}
	const equation = "cov(i, j) = (errorScale² err_i² + jitter²) δ_ij + red.sigma² (1 + √3 d1) exp(-√3 d1)" +
		" + gran.sigma² exp(-d2/2Q) (cos ηd2 + sin(ηd2)/2Qη) with Q = gran.quality, η² = 1 - 1/4Q²" +
		" + det.sigma² exp(-d3²/2) exp(-d4), d1 = |Δtime|/red.timescale, d2 = 2π |Δtime|/gran.period," +
		" d3 = √[(|ΔX|/det.length.X)² + (|ΔY|/det.length.Y)²], d4 = |Δtime|/det.timescale"
	if got := m.Equation(); got != equation {
		t.Errorf("equation\n%s, want\n%s", got, equation)
	}
	if got := (Model{}).Equation(); got != "cov(i, j) = err_i² δ_ij" {
		t.Error(got)
	}
	if m.Fast() || !(Model{Terms: m.Terms[:2]}).Fast() || (Model{Terms: []Term{NewTerm("a", Exponential, "X")}}).Fast() {
		t.Error("the way of computing is not known")
	}
}

// A sum is a value of its own: what is added to one leaves another alone.
func TestPlus(t *testing.T) {
	a := Model{}.Plus(NewTerm("a", Exponential), NewTerm("b", Exponential), NewTerm("c", Exponential))
	b, c := a.Plus(NewTerm("d", Matern32)), a.Plus(NewTerm("e", Matern32))
	if len(a.Terms) != 3 || b.Terms[3].Name != "d" || c.Terms[3].Name != "e" {
		t.Error(a, b, c)
	}
	x := NewTerm("x", Exponential)
	if x.Times(Matern32, "X"); len(x.Factors) != 1 {
		t.Error(x)
	}
}

func TestRefusedModels(t *testing.T) {
	for want, m := range map[string]Model{
		"letters and digits":   Model{}.Plus(NewTerm("a b", Exponential)),
		"two terms":            Model{}.Plus(NewTerm("a", Exponential), NewTerm("a", Matern32)),
		"unknown kernel":       Model{}.Plus(NewTerm("a", "linear")),
		"occurs twice":         Model{}.Plus(NewTerm("a", Exponential).Times(Matern32)),
		"oscillator over 2":    Model{}.Plus(NewTerm("a", Oscillator, "X", "Y")),
		"0 factors":            {Terms: []Term{{Name: "a"}}},
		"expected at most 8":   {Terms: make([]Term, 9)},
		"letters, digits":      Model{}.Plus(NewTerm("a", Exponential, "X.Y")),
		"the data have no":     Model{}.Plus(NewTerm("a", Exponential, "X")),
		"kernels other than":   Model{}.Plus(NewTerm("a", SquaredExponential)),
		"lies before the one ": Model{}.Plus(NewTerm("a", Exponential)),
	} {
		d := Data{Time: even(2001), Err: ones(2001)}
		switch want {
		case "the data have no":
			d = Data{Time: even(3), Err: ones(3)}
		case "lies before the one ":
			d.Time[7] = 0
		}
		_, err := New(m, d)
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v; expected one with %q", err, want)
		}
	}
}

func TestRefusedNumbers(t *testing.T) {
	m := White(false, true).Plus(NewTerm("red", Matern32))
	p := newProcess(t, m, Data{Time: even(5), Err: make([]float64, 5)}, false)
	r := make([]float64, 5)
	for _, values := range [][]float64{nil, {1, 1}, {-1, 1, 1}, {0, 0, 1}, {0, 1, math.NaN()}, {0, 1, math.Inf(1)}, {1, 1e300, 1}} {
		if _, err := p.LogLikelihood(values, r); err == nil {
			t.Errorf("values %v were taken", values)
		}
	}
	if _, err := p.Gradient([]float64{0, 1, 1e-3}, r); err != nil {
		t.Errorf("a jitter of 0: %v", err)
	}
	if _, err := p.LogLikelihood([]float64{1, 1, 1}, []float64{0, 0, math.NaN(), 0, 0}); err == nil {
		t.Error("a residual that is not a number was taken")
	}
	twice := newProcess(t, m, Data{Time: make([]float64, 2), Err: make([]float64, 2)}, false)
	if _, err := twice.LogLikelihood([]float64{0, 1, 1}, r[:2]); err == nil {
		t.Error("two samples at once without errors were taken")
	}
	var none Process
	if _, err := none.At(nil); err == nil {
		t.Error("a process that was not made was taken")
	}
	if _, err := (Covariance{}).Draw(1); err == nil {
		t.Error("a covariance that was not made was taken")
	}
}

func TestFromCurve(t *testing.T) {
	c := lightcurve.Curve{Time: []float64{1, 2, 3}, Err: []float64{2, 4, 6}, Mask: []uint8{0, 1, 0},
		Aux: []lightcurve.Series{{Name: "X", Unit: "pix", Value: []float64{7, 8, 9}}}}
	d, used, err := FromCurve(c, 2)
	if err != nil || !slices.Equal(used, []int{0, 2}) || !slices.Equal(d.Err, []float64{1, 3}) || !slices.Equal(d.Inputs[0].Value, []float64{7, 9}) || d.Inputs[0].Unit != "pix" {
		t.Error(d, used, err)
	}
	if _, _, err := FromCurve(c, 0); err == nil {
		t.Error("a level of 0 was taken")
	}
}
