package fit

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/transit"
)

// TestChain compares the analytic change of the transit model's arguments with
// each coordinate, in every parameterisation, with finite differences.
func TestChain(t *testing.T) {
	setup := Setup{Period: 3, MidTransit: 100, AxisRatio: 9, Inclination: 87, Eccentricity: 0.3, Periastron: 40, RadiusRatio: 0.1}
	arguments := func(p transit.Params) [9]float64 {
		o := p.Orbit
		return [9]float64{o.Period, o.MidTransit, o.AxisRatio, o.Inclination, o.Eccentricity, o.Periastron, p.RadiusRatio, p.Law.Coefficients[0], p.Law.Coefficients[1]}
	}
	for _, names := range [][]string{
		{"inclination", "u1", ""}, {"impact", "u1", ""}, {"inclination", "q1", ""}, {"impact", "q1", ""},
		{"impact", "q1", LawSquareRoot}, {"impact", "q1", LawLogarithmic}, {"impact", "q1", LawPower2}, {"impact", "u1", LawPower2},
	} {
		setup.LimbLaw = names[2]
		s := newSpace(setup)
		s.value[slotLimb1], s.value[slotLimb2] = 0.4, 0.2
		s.rename(slotShape, names[0])
		s.rename(slotLimb1, names[1])
		for slot := range slotSettling {
			h := 1e-6 * max(1e-2, math.Abs(s.value[slot]))
			up, down := s.value, s.value
			up[slot] += h
			down[slot] -= h
			a, b := arguments(s.physical(&up)), arguments(s.physical(&down))
			got := s.chain(&s.value, slot)
			for k := range got {
				want := (a[k] - b[k]) / (2 * h)
				if math.Abs(got[k]-want) > 1e-6*max(1, math.Abs(want)) {
					t.Errorf("%v: derivative of argument %d in %s: %g, want %g", names, k, s.name[slot], got[k], want)
				}
			}
		}
	}
}

// TestRename checks that changing the parameterisation does not change the
// light curve, and that named values and coordinates are inverse.
func TestRename(t *testing.T) {
	s := newSpace(Setup{Period: 3, MidTransit: 100, AxisRatio: 9, Inclination: 87, Eccentricity: 0.3, Periastron: 40, RadiusRatio: 0.1})
	s.value[slotLimb1], s.value[slotLimb2] = 0.4, 0.2
	before := s.physical(&s.value)
	s.rename(slotShape, "impact")
	s.rename(slotLimb1, "q1")
	after := s.physical(&s.value)
	if math.Abs(after.Orbit.Inclination-before.Orbit.Inclination) > 1e-12 || math.Abs(after.Law.Coefficients[0]-0.4) > 1e-12 || math.Abs(after.Law.Coefficients[1]-0.2) > 1e-12 {
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
		s := newSpace(Setup{Period: 3, AxisRatio: 9, Inclination: 87, RadiusRatio: 0.1})
		_, err := s.apply(c.priors, true)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%+v: error %v, want %q", c.priors, err, c.want)
		}
	}
}

func TestApplyUnits(t *testing.T) {
	s := newSpace(Setup{Period: 3, MidTransit: 100, AxisRatio: 9, Inclination: 87, RadiusRatio: 0.1})
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
	if got := s.physical(&s.value).Orbit.Inclination; math.Abs(got-1.5) > 1e-12 {
		t.Errorf("inclination %g rad, want 1.5", got)
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
		s := newSpace(Setup{Period: 3, AxisRatio: 9, Inclination: 87, RadiusRatio: 0.1})
		if _, err := s.apply(Priors{uniform("inclination", c.a, c.b)}, false); err != nil {
			t.Fatal(err)
		}
		if lo, hi := s.limits(slotShape); math.Abs(lo-c.lo) > 1e-12 || math.Abs(hi-c.hi) > 1e-12 {
			t.Errorf("inclination in [%g, %g]: cos² in [%g, %g], want [%g, %g]", c.a, c.b, lo, hi, c.lo, c.hi)
		}
	}
}
