package fit

import (
	"math"
	"strings"
	"testing"
)

// TestChain compares the analytic change of the transit model's arguments with
// each coordinate, in every parameterisation, with finite differences.
func TestChain(t *testing.T) {
	model := Model{Period: 3, MidTransit: 100, AxisRatio: 9, Inclination: 87, Eccentricity: 0.3, Periastron: 40, RadiusRatio: 0.1, Companion: 0.05}
	for _, names := range [][]string{
		{""}, {"", "impact"}, {"", "q1"}, {"", "impact", "q1"}, {LawSquareRoot, "impact", "q1"}, {LawLogarithmic, "impact", "q1"},
		{LawPower2, "impact", "q1"}, {LawPower2, "impact"}, {LawUniform}, {LawLinear}, {LawThreeParameter}, {LawFourParameter, "ecosw"},
		{"", "stellarDensity"}, {"", "stellarDensity", "impact", "secosw"}, {"", "duration"}, {"", "duration", "impact"},
		{"", "duration", "ecosw"}, {"", "duration", "impact", "secosw"}, {"", "impact", "ecosw"}, {"", "secosw"},
	} {
		model.LimbLaw = names[0]
		s := newSpace(model)
		s.value[slotLimb1], s.value[slotLimb2], s.value[slotLimb3], s.value[slotLimb4] = 0.4, 0.2, 0.05, -0.1
		for _, name := range names[1:] {
			p, err := findName(name)
			if err != nil {
				t.Fatal(err)
			}
			s.rename(p.slot, name)
		}
		at := func(v *[slots]float64) []float64 {
			p, err := s.physical(v)
			if err != nil {
				t.Fatal(err)
			}
			o := p.Orbit
			return append(append([]float64{o.Period, o.MidTransit, o.AxisRatio, o.Inclination, o.Eccentricity, o.Periastron, p.RadiusRatio}, p.Law.Coefficients...), p.Companion)
		}
		_, chain, err := s.physicalChain(&s.value)
		if err != nil {
			t.Fatal(err)
		}
		for slot := range slotSettling {
			if !s.exists(slot) {
				continue
			}
			h := 1e-6 * max(1e-2, math.Abs(s.value[slot]))
			up, down := s.value, s.value
			up[slot] += h
			down[slot] -= h
			a, b := at(&up), at(&down)
			for k := range a {
				want := (a[k] - b[k]) / (2 * h)
				if got := chain[slot][k]; math.Abs(got-want) > 1e-5*max(1, math.Abs(want)) {
					t.Errorf("%v: derivative of argument %d in %s: %g, want %g", names, k, s.name[slot], got, want)
				}
			}
		}
	}
}

// TestRename checks that changing the parameterisation does not change the
// light curve, and that named values and coordinates are inverse.
func TestRename(t *testing.T) {
	s := newSpace(Model{Period: 3, MidTransit: 100, AxisRatio: 9, Inclination: 87, Eccentricity: 0.3, Periastron: 40, RadiusRatio: 0.1})
	s.value[slotLimb1], s.value[slotLimb2] = 0.4, 0.2
	before, _ := s.physical(&s.value)
	s.rename(slotTilt, "impact")
	s.rename(slotLimb1, "q1")
	s.rename(slotSize, "duration")
	s.rename(slotShape2, "sesinw")
	after, _ := s.physical(&s.value)
	if math.Abs(after.Orbit.Inclination-before.Orbit.Inclination) > 1e-11 || math.Abs(after.Orbit.AxisRatio-before.Orbit.AxisRatio) > 1e-10 || math.Abs(after.Orbit.Periastron-before.Orbit.Periastron) > 1e-12 || math.Abs(after.Law.Coefficients[0]-0.4) > 1e-12 || math.Abs(after.Law.Coefficients[1]-0.2) > 1e-12 {
		t.Errorf("%+v became %+v", before, after)
	}
	for slot, x := range s.value {
		named, slope := s.named(slot, x)
		if back := s.coordinate(slot, named); math.Abs(back-x) > 1e-12 {
			t.Errorf("%s: %g became %g", s.name[slot], x, back)
		}
		const h = 1e-7
		up, _ := s.named(slot, x+h)
		down, _ := s.named(slot, x-h)
		if x > h && math.Abs((up-down)/(2*h)-slope) > 1e-5*max(1, math.Abs(slope)) {
			t.Errorf("%s: slope %g, want %g", s.name[slot], slope, (up-down)/(2*h))
		}
	}
}

