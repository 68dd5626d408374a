package limbtable

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
)

// profileOf returns a profile of n equal steps in mu.
func profileOf(l limb.Law, n int) Profile {
	var p Profile
	for i := range n + 1 {
		mu := float64(i) / float64(n)
		p.Mu, p.Intensity = append(p.Mu, mu), append(p.Intensity, l.Intensity(mu))
	}
	return p
}

// TestFitSun compares with least-squares fits of 40 digits to the limb darkening
// of the Sun.
func TestFitSun(t *testing.T) {
	file, err := os.Open("../../testdata/limb/neckel_labs_1994.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil || len(rows) != 31 {
		t.Fatal(len(rows), err)
	}
	for _, row := range rows[1:] {
		get := func(name string) float64 {
			for i, n := range rows[0] {
				if n == name {
					x, err := strconv.ParseFloat(row[i], 64)
					if err != nil {
						t.Fatal(err)
					}
					return x
				}
			}
			t.Fatal(name)
			return 0
		}
		if row[9] != "ok" {
			continue
		}
		sum := 0.0
		for k := range 6 {
			sum += get(fmt.Sprintf("A%d", k))
		}
		var p Profile
		for i := 1; i <= 100; i++ {
			mu, value := float64(i)/100, 0.0
			for k := range 6 {
				value += get(fmt.Sprintf("A%d", k)) / sum * math.Pow(mu, float64(k))
			}
			if i == 100 {
				value = 1
			}
			p.Mu, p.Intensity = append(p.Mu, mu), append(p.Intensity, value)
		}
		for law, names := range map[string][]string{
			limb.Quadratic:     {"quad_u1_lsq", "quad_u2_lsq", "quad_rms"},
			limb.FourParameter: {"nl_c1_lsq", "nl_c2_lsq", "nl_c3_lsq", "nl_c4_lsq", "nl_rms"},
		} {
			f, err := FitLaw(p, Choice{Law: law})
			if err != nil {
				t.Fatal(err)
			}
			for k, u := range append(f.Law.Coefficients, f.RMS) {
				want := get(names[k])
				tolerance := 1e-10
				if k == len(names)-1 {
					tolerance = 5e-4 * want // digits of the table
				}
				if math.Abs(u-want) > tolerance {
					t.Errorf("%s nm, %s law: %s is %.14g, expected %.14g", row[0], law, names[k], u, want)
				}
			}
		}
	}
}

// TestFitRecovers fits profiles made of the law itself: whatever the choice, it is
// found, and nothing is left.
func TestFitRecovers(t *testing.T) {
	for _, l := range []limb.Law{
		{Name: limb.Uniform}, {Name: limb.Linear, Coefficients: []float64{0.6}}, {Name: limb.Quadratic, Coefficients: []float64{0.4, 0.25}},
		{Name: limb.SquareRoot, Coefficients: []float64{0.2, 0.5}}, {Name: limb.Logarithmic, Coefficients: []float64{0.6, 0.2}},
		{Name: limb.Power2, Coefficients: []float64{0.7, 0.6}}, {Name: limb.Power2, Coefficients: []float64{0.3, 4}},
		{Name: limb.ThreeParameter, Coefficients: []float64{1.1, -0.9, 0.4}}, {Name: limb.FourParameter, Coefficients: []float64{0.5, 0.3, -0.4, 0.2}},
	} {
		for _, grid := range []string{"", GridMu, GridRadius} {
			for _, weight := range []string{"", WeightArea} {
				c := Choice{Law: l.Name, Grid: grid, Weight: weight, MuCut: 0.1, Points: 60}
				f, err := FitLaw(profileOf(l, 200), c)
				if err != nil {
					t.Fatalf("%+v, %+v: %v", l, c, err)
				}
				tolerance, left := 1e-10, 1e-13
				if grid != "" {
					tolerance, left = 4e-3, 3e-5 // of the interpolation
				}
				for k, u := range f.Law.Coefficients {
					if math.Abs(u-l.Coefficients[k]) > tolerance*(1+math.Abs(u)) && l.Name != limb.FourParameter && l.Name != limb.ThreeParameter || math.Abs(u-l.Coefficients[k]) > 20*tolerance {
						t.Errorf("%+v, %+v: fitted %v", l, c, f.Law)
					}
				}
				if !(f.RMS <= left && math.Abs(f.Largest) <= 30*left && math.Abs(f.Mean) <= 10*left) || !f.Physical || f.Mu[0] < 0.1-1e-15 || f.Mu[len(f.Mu)-1] != 1 {
					t.Errorf("%+v, %+v: left %+v", l, c, f)
				}
			}
		}
	}
}

// TestFitResidual fits a line to a curve by hand.
func TestFitResidual(t *testing.T) {
	p := Profile{Mu: []float64{0, 0.5, 1}, Intensity: []float64{0.4, 0.9, 1}}
	f, err := FitLaw(p, Choice{Law: limb.Linear})
	// 1-I is 0.6, 0.1 where 1-mu is 1, 0.5: u = (0.6 + 0.05) / 1.25.
	if err != nil || math.Abs(f.Law.Coefficients[0]-0.52) > 1e-15 || math.Abs(f.Largest+0.16) > 1e-15 || f.LargestMu != 0.5 ||
		math.Abs(f.RMS-math.Sqrt((0.08*0.08+0.16*0.16)/3)) > 1e-15 || math.Abs(f.Mean-(0.08*0.125-0.16*0.5)) > 1e-15 {
		t.Errorf("%+v, error %v", f, err)
	}
	f, err = FitLaw(p, Choice{Law: limb.Linear, Weight: WeightArea})
	// Areas 1/8, 1/2, 3/8.
	if want := (0.6/8 + 0.05/2) / (1./8 + 0.25/2); err != nil || math.Abs(f.Law.Coefficients[0]-want) > 1e-15 {
		t.Errorf("%+v, error %v, expected %g", f, err, want)
	}
}

