package orbit

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"testing"
)

func TestContacts(t *testing.T) {
	b, err := os.ReadFile("../../testdata/geometry/contact_times.json")
	if err != nil {
		t.Fatal(err)
	}
	var cases map[string]struct {
		Orbit  struct{ K string }
		Btra   string `json:"b_tra"`
		TMin   string `json:"t_min"`
		T1     string
		T2, T3 *string
		T4     string
		T14    string  `json:"T14_exact"`
		T23    *string `json:"T23_exact"`
	}
	if err := json.Unmarshal(b, &cases); err != nil || len(cases) != 5 {
		t.Fatalf("%d cases, error %v", len(cases), err)
	}
	for name, c := range cases {
		o := orbits()[name]
		r := number(t, c.Orbit.K)
		k := o.Path()
		all := k.Contacts(r)
		contact, closest := [4]float64{all.First, all.Second, all.Third, all.Fourth}, all.Closest
		near := func(what string, got float64, want *string, tolerance float64) {
			t.Helper()
			if want == nil {
				if got > 0 || got < 0 {
					t.Errorf("orbit %s: %s is %g, expected none", name, what, got)
				}
				return
			}
			if w := number(t, *want); !(math.Abs(got-w) <= tolerance) {
				t.Errorf("orbit %s: %s is %.17g, expected %.17g", name, what, got, w)
			}
		}
		// The errors of the separations, through its rate.
		tolerance := 1e-14 * o.Period
		near("first contact", contact[0], &c.T1, tolerance)
		near("second contact", contact[1], c.T2, tolerance)
		near("third contact", contact[2], c.T3, tolerance)
		near("fourth contact", contact[3], &c.T4, tolerance)
		near("smallest separation", closest, &c.TMin, tolerance)
		near("impact parameter", o.ImpactParameter(), &c.Btra, 1e-14*o.AxisRatio)
		t14, t23 := o.Duration(r)
		near("T14", t14, &c.T14, tolerance)
		near("T23", t23, c.T23, tolerance)
	}
}

func TestDurationsCircular(t *testing.T) {
	for _, row := range readTable(t, "geometry/durations_circular.csv") {
		period, a, r, b := number(t, row["P_d"]), number(t, row["a_over_R"]), number(t, row["k"]), number(t, row["b"])
		o := Orbit{Period: period, AxisRatio: a, Inclination: math.Acos(b / a)}
		t14, t23 := o.Duration(r)
		// Rounding of the inclination.
		if want := number(t, row["T14_d"]); math.Abs(t14-want) > 1e-12*period {
			t.Errorf("P = %g, a/R = %g, k = %g, b = %g: T14 = %.16g, expected %.16g", period, a, r, b, t14, want)
		}
		want := 0.0
		if row["T23_d"] != "" {
			want = number(t, row["T23_d"])
		}
		tolerance := 1e-12 * period
		if b == 1-r {
			tolerance = 1e-8 * period // second and third contact just fall together
		}
		if math.Abs(t23-want) > tolerance {
			t.Errorf("P = %g, a/R = %g, k = %g, b = %g: T23 = %.16g, expected %.16g", period, a, r, b, t23, want)
		}
	}
}

// TestSolarSystem checks durations of transits of Earth and Jupiter.
func TestSolarSystem(t *testing.T) {
	b, err := os.ReadFile("../../testdata/geometry/solar_system_transits.json")
	if err != nil {
		t.Fatal(err)
	}
	var file map[string]json.RawMessage
	if err := json.Unmarshal(b, &file); err != nil {
		t.Fatal(err)
	}
	for name, published := range map[string]float64{"earth": 13.0, "jupiter": 29.6, "jupiter_mean_radius": 29.6} {
		var c struct {
			Period    string `json:"P_days"`
			AxisRatio string `json:"a_over_R"`
			K         string
			T14       string `json:"T14_h"`
			T23       string `json:"T23_h"`
			Point     string `json:"T0_point_planet_h"`
		}
		if err := json.Unmarshal(file[name], &c); err != nil {
			t.Fatal(err)
		}
		o := Orbit{Period: number(t, c.Period), AxisRatio: number(t, c.AxisRatio), Inclination: math.Pi / 2}
		t14, t23 := o.Duration(number(t, c.K))
		point, _ := o.Duration(0)
		for i, pair := range [][2]float64{{24 * t14, number(t, c.T14)}, {24 * t23, number(t, c.T23)}, {24 * point, number(t, c.Point)}} {
			if math.Abs(pair[0]/pair[1]-1) > 1e-11 { // digits of the table
				t.Errorf("%s: duration %d is %.14g h, expected %.14g", name, i, pair[0], pair[1])
			}
		}
		if math.Abs(24*point-published) > 0.05 {
			t.Errorf("%s: a planet without size takes %g h, published is %g", name, 24*point, published)
		}
	}
}

// TestContactsAnywhere holds contacts of random orbits against a fine scan: no
// transit outside of the window and the contacts, none missed.
func TestContactsAnywhere(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	transits := 0
	for range 3000 {
		r := 0.3 * rng.Float64()
		e := 0.95 * rng.Float64() * rng.Float64()
		a := (1.05 + r) / (1 - e) * math.Exp(4*rng.Float64()*rng.Float64())
		o := Orbit{Period: 1, AxisRatio: a, Inclination: math.Pi/2 + (rng.Float64()-0.5)*3/a, Eccentricity: e, Periastron: 7 * rng.Float64()}
		k := o.Path()
		all := k.Contacts(r)
		contact, closest := [4]float64{all.First, all.Second, all.Third, all.Fourth}, all.Closest
		var w struct{ From, To float64 }
		w.From, w.To = k.Window(1 + r)
		if contact[0] < contact[3] {
			transits++
			if !(contact[0] <= closest && closest <= contact[3]) {
				t.Errorf("%+v, r = %g: closest at %g, contacts %v", o, r, closest, contact)
			}
			for _, c := range []float64{contact[0], contact[3]} {
				if z, _ := k.Separation(c); math.Abs(z-1-r) > 1e-12*a/(1-e) {
					t.Errorf("%+v, r = %g: at an outer contact, %g, z = %g", o, r, c, z)
				}
			}
		}
		for i := range 400 {
			at := -0.5 + float64(i)/400
			z, front := k.Separation(at)
			if !front || z > 1+r-1e-9 {
				continue
			}
			inside := func(from, to float64) bool {
				return at >= from && at <= to || at-1 >= from && at-1 <= to || at+1 >= from && at+1 <= to
			}
			if !inside(w.From, w.To) {
				t.Errorf("%+v, r = %g: transit at %g outside of the window %v", o, r, at, w)
			}
			if !inside(contact[0], contact[3]) {
				t.Errorf("%+v, r = %g: transit at %g, z = %g, outside of the contacts %v", o, r, at, z, contact)
			}
		}
	}
	if transits < 1000 {
		t.Errorf("only %d transits", transits)
	}
}

func BenchmarkContacts(b *testing.B) {
	k := orbits()["B"].Path()
	for b.Loop() {
		k.Contacts(0.1)
	}
}
