package chain

import (
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// columns reads a table of chains: those called name_1, name_2 and so on, one
// after another.
func columns(t *testing.T, file string) map[string][]float64 {
	t.Helper()
	out := map[string][]float64{}
	rows := rowsOf(t, file)
	for k, name := range rows[0][1:] {
		name = name[:strings.LastIndex(name, "_")]
		for _, row := range rows[1:] {
			out[name] = append(out[name], parse(t, row[k+1]))
		}
	}
	return out
}

func rowsOf(t *testing.T, file string) [][]string {
	t.Helper()
	f, err := os.Open(filepath.Join("../../testdata/chain", file))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows
}

func parse(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func reference(t *testing.T, file string, into any) {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("../../testdata/chain", file))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
}

// near fails unless got is want to a relative tolerance.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s: %.12g, want %.12g", what, got, want)
	}
}

func allChains(t *testing.T) map[string][]float64 {
	all := columns(t, "stan_bernoulli_chains.csv")
	for name, x := range columns(t, "ar1_chains.csv") {
		all[name] = x
	}
	if len(all) != 7 {
		t.Fatalf("%d sets of chains, want 7", len(all))
	}
	return all
}

// endless are chains whose autocorrelations stay positive to the last lag, since
// one of them is shifted. There the reference counts the last pair otherwise.
const endless = "ar1_phi0.5_shifted"

// digits is what summation in another order and the Fourier transform leave.
const digits = 1e-10

func TestReference(t *testing.T) {
	var known struct{ Computed map[string]map[string]float64 }
	reference(t, "diagnostics.json", &known)
	for name, x := range allChains(t) {
		want := known.Computed[name]
		s, err := Summaries(Draws{Names: []string{name}, Chains: 4, Length: len(x) / 4, X: x})
		if err != nil {
			t.Fatal(err)
		}
		rhat, err1 := RHat(x, 4)
		bulk, err2 := BulkESS(x, 4)
		tail, err3 := TailESS(x, 4)
		mean, err4 := MeanESS(x, 4)
		low, err5 := QuantileESS(x, 4, 0.05)
		if err1 != nil || err2 != nil || err3 != nil || err4 != nil || err5 != nil {
			t.Fatal(name, err1, err2, err3, err4, err5)
		}
		near(t, name+" R-hat", rhat, math.Max(want["rhat_rank_split"], want["rhat_rank_folded_split"]), digits)
		digits := digits
		if name == endless {
			digits = 0.01
		}
		near(t, name+" bulk", bulk, want["ess_bulk"], digits)
		near(t, name+" tail", tail, want["ess_tail"], digits)
		near(t, name+" mean", mean, want["ess_mean"], digits)
		near(t, name+" low", low, want["ess_q05"], digits)
		if s[0].RHat != rhat || s[0].BulkESS != bulk || s[0].TailESS != tail {
			t.Errorf("%s: summary %+v differs from R-hat %g, bulk %g, tail %g", name, s[0], rhat, bulk, tail)
		}
	}
}

// TestPublished holds the digits that two other programs print.
func TestPublished(t *testing.T) {
	var known struct{ Published map[string]map[string]float64 }
	reference(t, "diagnostics.json", &known)
	chains := columns(t, "stan_bernoulli_chains.csv")
	for name, want := range known.Published {
		s, err := Summaries(Draws{Names: []string{name}, Chains: 4, Length: 1000, X: chains[name]})
		if err != nil {
			t.Fatal(err)
		}
		near(t, name+" R-hat", s[0].RHat, want["rhat_max_rank"], 1e-6)
		near(t, name+" bulk", s[0].BulkESS, want["ess_bulk"], 1e-7)
		near(t, name+" tail", s[0].TailESS, want["ess_tail"], 1e-7)
		near(t, name+" error of the mean", s[0].MeanError, want["mcse_mean"], 2e-3) // of which 3 digits are printed
	}
}

func TestErrors(t *testing.T) {
	var known map[string]map[string]float64
	reference(t, "errors.json", &known)
	for name, x := range allChains(t) {
		want := known[name]
		mean, err := MeanError(x, 4)
		near(t, name+" mean", mean, want["mcse_mean"], digits)
		sd, err2 := SDError(x, 4)
		near(t, name+" standard deviation", sd, want["mcse_sd"], digits)
		if err != nil || err2 != nil {
			t.Fatal(err, err2)
		}
		for _, p := range []float64{0.05, 0.5, 0.84} {
			got, err := QuantileError(x, 4, p)
			if err != nil {
				t.Fatal(err)
			}
			near(t, name+" quantile", got, want["mcse_q"+strconv.FormatFloat(p, 'g', -1, 64)], 1e-8)
		}
	}
}

func TestParetoReference(t *testing.T) {
	for _, row := range rowsOf(t, "psis_khat.csv")[1:] {
		name, s := row[0], int(parse(t, row[1]))
		wantK, wantScale := parse(t, row[5]), parse(t, row[6])
		var lambda, k, scale float64
		if n := scan(name, "exp(1)/exp(%g)", &lambda); n == 1 {
			ratio := make([]float64, s)
			for i := range ratio {
				x := -math.Log1p(-(float64(i)+0.5)/float64(s)) / lambda
				ratio[(i*7)%s] = (lambda-1)*x - math.Log(lambda) + 3 // in any order, up to a constant
			}
			_, got, err := ParetoSmooth(ratio)
			if err != nil {
				t.Fatal(err)
			}
			near(t, name, got, wantK, 1e-9)
			continue
		}
		if n := scan(name, "GPD(k=%g,sigma=%g)", &k, &scale); n != 2 {
			t.Fatalf("row %q", name)
		}
		x := make([]float64, s)
		for i := range x {
			x[i] = scale * (math.Pow(1-(float64(i)+0.5)/float64(s), -k) - 1) / k
		}
		gotK, gotScale := fitPareto(x)
		near(t, name, gotK, wantK, 1e-9)
		near(t, name+" scale", gotScale, wantScale, 1e-9)
	}
}
