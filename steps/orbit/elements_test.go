package orbit

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// bases are all choices of parameters.
func bases() (all []Basis) {
	for _, size := range []string{ByAxisRatio, ByDensity, ByDuration} {
		for _, tilt := range []string{ByInclination, ByImpact} {
			for _, shape := range []string{ByPolar, ByVector, ByRoot} {
				all = append(all, Basis{size, tilt, shape})
			}
		}
	}
	return all
}

// randomTransit returns an orbit with a transit that is not close to grazing.
func randomTransit(rng *rand.Rand, radiusRatio float64) Orbit {
	e := 0.9 * rng.Float64() * rng.Float64()
	o := Orbit{Period: math.Pow(10, 3*rng.Float64()-0.5), MidTransit: rng.Float64(), Eccentricity: e, Periastron: 2 * math.Pi * (rng.Float64() - 0.5)}
	o.AxisRatio = (1.5 + radiusRatio + 40*rng.Float64()*rng.Float64()) / (1 - e)
	o.Inclination = math.Acos(0.95 * (1 + radiusRatio) * rng.Float64() / (o.AxisRatio * o.near()))
	return o
}

func TestElementsBothWays(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 12))
	for _, b := range bases() {
		for range 100 {
			r := 0.2 * rng.Float64()
			o := randomTransit(rng, r)
			e, err := o.Elements(b, r)
			if err != nil {
				t.Fatalf("%+v, %v: %v", o, b, err)
			}
			back, err := e.Orbit()
			if err != nil {
				t.Fatalf("%+v, %v: %v", o, b, err)
			}
			// Where transits are nearly central the inclination is lost in cos i.
			tolerance := 1e-12
			if b.Size == ByDuration {
				tolerance = 1e-11
			}
			for i, pair := range [][2]float64{
				{back.Period, o.Period}, {back.MidTransit, o.MidTransit}, {back.AxisRatio / o.AxisRatio, 1}, {o.AxisRatio * math.Cos(back.Inclination), o.AxisRatio * math.Cos(o.Inclination)},
				{back.Eccentricity * math.Cos(back.Periastron), o.Eccentricity * math.Cos(o.Periastron)}, {back.Eccentricity * math.Sin(back.Periastron), o.Eccentricity * math.Sin(o.Periastron)},
			} {
				if !(math.Abs(pair[0]-pair[1]) <= tolerance) {
					t.Errorf("%+v, %v: value %d comes back as %.17g, was %.17g", o, b, i, pair[0], pair[1])
				}
			}
		}
	}
}

// TestJacobian compares with differences of sixth order.
func TestJacobian(t *testing.T) {
	rng := rand.New(rand.NewPCG(13, 14))
	worst := 0.0
	for _, b := range bases() {
		for n := range 30 {
			r := 0.02 + 0.2*rng.Float64()
			o := randomTransit(rng, r)
			if n == 0 && b.Shape == ByVector { // regular there
				o.Inclination = math.Acos(o.ImpactParameter() / o.AxisRatio)
				o.Eccentricity = 0
			}
			e, err := o.Elements(b, r)
			if err != nil {
				t.Fatal(err)
			}
			o, j, err := e.Jacobian()
			if err != nil {
				t.Fatalf("%+v: %v", e, err)
			}
			values := func(e Elements) (v [6]float64) {
				o, err := e.Orbit()
				if err != nil {
					t.Fatalf("%+v: %v", e, err)
				}
				return [6]float64{o.Period, o.MidTransit, o.AxisRatio, o.Inclination, o.Eccentricity * math.Cos(o.Periastron), o.Eccentricity * math.Sin(o.Periastron)}
			}
			for k := range 7 {
				shifted := func(h float64) [6]float64 {
					e := e
					*[]*float64{&e.Period, &e.MidTransit, &e.Size, &e.Tilt, &e.Shape[0], &e.Shape[1], &e.RadiusRatio}[k] += h
					return values(e)
				}
				h := 3e-4
				switch {
				case k == 2:
					h *= e.Size
				case k == 3 && b.Tilt == ByInclination:
					h = 1e-3 / o.AxisRatio
				case k >= 4 && k < 6:
					h *= 1 - o.Eccentricity
				}
				if k == 3 && b.Tilt == ByImpact && e.Tilt < 4*h || b.Shape == ByPolar && k == 4 && e.Shape[0] < 4*h {
					continue
				}
				if near := math.Abs(1.0+r-o.ImpactParameter()) / (1 + r); near < 0.1 || k == 3 && o.Inclination > math.Pi/2-3*h {
					continue
				}
				a, b1, c := shifted(h), shifted(2*h), shifted(3*h)
				d, f, g := shifted(-h), shifted(-2*h), shifted(-3*h)
				for i := range 6 {
					want := (45*(a[i]-d[i]) - 9*(b1[i]-f[i]) + c[i] - g[i]) / (60 * h)
					scale := math.Abs(want) + math.Abs(j[i][k]) + 1e-3
					if i == 2 {
						scale += o.AxisRatio
					}
					relative := math.Abs(j[i][k]-want) / scale
					worst = max(worst, relative)
					if relative > 1e-7 {
						t.Errorf("%+v: derivative of %d by %d is %.12g, by differences %.12g", e, i, k, j[i][k], want)
					}
				}
			}
		}
	}
	t.Logf("largest relative difference %.2g", worst)
}

