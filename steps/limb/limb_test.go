package limb_test

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"

	"rimlight/steps/limb"
)

// rounding is a few units in the last place of numbers of order 1.
const rounding = 1e-15

func TestKippingTable(t *testing.T) {
	file, err := os.Open("../../testdata/geometry/kipping2013.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range rows[1:] {
		var v [4]float64
		for i := range v {
			if v[i], err = strconv.ParseFloat(row[i+1], 64); err != nil {
				t.Fatal(err)
			}
		}
		u1, u2 := limb.FromKipping(v[0], v[1])
		if math.Abs(u1-v[2]) > rounding || math.Abs(u2-v[3]) > rounding {
			t.Errorf("FromKipping(%g, %g) = %g, %g, want %g, %g", v[0], v[1], u1, u2, v[2], v[3])
		}
		q1, q2 := limb.ToKipping(v[2], v[3])
		if math.Abs(q1-v[0]) > rounding || (v[0] > 0 && math.Abs(q2-v[1]) > rounding) {
			t.Errorf("ToKipping(%g, %g) = %g, %g, want %g, %g", v[2], v[3], q1, q2, v[0], v[1])
		}
		if row[6] == "1" != (v[2] >= 0) || !limb.Physical(v[2]*(1-rounding), v[3]*(1-rounding)) && v[2] > 0 && v[3] > 0 {
			t.Errorf("row %v: not physical", row)
		}
	}
}

func TestKippingGradient(t *testing.T) {
	const step = 1e-6
	for _, q := range [][2]float64{{0.25, 0.5}, {0.7, 0.1}, {0.01, 0.9}, {1, 0}} {
		u1, u2, d := limb.FromKippingGradient(q[0], q[1])
		a1, a2 := limb.FromKipping(q[0]+step, q[1])
		b1, b2 := limb.FromKipping(q[0]-step, q[1])
		c1, c2 := limb.FromKipping(q[0], q[1]+step)
		e1, e2 := limb.FromKipping(q[0], q[1]-step)
		for i, numeric := range []float64{a1 - b1, c1 - e1, a2 - b2, c2 - e2} {
			if math.Abs(numeric/(2*step)-d[i]) > 1e-7 {
				t.Errorf("q = %v: derivative %d is %g, differences give %g", q, i, d[i], numeric/(2*step))
			}
		}
		if v1, v2 := limb.FromKipping(q[0], q[1]); v1 != u1 || v2 != u2 {
			t.Errorf("q = %v: values differ from FromKipping", q)
		}
	}
	if _, _, d := limb.FromKippingGradient(0, 0); d[0] != 0 || !math.IsInf(d[2], 1) {
		t.Errorf("derivatives at the origin: %v", d)
	}
}

func TestSquareIsPhysical(t *testing.T) {
	for q1 := 0.015625; q1 < 1; q1 += 0.0625 {
		for q2 := 0.015625; q2 < 1; q2 += 0.0625 {
			u1, u2 := limb.FromKipping(q1, q2)
			if !limb.Physical(u1, u2) {
				t.Fatalf("(%g, %g) maps to unphysical (%g, %g)", q1, q2, u1, u2)
			}
			previous := 0.0
			for mu := 0.0; mu <= 1; mu += 0.125 {
				i := limb.QuadraticIntensity(mu, u1, u2)
				if i < previous {
					t.Fatalf("intensity falls towards the centre at mu = %g for (%g, %g)", mu, u1, u2)
				}
				previous = i
			}
			if previous != 1 {
				t.Fatalf("intensity at the centre is %g", previous)
			}
		}
	}
	for _, u := range [][2]float64{{0.6, 0.5}, {-0.1, 0.3}, {0.5, -0.3}, {math.NaN(), 0}} {
		if limb.Physical(u[0], u[1]) {
			t.Errorf("%v counts as physical", u)
		}
	}
}
