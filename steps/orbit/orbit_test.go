package orbit

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// orbits are those of the check values.
func orbits() map[string]Orbit {
	deg := math.Pi / 180
	return map[string]Orbit{
		"A": {Period: 3, AxisRatio: 8, Inclination: 87 * deg, Periastron: 90 * deg},
		"B": {Period: 10, AxisRatio: 20, Inclination: 89.25 * deg, Eccentricity: 0.3, Periastron: 60 * deg},
		"C": {Period: 1.5, AxisRatio: 3.5, Inclination: 75.5 * deg, Periastron: 90 * deg},
		"D": {Period: 50, AxisRatio: 60, Inclination: 89.5 * deg, Eccentricity: 0.7, Periastron: 240 * deg},
		"E": {Period: 4, AxisRatio: 10, Inclination: 84.75 * deg, Eccentricity: 0.1, Periastron: 0},
	}
}

func TestSeparation(t *testing.T) {
	worst := 0.0
	for _, row := range readTable(t, "geometry/lightcurve_orbit.csv") {
		o := orbits()[row["orbit"]]
		z, front := o.Separation(number(t, row["t_minus_conjunction_d"]))
		d := math.Abs(z-number(t, row["z"])) / o.AxisRatio
		worst = max(worst, d)
		// Rounding of the angles, amplified on the very eccentric orbit.
		if d > 4e-15 || front != (row["in_front"] == "1") {
			t.Errorf("orbit %s, t = %s: z = %.17g, front %v, expected %s, %s", row["orbit"], row["t_minus_conjunction_d"], z, front, row["z"], row["in_front"])
		}
	}
	t.Logf("largest error %.2g semi-major axes", worst)
	for name, o := range orbits() {
		z, front := o.Separation(7 * o.Period)
		if math.Abs(z-o.ImpactParameter()) > 1e-13*o.AxisRatio || !front {
			t.Errorf("orbit %s: at mid-transit z = %.17g, expected the impact parameter %.17g", name, z, o.ImpactParameter())
		}
		if _, front := o.Separation(o.Period / 2); front && o.Eccentricity < 0.5 {
			t.Errorf("orbit %s: in front half a period after mid-transit", name)
		}
	}
}

// TestSeparationGradient compares with central differences.
func TestSeparationGradient(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		o := Orbit{
			Period: 1 + 9*rng.Float64(), MidTransit: rng.Float64(), AxisRatio: 12 + 20*rng.Float64(), Inclination: 0.2 + 2.7*rng.Float64(),
			Eccentricity: 0.9 * rng.Float64(), Periastron: 7 * (rng.Float64() - 0.5),
		}
		circular := rng.Float64() < 0.1
		if circular {
			o.Eccentricity = 0
		}
		at := o.MidTransit + 3*o.Period*(rng.Float64()-0.5)
		z, front, grad := o.SeparationGradient(at)
		if z0, front0 := o.Separation(at); math.Abs(z-z0) > 1e-14*o.AxisRatio || front != front0 {
			t.Fatalf("%+v: z = %g, %v with gradient and %g, %v without", o, z, front, z0, front0)
		}
		if z < 0.05 {
			continue // near the kink
		}
		for j := range grad {
			h := 1e-6
			shift := func(s float64) float64 {
				p := o
				*[]*float64{&p.Period, &p.MidTransit, &p.AxisRatio, &p.Inclination, &p.Eccentricity, &p.Periastron}[j] += s
				z, _ := p.Separation(at)
				return z
			}
			want := (8*(shift(h)-shift(-h)) - (shift(2*h) - shift(-2*h))) / (12 * h)
			if j == 4 && circular { // one side only
				want = (-3*shift(0) + 4*shift(h) - shift(2*h)) / (2 * h)
			}
			// Rounding over the step; a step in time is large where e is.
			if tolerance := 2e-8 * (1 + math.Abs(want)) * o.AxisRatio / (1 - o.Eccentricity); math.Abs(grad[j]-want) > tolerance {
				t.Errorf("%+v, t = %g: derivative %d is %.10g, by differences %.10g", o, at, j, grad[j], want)
			}
		}
	}
	// At a separation of zero.
	o := Orbit{Period: 1, AxisRatio: 10, Inclination: math.Pi / 2}
	if z, _, grad := o.SeparationGradient(0); math.Abs(z) > 1e-14 || slopeNaN(grad) {
		t.Errorf("at the centre z = %g, gradient %v", z, grad)
	}
}

func slopeNaN(grad [6]float64) bool {
	for _, g := range grad {
		if math.IsNaN(g) || math.IsInf(g, 0) {
			return true
		}
	}
	return false
}

func TestStellarDensity(t *testing.T) {
	for _, row := range readTable(t, "geometry/stellar_density.csv") {
		got, want := StellarDensity(number(t, row["P_d"]), number(t, row["a_over_R"])), number(t, row["rho_kg_m3"])
		if math.Abs(got/want-1) > 1e-14 {
			t.Errorf("P = %s d, a/R = %s: density %.15g, expected %.15g", row["P_d"], row["a_over_R"], got, want)
		}
	}
}

func TestValidate(t *testing.T) {
	good := orbits()["B"]
	if err := good.Validate(); err != nil {
		t.Fatal(err)
	}
	nan := math.NaN()
	for want, bad := range map[string]func(o *Orbit){
		"Period":       func(o *Orbit) { o.Period = 0 },
		"MidTransit":   func(o *Orbit) { o.MidTransit = math.Inf(1) },
		"AxisRatio":    func(o *Orbit) { o.AxisRatio = 0.5 },
		"Inclination":  func(o *Orbit) { o.Inclination = 87 }, // degrees
		"Eccentricity": func(o *Orbit) { o.Eccentricity = 1 },
		"Periastron":   func(o *Orbit) { o.Periastron = nan },
	} {
		o := good
		bad(&o)
		if err := o.Validate(); err == nil || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), "must") {
			t.Errorf("%s: got error %v", want, err)
		}
	}
}

// BenchmarkSeparation takes places during a transit and a quarter of a period
// later, on a circular and an eccentric orbit.
func BenchmarkSeparation(b *testing.B) {
	for name, o := range map[string]Orbit{"circular": orbits()["A"], "eccentric": orbits()["B"]} {
		for place, start := range map[string]float64{"transit": 0, "quarter": o.Period / 4} {
			p, at, sum := o.Path(), start, 0.0
			next := func() float64 {
				if at += 1e-4; at > start+0.1 {
					at = start - 0.1
				}
				return at
			}
			b.Run(name+"/"+place+"/value", func(b *testing.B) {
				for b.Loop() {
					z, _ := p.Separation(next())
					sum += z
				}
			})
			b.Run(name+"/"+place+"/gradient", func(b *testing.B) {
				for b.Loop() {
					z, _, _ := p.SeparationGradient(next(), at)
					sum += z
				}
			})
		}
	}
}