func TestElementsErrors(t *testing.T) {
	good := Elements{Period: 3, Size: 9, Tilt: 1.5}
	if _, err := good.Orbit(); err != nil {
		t.Fatal(err)
	}
	for want, change := range map[string]func(e *Elements){
		`Size of the basis is "a/R", expected one of`:  func(e *Elements) { e.Basis.Size = "a/R" },
		`Tilt of the basis is "b"`:                     func(e *Elements) { e.Basis.Tilt = "b" },
		`Shape of the basis is "h"`:                    func(e *Elements) { e.Basis.Shape = "h" },
		"Period is 0 days":                             func(e *Elements) { e.Period = 0 },
		"AxisRatio is NaN":                             func(e *Elements) { e.Size = math.NaN() },
		"Inclination is 87":                            func(e *Elements) { e.Tilt = 87 },
		"Eccentricity is 1.28":                         func(e *Elements) { e.Basis.Shape, e.Shape = ByRoot, [2]float64{0.8, 0.8} },
		"Eccentricity is +Inf":                         func(e *Elements) { e.Basis.Shape, e.Shape = ByVector, [2]float64{math.Inf(1), 0} },
		"the impact parameter is -0.1, must":           func(e *Elements) { e.Basis.Tilt, e.Tilt = ByImpact, -0.1 },
		"passes the star at only 9 stellar":            func(e *Elements) { e.Basis.Tilt, e.Tilt = ByImpact, 9.5 },
		"the stellar density is -1":                    func(e *Elements) { e.Basis.Size, e.Size = ByDensity, -1 },
		"no orbit has a transit of 2 days; with these": func(e *Elements) { e.Basis.Size, e.Size = ByDuration, 2 },
		"no orbit has a transit of 0 days":             func(e *Elements) { e.Basis.Size, e.Size = ByDuration, 0 },
		"RadiusRatio is -1":                            func(e *Elements) { e.Basis.Size, e.Size, e.RadiusRatio = ByDuration, 0.1, -1 },
		"lasts more than 0 and at most 0":              func(e *Elements) { e.Basis.Size, e.Basis.Tilt, e.Size, e.Tilt = ByDuration, ByImpact, 0.1, 1.2 },
		"the planet meets the star at periastron":      func(e *Elements) { e.Shape[0] = 0.95 },
		"the planet moves at 0.1":                      func(e *Elements) { e.StarRadius = 300 },
		"the orbit is seen face-on":                    func(e *Elements) { e.Basis.Tilt, e.Tilt = ByImpact, 9 },
		"asks for an axis ratio above 1e+12":           func(e *Elements) { e.Basis.Size, e.Basis.Tilt, e.Size, e.Tilt = ByDuration, ByImpact, 1e-13, 0 },
	} {
		e := good
		change(&e)
		_, _, err := e.Jacobian()
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("got error %v, expected %s", err, want)
		}
	}
	if _, err := (Orbit{Period: 3, AxisRatio: 9, Inclination: 1}).Elements(Basis{Size: ByDuration}, 0.1); err == nil || !strings.Contains(err.Error(), "there is no transit") {
		t.Errorf("duration without a transit: error %v", err)
	}
}

func BenchmarkElementsDuration(b *testing.B) {
	o := orbits()["B"]
	e, err := o.Elements(Basis{ByDuration, ByImpact, ByRoot}, 0.1)
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		e.Jacobian()
	}
}

// TestElementsHard goes through the corners of the domain: nearly circular and
// nearly parabolic orbits, close ones, central and grazing transits. Durations lead
// back to the axis ratio, as well as grazing lets them, or there is an error, and
// derivatives are numbers.
func TestElementsHard(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 15))
	done := 0
	for range 4000 {
		r, e := 0.3*rng.Float64(), []float64{0, 1e-12, 1e-4, 0.3, 0.9, 0.99, 0.999}[rng.IntN(7)]
		o := Orbit{Period: math.Pow(10, 3*rng.Float64()-0.5), Eccentricity: e, Periastron: []float64{0, math.Pi / 2, -math.Pi / 2, math.Pi, 6 * rng.Float64()}[rng.IntN(5)]}
		o.AxisRatio = (1 + math.Pow(10, 3*rng.Float64()-2)) / (1 - e)
		b := (1 + r) * []float64{0, rng.Float64(), 1 - 1e-3*rng.Float64(), 1 - 1e-9}[rng.IntN(4)]
		o.Inclination = math.Acos(math.Min(1, b/(o.AxisRatio*o.near())))
		for _, tilt := range []string{ByImpact, ByInclination} {
			elements, err := o.Elements(Basis{ByDuration, tilt, ByRoot}, r)
			if err != nil {
				if !strings.Contains(err.Error(), "touches the star beside it") && !strings.Contains(err.Error(), "there is no transit") {
					t.Errorf("%+v: %v", o, err)
				}
				continue
			}
			back, j, err := elements.Jacobian()
			if err != nil {
				if o.Inclination > 0 {
					t.Errorf("%+v: %v", o, err)
				}
				continue
			}
			done++
			for _, row := range j {
				for _, x := range row {
					if math.IsNaN(x) || math.IsInf(x, 0) {
						t.Errorf("%+v, %s: derivatives %v", o, tilt, j)
					}
				}
			}
			if d := math.Abs(back.AxisRatio/o.AxisRatio - 1); !(d <= 1e-9 || b > 0.99*(1+r)) {
				t.Errorf("%+v, %s: the axis ratio comes back as %.15g", o, tilt, back.AxisRatio)
			}
		}
	}
	if done < 3000 {
		t.Errorf("only %d", done)
	}
}
