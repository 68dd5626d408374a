package noise

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"rimlight/steps/lightcurve"
)

const testdata = "../../testdata/noise"

// columnsOf reads the columns of a file by name.
func columnsOf(t testing.TB, file string) map[string][]float64 {
	t.Helper()
	rows := fileOf(t, "noise/"+file)
	out := map[string][]float64{}
	for k, name := range rows[0] {
		for _, row := range rows[1:] {
			out[name] = append(out[name], parse(t, row[k]))
		}
	}
	return out
}

func parse(t testing.TB, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func readJSON(t testing.TB, file string, into any) {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(testdata, file))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
}

// near fails unless got is want to the tolerance times the larger of |want| and unit.
func near(t testing.TB, what string, got, want, unit, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Max(math.Abs(want), unit)) {
		t.Errorf("%s: %.14g, want %.14g (off by %.2g)", what, got, want, got-want)
	}
}

// A reference is a table of likelihoods in 60 digits; see testdata/noise/gp.py.
type reference struct {
	At    map[string][]float64
	Cases []struct {
		Name          string
		Scale, Jitter bool
		Terms         []Term
		Values        []float64
		LogLike       string
		Gradient      []string
		Whitened      []string
		Solved        []string
		Predictions   map[string][][2]string
	}
}

func referenceData(t testing.TB) (Data, []float64) {
	c := columnsOf(t, "gp_inputs.csv")
	return Data{Time: c["time"], Err: c["err"], Inputs: []lightcurve.Series{
		{Name: "X", Value: c["X"]}, {Name: "Y", Value: c["Y"]}, {Name: "airmass", Value: c["airmass"]},
	}}, c["residual"]
}

func series(name string, x []float64) lightcurve.Series {
	return lightcurve.Series{Name: name, Value: x}
}

// newProcess makes one, by the dense way if wanted.
func newProcess(t testing.TB, m Model, d Data, dense bool) Process {
	t.Helper()
	p, err := New(m, d)
	if err != nil {
		t.Fatal(err)
	}
	if dense && p.p.fast {
		p.p.fast = false
		p.p.dense = newKernels(m, d)
	}
	return p
}

// Likelihood, gradient, whitening and prediction agree with 60-digit arithmetic, by
// the fast and by the dense way. Where the errors are a thousandth of what was
// measured, the dense way, whose condition number is then of the order 1e13, is
// left out.
func TestReference(t *testing.T) {
	var ref reference
	readJSON(t, "gp_hard.json", &ref)
	data, residual := referenceData(t)
	at := Data{Time: ref.At["time"]}
	for _, s := range data.Inputs {
		at.Inputs = append(at.Inputs, lightcurve.Series{Name: s.Name, Value: ref.At[s.Name]})
	}
	if len(ref.Cases) < 12 {
		t.Fatal("cases are missing")
	}
	for _, c := range ref.Cases {
		m := Model{Scale: c.Scale, Jitter: c.Jitter, Terms: c.Terms}
		for _, dense := range []bool{false, true} {
			name := c.Name
			quiet := c.Scale && c.Values[0] < 0.01
			if dense && (quiet || !m.Fast()) {
				continue // or it is dense in any case
			}
			if dense {
				name += ", dense"
			}
			t.Run(name, func(t *testing.T) {
				p := newProcess(t, m, data, dense)
				g, err := p.Gradient(c.Values, residual)
				if err != nil {
					t.Fatal(err)
				}
				unit := 1.0
				if quiet {
					unit = 1e6 // χ² is 4 million
				}
				want := parse(t, c.LogLike)
				near(t, "log likelihood", g.LogLikelihood, want, 1, 1e-12*unit)
				alone, err := p.LogLikelihood(c.Values, residual)
				if err != nil || alone != g.LogLikelihood {
					t.Errorf("log likelihood without gradient: %g, %v", alone, err)
				}
				for k, s := range c.Gradient {
					near(t, p.Parameters()[k].Name, g.ByLog[k], parse(t, s), 1, 1e-10*unit)
				}
				cov, err := p.At(c.Values)
				if err != nil {
					t.Fatal(err)
				}
				white, err := cov.Whiten([][]float64{residual})
				if err != nil {
					t.Fatal(err)
				}
				solved, err := cov.Solve([][]float64{residual})
				if err != nil {
					t.Fatal(err)
				}
				most := 0.0
				for _, s := range c.Solved {
					most = math.Max(most, math.Abs(parse(t, s)))
				}
				for i := range residual {
					near(t, "whitened", white[0][i], parse(t, c.Whitened[i]), 1, 1e-11*unit)
					near(t, "solved", solved[0][i], parse(t, c.Solved[i]), most, 1e-11*unit)
					near(t, "by residual", g.ByResidual[i], -parse(t, c.Solved[i]), most, 1e-11*unit)
				}
				for term, rows := range c.Predictions {
					got, err := cov.Predict(residual, at, term)
					if err != nil {
						t.Fatal(err)
					}
					for i, row := range rows {
						near(t, "mean of "+term, got.Mean[i], parse(t, row[0]), 1e-3, 1e-10*unit)
						near(t, "variance of "+term, got.Variance[i], parse(t, row[1]), 1e-6, 1e-10*unit)
					}
				}
			})
		}
	}
}

