package simulate

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"
)

// TestBlockedTable compares with deficits computed to 20 digits.
func TestBlockedTable(t *testing.T) {
	file, err := os.Open("../../testdata/transit/flux_cases.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	q, worst := newRule(nodes), 0.0
	column := map[string]int{}
	for i, name := range rows[0] {
		column[name] = i
	}
	cases := 0
	for _, row := range rows[1:] {
		switch row[column["law"]] {
		case "uniform", "linear", "quadratic":
			cases++
		default:
			continue
		}
		value := func(name string) float64 {
			if row[column[name]] == "" {
				return 0 // a coefficient that the law does not have
			}
			x, err := strconv.ParseFloat(row[column[name]], 64)
			if err != nil {
				t.Fatal(err)
			}
			return x
		}
		r, z, want := value("r"), value("z"), value("deficit")
		got := q.blocked(r, z, value("u1"), value("u2"))
		worst = math.Max(worst, math.Abs(got-want))
		if math.Abs(got-want) > 1e-9 {
			t.Errorf("%s, r = %g, z = %g: blocked %.15g, expected %.15g", row[column["law"]], r, z, got, want)
		}
	}
	if cases < 100 {
		t.Errorf("%d cases; expected at least 100", cases)
	}
	t.Logf("largest error %.2g in %d cases", worst, cases)
}

// TestBlockedUniform compares with the closed form for a uniform disc: the
// area of the lens that two circles share.
func TestBlockedUniform(t *testing.T) {
	q := newRule(nodes)
	for _, r := range []float64{0.01, 0.1, 0.5, 0.9, 1.2} {
		for z := 0.0; z < 1.2+r; z += 0.0371 {
			want := lens(r, z) / math.Pi
			if got := q.blocked(r, z, 0, 0); math.Abs(got-want) > 1e-9 {
				t.Errorf("r = %g, z = %g: blocked %.12g, expected %.12g", r, z, got, want)
			}
		}
	}
}

// lens is the area common to circles of radius 1 and r at the distance z.
func lens(r, z float64) float64 {
	switch {
	case z >= 1+r:
		return 0
	case z <= math.Abs(1-r):
		return math.Pi * math.Pow(math.Min(1, r), 2)
	}
	a := math.Acos((z*z + r*r - 1) / (2 * z * r))
	b := math.Acos((z*z + 1 - r*r) / (2 * z))
	return r*r*(a-math.Sin(2*a)/2) + b - math.Sin(2*b)/2
}

// TestBlockedCentral compares with the closed form for a planet in the middle
// of the star: the integral of the intensity over a circle.
func TestBlockedCentral(t *testing.T) {
	q := newRule(nodes)
	for _, r := range []float64{0.05, 0.1, 0.3} {
		for _, u := range [][2]float64{{0.4, 0.3}, {0.6, 0}, {-0.1, 0.5}} {
			u1, u2 := u[0], u[1]
			m := math.Sqrt(1 - r*r)
			// The integral of 2 mu I(mu) from m to 1.
			anti := func(mu float64) float64 {
				c0, c1, c2 := 1-u1-u2, u1+2*u2, -u2
				return c0*mu*mu + 2./3*c1*mu*mu*mu + c2/2*mu*mu*mu*mu
			}
			want := (anti(1) - anti(m)) / (1 - u1/3 - u2/6)
			if got := q.blocked(r, 0, u1, u2); math.Abs(got-want) > 1e-12 {
				t.Errorf("r = %g, u = %v: blocked %.15g, expected %.15g", r, u, got, want)
			}
		}
	}
}

// TestBlockedConverges holds the stated error against a much finer rule.
func TestBlockedConverges(t *testing.T) {
	coarse, fine := newRule(nodes), newRule(400)
	worst := 0.0
	for _, r := range []float64{0.05, 0.11, 0.2} {
		for z := 0.001; z < 1+r; z += 0.00317 {
			d := math.Abs(coarse.blocked(r, z, 0.45, 0.2) - fine.blocked(r, z, 0.45, 0.2))
			limit := 1e-9
			if math.Abs(1-r-z) < 1e-3 {
				limit = 1e-7
			}
			if d > limit {
				t.Errorf("r = %g, z = %g: error %g, expected below %g", r, z, d, limit)
			}
			worst = math.Max(worst, d)
		}
	}
	t.Logf("largest error %.2g", worst)
}

func TestSeparation(t *testing.T) {
	s := Continuous(1)
	if got, want := s.separation(s.MidTransit), s.AxisRatio*math.Cos(s.Inclination*math.Pi/180); math.Abs(got-want) > 1e-9 {
		t.Errorf("at mid-transit the separation is %g, expected the impact parameter %g", got, want)
	}
	if got := s.separation(s.MidTransit + s.Period/4); math.Abs(got-s.AxisRatio) > 1e-9 && !math.IsInf(got, 1) {
		t.Errorf("at quadrature the separation is %g, expected %g", got, s.AxisRatio)
	}
	if got := s.separation(s.MidTransit + s.Period/2); !math.IsInf(got, 1) {
		t.Errorf("on the far side the separation is %g, expected none", got)
	}
	s.Eccentricity, s.Periastron = 0.4, 50
	// At inferior conjunction the planet is at (1-e^2)/(1+e sin w) times the
	// semi-major axis.
	w := 50 * math.Pi / 180
	want := s.AxisRatio * (1 - 0.16) / (1 + 0.4*math.Sin(w)) * math.Cos(s.Inclination*math.Pi/180)
	if got := s.separation(s.MidTransit); math.Abs(got-want) > 1e-9 {
		t.Errorf("eccentric: at mid-transit the separation is %g, expected %g", got, want)
	}
}
