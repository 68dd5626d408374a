package orbit

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestEclipse checks times against separations: contacts are where the separation
// says, behind the star, with and without the time that light takes.
func TestEclipse(t *testing.T) {
	rng := rand.New(rand.NewPCG(31, 32))
	found := 0
	for i := range 2000 {
		r := 0.2 * rng.Float64()
		o := randomTransit(rng, r)
		if i%2 == 1 {
			o.StarRadius = math.Min(2, 0.05/speedAt(o, 1))
		}
		e, err := o.Eclipse(r)
		if err != nil {
			t.Fatal(err)
		}
		p := o.Path()
		x, y, depth := p.Sky(e.After)
		// How far the planet gets in a rounding of the time.
		slack := 1e-15*o.AxisRatio + 8e-16*2*math.Pi*o.AxisRatio/math.Sqrt((1-o.Eccentricity)/(1+o.Eccentricity))
		if math.Abs(x) > slack || math.Abs(math.Abs(y)-e.ImpactParameter) > slack || depth > 0 || math.Abs(e.Phase*o.Period-e.After) > 1e-15*o.Period {
			t.Errorf("%+v: at mid-eclipse the planet is at %g, %g, %g, %+v", o, x, y, depth, e)
		}
		if !e.Contacts.Transit {
			continue
		}
		found++
		for _, at := range []float64{e.Contacts.First, e.Contacts.Fourth} {
			if z, front := p.Separation(e.After + at); math.Abs(z-1-r) > slack || front {
				t.Errorf("%+v: z = %g, in front %v at a contact of the eclipse", o, z, front)
			}
		}
	}
	if found < 500 {
		t.Errorf("only %d eclipses", found)
	}
	// A circular orbit: half a period, and light takes 2a/c.
	o := Orbit{Period: 3, AxisRatio: 9, Inclination: 1.53, StarRadius: 1.2}
	e, err := o.Eclipse(0.1)
	delay := 2 * 9 * math.Sin(1.53) * 1.2 * 6.957e8 / 299792458 / 86400
	if err != nil || math.Abs(e.After-1.5-delay) > 1e-14 {
		t.Errorf("%+v, error %v, expected light to take %g d", e, err, delay)
	}
	t14, _ := o.Duration(0.1)
	if d := e.Contacts.Fourth - e.Contacts.First; math.Abs(d-t14) > 1e-6*t14 {
		t.Errorf("eclipse of %g d, transit of %g d", d, t14)
	}
	// Eccentric, to first order in e (Winn 2010).
	o = Orbit{Period: 3, AxisRatio: 9, Inclination: math.Pi / 2, Eccentricity: 1e-4, Periastron: 0.7}
	e, err = o.Eclipse(0.1)
	t14, _ = o.Duration(0.1)
	d := e.Contacts.Fourth - e.Contacts.First
	if err != nil || math.Abs(math.Pi/2*(e.Phase-0.5)-1e-4*math.Cos(0.7)) > 1e-8 || math.Abs((d-t14)/(d+t14)-1e-4*math.Sin(0.7)) > 1e-6 {
		t.Errorf("%+v, error %v: e cos w = %g, e sin w = %g", e, err, math.Pi/2*(e.Phase-0.5), (d-t14)/(d+t14))
	}
	if _, err := o.Eclipse(-1); err == nil {
		t.Error("no error for a negative radius")
	}
}

// speedAt returns the speed at periastron, in that of light, around a star of the
// given radius.
func speedAt(o Orbit, solarRadii float64) float64 {
	o.StarRadius = solarRadii
	return o.speed()
}