func TestFitErrors(t *testing.T) {
	good := profileOf(limb.Law{Name: limb.Linear, Coefficients: []float64{0.5}}, 10)
	for want, c := range map[string]Choice{
		"no limb-darkening law \"cubic\"": {Law: "cubic"},
		"Grid is \"r\"":                   {Grid: "r"},
		"Weight is \"flux\"":              {Weight: "flux"},
		"Points is 1":                     {Points: 1},
		"MuCut is 1,":                     {MuCut: 1},
		"1 places off the centre":         {MuCut: 0.85},
		"2 places off the centre of the disc are left, expected at least 4": {Law: limb.FourParameter, MuCut: 0.75},
	} {
		_, err := FitLaw(good, c)
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%+v: got error %v, expected %s", c, err, want)
		}
	}
	// A step at the centre asks for an exponent without end.
	step := Profile{Mu: []float64{0.1, 0.5, 0.9, 1}, Intensity: []float64{0.5, 0.5, 0.5, 1}}
	if _, err := FitLaw(step, Choice{Law: limb.Power2}); err == nil || !strings.Contains(err.Error(), "is not within 0.01 to 50") {
		t.Errorf("got error %v for a step at the centre", err)
	}
	for want, p := range map[string]Profile{
		"0 values of mu":              {},
		"1 intensities":               {Mu: []float64{0, 1}, Intensity: []float64{1}},
		"intensity NaN at mu 0.5":     {Mu: []float64{0, 0.5, 1}, Intensity: []float64{0.1, math.NaN(), 1}},
		"at mu 0.5 after 0.5":         {Mu: []float64{0.5, 0.5, 1}, Intensity: []float64{0.1, 0.2, 1}},
		"ends with intensity 1 at mu": {Mu: []float64{0, 0.9}, Intensity: []float64{0.5, 1}},
	} {
		if _, err := FitLaw(p, Choice{}); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("got error %v, expected %s", err, want)
		}
	}
}

// model returns intensities of the quadratic law with coefficients linear in
// wavelength, on three wavelengths.
func model() Intensities {
	t := Intensities{Wave: []float64{1, 2, 4}}
	for i := range 21 {
		t.Mu = append(t.Mu, float64(i)/20)
	}
	for _, w := range t.Wave {
		var row []float64
		for _, mu := range t.Mu {
			row = append(row, (10-w)*limb.Law{Name: limb.Quadratic, Coefficients: []float64{0.8 / w, 0.1}}.Intensity(mu))
		}
		t.Value = append(t.Value, row)
	}
	return t
}

func TestCoefficients(t *testing.T) {
	channels := []lightcurve.Channel{{Lo: 1.2, Hi: 1.9}, {Lo: 2.1, Hi: 3.5}}
	table, fits, err := Coefficients(model(), Throughput{}, channels, Photons, Choice{})
	if err != nil || len(fits) != 2 || len(table.U1) != 2 || table.Law != limb.Quadratic {
		t.Fatal(table, fits, err)
	}
	for i := range channels {
		if fits[i].RMS > 1e-14 || table.U1[i] != fits[i].Law.Coefficients[0] || table.U1[i] > 0.8/channels[i].Lo || table.U1[i] < 0.8/channels[i].Hi {
			t.Errorf("channel %d: u1 = %g, %+v", i, table.U1[i], fits[i])
		}
		law, errs, err := table.LawAt(channels[i].Lo, channels[i].Hi)
		if err != nil || law.Coefficients[0] != table.U1[i] || len(errs) != 2 {
			t.Errorf("channel %d: %+v, %v, error %v", i, law, errs, err)
		}
	}
	table, _, err = Coefficients(model(), Throughput{}, channels, Energy, Choice{Law: limb.FourParameter})
	if law, _, err2 := table.LawAt(1.2, 1.9); err != nil || err2 != nil || len(law.Coefficients) != 4 {
		t.Errorf("four-parameter law: %+v, errors %v, %v", law, err, err2)
	}
	table, _, err = Coefficients(model(), Throughput{}, channels, Energy, Choice{Law: limb.Linear})
	if u1, u2, _, _, ok := table.At(1.2, 1.9); err != nil || !ok || u1 < 0.3 || u2 != 0 {
		t.Errorf("linear law: %g, %g, %v, error %v", u1, u2, ok, err)
	}
	for want, call := range map[string]func() error{
		"the uniform law has none": func() error {
			_, _, err := Coefficients(model(), Throughput{}, channels, Energy, Choice{Law: limb.Uniform})
			return err
		},
		"channel 0: limb darkening in a": func() error {
			_, _, err := Coefficients(model(), Throughput{}, []lightcurve.Channel{{Lo: 0.5, Hi: 2}}, Energy, Choice{})
			return err
		},
		"the table has no rows": func() error { _, _, err := Coefficients(model(), Throughput{}, nil, Energy, Choice{}); return err },
	} {
		if err := call(); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("got error %v, expected %s", err, want)
		}
	}
}
