package diagnose

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/check"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// verdicts writes checks as a string of P and F.
func verdicts(checks []check.Check) string {
	var out strings.Builder
	for _, c := range checks {
		if c.Name == "" || c.Limit == "" || c.Why == "" {
			out.WriteByte('?')
		}
		if c.Passed {
			out.WriteByte('P')
		} else {
			out.WriteByte('F')
		}
	}
	return out.String()
}

func points(n, dead, flagged int, chi2 float64) spectrum.Spectrum {
	var s spectrum.Spectrum
	for i := range n {
		p := spectrum.Point{
			Channel: lightcurve.Channel{Index: i, Lo: float64(i), Hi: float64(i + 1)},
			Depth:   0.01, DepthErr: 1e-5, Chi2: chi2 * 100, Dof: 100,
		}
		if i < dead {
			p.Depth, p.DepthErr, p.Dof, p.Flag = math.NaN(), math.NaN(), 0, "dead"
		} else if i < dead+flagged {
			p.Flag = "doubtful"
		}
		s.Points = append(s.Points, p)
	}
	return s
}

func TestSpectrumChecks(t *testing.T) {
	for want, s := range map[string]spectrum.Spectrum{
		"PPP": points(80, 3, 2, 1.05),
		"FPP": points(80, 20, 2, 1.05),
		"PFP": points(80, 3, 20, 1.05),
		"PPF": points(80, 3, 2, 1.5),
		"F":   {},
	} {
		if got := verdicts(SpectrumChecks(s)); got != want {
			t.Errorf("got %s, want %s", got, want)
		}
	}
	if got := verdicts(SpectrumChecks(points(5, 5, 0, 1))); got != "F" {
		t.Errorf("no depth at all: %s", got)
	}
	none := points(5, 0, 0, 1)
	for i := range none.Points {
		none.Points[i].Dof = 0
	}
	if got := verdicts(SpectrumChecks(none)); got != "PPF" {
		t.Errorf("no degrees of freedom: %s", got)
	}
}

// summaries sums fits up.
func summaries(t *testing.T, fits ...fit.CurveFit) []Summary {
	t.Helper()
	var out []Summary
	for _, f := range fits {
		s, err := Summarise(f)
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, s)
	}
	return out
}

func TestResidualChecks(t *testing.T) {
	white, red := series(t, "white"), series(t, "ar1")
	good, correlated := curve(white, 1e-4), curve(red, 1e-4)
	wrong := curve(white, 3e-4)
	masked := curve(white, 1e-4)
	for i := range masked.Mask {
		if i%4 == 0 {
			masked.Mask[i] = lightcurve.Outlier
		}
	}
	dead := curve(white, 1e-4)
	for i := range dead.Mask {
		dead.Mask[i] = lightcurve.Excluded
	}
	broken := curve(white, 1e-4)
	broken.Err = nil
	short := curve(white[:60], 1e-4)
	for _, tc := range []struct {
		name  string
		white fit.CurveFit
		fits  []fit.CurveFit
		want  string
	}{
		{"good", good, []fit.CurveFit{good, good, dead}, "PPPPP"},
		{"correlated", correlated, []fit.CurveFit{correlated}, "PFPFP"},
		{"errors too large", wrong, []fit.CurveFit{wrong}, "FPFPP"},
		{"masked", good, []fit.CurveFit{masked}, "PPPPF"},
		{"dead", dead, []fit.CurveFit{dead}, "FFFFF"},
		{"nothing", fit.CurveFit{}, nil, "FFFFF"},
		{"broken", broken, []fit.CurveFit{good}, "FFPPP"},
		{"too short for beta", good, []fit.CurveFit{short}, "PPPFP"},
	} {
		checks := ResidualChecks(tc.white, summaries(t, tc.fits...))
		if got := verdicts(checks); got != tc.want {
			t.Errorf("%s: %s, want %s: %+v", tc.name, got, tc.want, checks)
		}
	}
}

func TestFitChecks(t *testing.T) {
	p := fit.Posterior{Names: []string{"a", "b"}, Err: []float64{1, 2}, Chi2: 105, Dof: 100, Status: "converged", Iterations: 9}
	if got := verdicts(FitChecks("white light", p)); got != "PPP" {
		t.Error(got)
	}
	p.Status, p.Err, p.Chi2, p.Warnings = "stalled", []float64{1, math.NaN()}, 300, []string{"a is at the end of its range"}
	checks := FitChecks("", p)
	if got := verdicts(checks); got != "FFF" {
		t.Error(got)
	}
	if !strings.Contains(checks[0].Limit, `"stalled"`) || !strings.Contains(checks[0].Why, "end of its range") {
		t.Errorf("%+v", checks[0])
	}
	if got := verdicts(FitChecks("x", fit.Posterior{})); got != "FPF" {
		t.Error(got)
	}
}

// TestChecksWithGap holds that a channel of which nothing is known but that it
// is missing counts as unmeasured, and in nothing else.
func TestChecksWithGap(t *testing.T) {
	s := points(80, 0, 2, 1.05)
	all := SpectrumChecks(s)
	nan := math.NaN()
	s.Points[40] = spectrum.Point{Channel: s.Points[40].Channel, Depth: nan, DepthErr: nan, Chi2: nan, Scatter: nan, Flag: "no result"}
	got := SpectrumChecks(s)
	if verdicts(got) != "PPP" || got[0].Value != 79.0/80 || math.Abs(got[1].Value-2.0/79) > 1e-15 || got[2].Value != all[2].Value {
		t.Errorf("with a gap the checks are %+v", got)
	}
	white, channel := curve(series(t, "white"), 1e-4), curve(series(t, "ar1"), 1e-4)
	gap := Summary{Channel: channel.Channel, Level: nan, Mid: nan, Scatter: Scatter{RMS: nan, Ratio: nan}, Beta: Beta{Value: nan}}
	fitted := summaries(t, channel)
	with, without := ResidualChecks(white, append(fitted, gap)), ResidualChecks(white, fitted)
	for i := range without {
		if with[i] != without[i] {
			t.Errorf("check %+v, without the gap %+v", with[i], without[i])
		}
	}
}