func TestApplyErrors(t *testing.T) {
	for _, c := range []struct {
		priors Priors
		want   string
	}{
		{Priors{uniform("radiusRatoi", 0, 1)}, `unknown parameter "radiusRatoi"; nearest known name: radiusRatio`},
		{Priors{uniform("inclination", 80, 90), uniform("impact", 0, 1)}, "both inclination and impact have priors"},
		{Priors{uniform("midTransit", 0, 1), uniform("midTransitOffset", 0, 1)}, "both midTransit and midTransitOffset"},
		{Priors{uniform("u1", 0, 1), uniform("q2", 0, 1)}, "both u1 and q2 have priors; use u1 and u2, or q1 and q2"},
		{Priors{uniform("u1", 0, 1), uniform("q1", 0, 1)}, "both u1 and q1 have priors"},
		{Priors{uniform("period", 1, 2), uniform("period", 1, 2)}, "period has two priors"},
		{Priors{uniform("period", 2, 1)}, "expected U(a, b) with a < b"},
		{Priors{uniform("period", -2, -1)}, "leaves no room"},
		{Priors{uniform("impact", -2, -1)}, "leaves no room"},
		{Priors{uniform("q1", -2, -1)}, "leaves no room"},
		{Priors{{Name: "radiusRatio", Kind: Normal, A: 0.1}}, "sd > 0"},
		{Priors{{Name: "radiusRatio", Kind: LogUniform, A: 0, B: 1}}, "0 < a < b"},
		{Priors{{Name: "radiusRatio", Kind: TruncatedNormal, A: 0, B: 1}}, "TN(mean, sd, a, b)"},
		{Priors{{Name: "radiusRatio", Kind: "G", A: 0, B: 1}}, `kind "G"; expected U, N, TN, logU or =`},
		{Priors{{Name: "radiusRatio", Kind: Uniform, A: 0, B: math.NaN()}}, "finite numbers"},
		{Priors{{Name: "radiusRatio", Kind: Fixed, A: -1}}, "outside its range"},
		{Priors{{Name: "eccentricity", Kind: Fixed, A: 1}}, "outside its range"},
		{Priors{{Name: "period", Kind: Uniform, A: 1, B: 2, Unit: "m"}}, `unit "m"; expected d`},
	} {
		s := newSpace(Model{Period: 3, AxisRatio: 9, Inclination: 87, RadiusRatio: 0.1})
		_, err := s.apply(c.priors, true)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%+v: error %v, want %q", c.priors, err, c.want)
		}
	}
}

func TestApplyUnits(t *testing.T) {
	s := newSpace(Model{Period: 3, MidTransit: 100, AxisRatio: 9, Inclination: 87, RadiusRatio: 0.1})
	_, err := s.apply(Priors{
		{Name: "midTransitOffset", Kind: Uniform, A: -30, B: 30, Unit: "min"},
		{Name: "inclination", Kind: Fixed, A: 1.5, Unit: "rad"},
		{Name: "settlingTime", Kind: TruncatedNormal, A: 1, B: 2, Lo: 0.5, Hi: 4, Unit: "h"},
	}, true)
	if err != nil {
		t.Fatal(err)
	}
	if lo, hi := s.limits(slotMid); math.Abs(lo+1./48) > 1e-15 || math.Abs(hi-1./48) > 1e-15 {
		t.Errorf("half an hour to either side is %g to %g d", lo, hi)
	}
	if p, _ := s.physical(&s.value); math.Abs(p.Orbit.Inclination-1.5) > 1e-12 {
		t.Errorf("inclination %g rad, want 1.5", p.Orbit.Inclination)
	}
	if p := s.prior[slotSettling]; p.Unit != "d" || math.Abs(p.B-2./24) > 1e-15 || math.Abs(math.Exp(s.value[slotSettling])-1./24) > 1e-15 {
		t.Errorf("prior %+v, start %g", p, s.value[slotSettling])
	}
}

func TestInclinationLimits(t *testing.T) {
	for _, c := range []struct{ a, b, lo, hi float64 }{
		{80, 90, leastShape, math.Pow(math.Cos(80*degree), 2)},
		{80, 95, leastShape, math.Pow(math.Cos(80*degree), 2)},
		{60, 80, math.Pow(math.Cos(80*degree), 2), 0.25},
		{95, 100, math.Pow(math.Cos(85*degree), 2), math.Pow(math.Cos(80*degree), 2)},
	} {
		s := newSpace(Model{Period: 3, AxisRatio: 9, Inclination: 87, RadiusRatio: 0.1})
		if _, err := s.apply(Priors{uniform("inclination", c.a, c.b)}, false); err != nil {
			t.Fatal(err)
		}
		if lo, hi := s.limits(slotTilt); math.Abs(lo-c.lo) > 1e-12 || math.Abs(hi-c.hi) > 1e-12 {
			t.Errorf("inclination in [%g, %g]: cos² in [%g, %g], want [%g, %g]", c.a, c.b, lo, hi, c.lo, c.hi)
		}
	}
}
