package limbtable

import (
	"math"
	"strings"
	"testing"
)

// TestBand compares with integrals done by hand.
func TestBand(t *testing.T) {
	// At the centre 1, at mu = 1/2 the wavelength over 2: I = λ/2 between 1 and 2.
	table := Intensities{Wave: []float64{1, 2}, Mu: []float64{0.5, 1}, Value: [][]float64{{0.5, 1}, {1, 1}}}
	triangle := Throughput{Wave: []float64{1, 1.5, 2}, Value: []float64{0, 1, 0}}
	// ∫ T = 1/2, ∫ λT = 3/4, ∫ λ²T = 9/8 + 1/48; ∫ λ³T = 27/16 + 3/32.
	second := 9./8 + 1./48
	for _, c := range []struct {
		s            Throughput
		lo, hi       float64
		weight       string
		half, centre float64 // intensity at mu = 1/2, mean wavelength
	}{
		{Throughput{}, 1, 2, Energy, 0.75, 1.5},
		{Throughput{}, 1, 2, Photons, (7. / 3) / 3, (7. / 3) / 1.5},
		{Throughput{}, 1.25, 1.5, Energy, 1.375 / 2, 1.375},
		{triangle, 1, 2, Energy, 0.75, 1.5},
		{triangle, 1, 2, Photons, second / 1.5, second / 0.75},
		{triangle, 0.1, 100, Photons, second / 1.5, second / 0.75}, // no light outside
		{Throughput{Wave: []float64{1, 2}, Value: []float64{7, 7}}, 1, 2, Energy, 0.75, 1.5},
	} {
		p, err := Band(table, c.s, c.lo, c.hi, c.weight)
		if err != nil || math.Abs(p.Intensity[0]-c.half) > 1e-15 || p.Intensity[1] != 1 || math.Abs(p.Wave-c.centre) > 1e-15 || p.Lo != c.lo {
			t.Errorf("%+v: %+v, error %v", c, p, err)
		}
	}
	bad := func(change func(t *Intensities)) Intensities {
		other := Intensities{Wave: []float64{1, 2}, Mu: []float64{0.5, 1}, Value: [][]float64{{0.5, 1}, {1, 1}}}
		change(&other)
		return other
	}
	for want, c := range map[string]struct {
		t      Intensities
		s      Throughput
		lo, hi float64
		weight string
	}{
		`weight "", expected photons or energy`:    {table, Throughput{}, 1, 2, ""},
		"the band is 2 to 1 um":                    {table, Throughput{}, 2, 1, Energy},
		"expected all of 0.5 to 2 um":              {table, Throughput{}, 0.5, 2, Energy},
		"nothing of 3 to 4 um is let through":      {table, triangle, 3, 4, Energy},
		"nothing is let through at any":            {table, Throughput{[]float64{1, 2}, []float64{0, 0}}, 1, 2, Energy},
		"1 values for 2 wavelengths":               {table, Throughput{[]float64{1, 2}, []float64{0}}, 1, 2, Energy},
		"the largest mu is 0.9":                    {bad(func(t *Intensities) { t.Mu[1] = 0.9 }), triangle, 1, 2, Energy},
		"1 intensities at wavelength 2":            {bad(func(t *Intensities) { t.Value[1] = t.Value[1][:1] }), triangle, 1, 2, Energy},
		"intensity -1 at":                          {bad(func(t *Intensities) { t.Value[1][0] = -1 }), triangle, 1, 2, Energy},
		"Wave[1] is 1 after 1":                     {bad(func(t *Intensities) { t.Wave[1] = 1 }), triangle, 1, 2, Energy},
		"comes to 0":                               {bad(func(t *Intensities) { t.Value = [][]float64{{1, 0}, {1, 0}} }), triangle, 1, 2, Energy},
		"0 wavelengths, 0 values of mu and 0 rows": {Intensities{}, triangle, 1, 2, Energy},
	} {
		if _, err := Band(c.t, c.s, c.lo, c.hi, c.weight); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("got error %v, expected %s", err, want)
		}
	}
}