// The second table has the oscillator with the parameters of the paper.
func TestReferenceOscillators(t *testing.T) {
	var ref struct {
		Cases []struct {
			Name  string
			Terms []struct {
				Kernel string
				Params map[string]string
			}
			Jitter   string
			LogLike  string
			Pred     [][3]string       `json:"pred_t_mean_var"`
			Gradient map[string]string `json:"dloglike_dlnparam"`
		}
	}
	readJSON(t, "gp_loglike.json", &ref)
	c := columnsOf(t, "gp_data.csv")
	if len(ref.Cases) < 14 {
		t.Fatal("cases are missing")
	}
	for _, r := range ref.Cases {
		t.Run(r.Name, func(t *testing.T) {
			m, values := White(false, true), []float64{parse(t, r.Jitter)}
			for k, term := range r.Terms {
				name := "t" + strconv.Itoa(k)
				if term.Kernel == "sho" {
					s0, q, w := parse(t, term.Params["S0"]), parse(t, term.Params["Q"]), parse(t, term.Params["omega0"])
					m = m.Plus(NewTerm(name, Oscillator))
					values = append(values, math.Sqrt(s0*w*q), 2*math.Pi/w, q)
					continue
				}
				kind := term.Kernel
				if kind == "squared_exponential" {
					kind = SquaredExponential
				}
				m = m.Plus(NewTerm(name, kind))
				values = append(values, parse(t, term.Params["sigma"]), parse(t, term.Params["ell"]))
			}
			for _, dense := range []bool{false, true} {
				p := newProcess(t, m, Data{Time: c["t"], Err: c["yerr"]}, dense)
				g, err := p.Gradient(values, c["y"])
				if err != nil {
					t.Fatal(err)
				}
				tolerance := 1e-10
				if p.p.dense != nil && r.Name == "m32_long" {
					tolerance = 5e-10 // its condition number is 4e6
				}
				if want := parse(t, r.LogLike); math.Abs(g.LogLikelihood-want) > tolerance {
					t.Errorf("log likelihood %.13f, want %.13f", g.LogLikelihood, want)
				}
				at := 1
				for k, term := range r.Terms {
					got := map[string]float64{"sigma": g.ByLog[at], "ell": g.ByLog[at+1]}
					at += 2
					if term.Kernel == "sho" {
						half := g.ByLog[at-2] / 2
						got = map[string]float64{"S0": half, "omega0": half - g.ByLog[at-1], "Q": half + g.ByLog[at]}
						at++
					}
					for name, x := range got {
						if s, ok := r.Gradient[strconv.Itoa(k)+"."+name]; ok {
							near(t, "by "+name, x, parse(t, s), 10, 1e-10)
						}
					}
				}
				cov, err := p.At(values)
				if err != nil {
					t.Fatal(err)
				}
				var places Data
				for _, row := range r.Pred {
					places.Time = append(places.Time, parse(t, row[0]))
				}
				got, err := cov.Predict(c["y"], places, "")
				if err != nil {
					t.Fatal(err)
				}
				for i, row := range r.Pred {
					near(t, "mean", got.Mean[i], parse(t, row[1]), 1, 1e-10)
					near(t, "variance", got.Variance[i], parse(t, row[2]), 1, 1e-10)
				}
			}
		})
	}
}
