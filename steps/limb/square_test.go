package limb

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"
)

// rounding is a few units in the last place of numbers of order 1.
const rounding = 1e-15

// squares are the laws that the unit square is for.
var squares = []string{Quadratic, SquareRoot, Logarithmic, Power2}

func TestKippingTable(t *testing.T) {
	file, err := os.Open("../../testdata/geometry/kipping2013.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil || len(rows) < 5 {
		t.Fatal(len(rows), err)
	}
	for _, row := range rows[1:] {
		var v [4]float64
		for i := range v {
			if v[i], err = strconv.ParseFloat(row[i+1], 64); err != nil {
				t.Fatal(err)
			}
		}
		u1, u2, _, err := FromSquare(Quadratic, v[0], v[1])
		if err != nil || math.Abs(u1-v[2]) > rounding || math.Abs(u2-v[3]) > rounding {
			t.Errorf("from q = %g, %g: u = %g, %g, error %v, expected %g, %g", v[0], v[1], u1, u2, err, v[2], v[3])
		}
		q1, q2, err := ToSquare(Quadratic, v[2], v[3])
		if err != nil || math.Abs(q1-v[0]) > rounding || (v[0] > 0 && math.Abs(q2-v[1]) > rounding) {
			t.Errorf("from u = %g, %g: q = %g, %g, error %v, expected %g, %g", v[2], v[3], q1, q2, err, v[0], v[1])
		}
	}
}

// TestSquare checks that points of the square are physical laws, all of them,
// with the density that the law's comment says, that the way back leads there,
// and the derivatives.
func TestSquare(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for _, law := range squares {
		for range 2000 {
			q1, q2 := rng.Float64(), rng.Float64()
			u1, u2, grad, err := FromSquare(law, q1, q2)
			if err != nil {
				t.Fatal(err)
			}
			l := Law{law, []float64{u1 * (1 - rounding), u2}}
			if law == SquareRoot {
				l.Coefficients = []float64{u1, u2 * (1 - rounding)}
			}
			if !l.Physical() {
				t.Errorf("%s, q = %g, %g: %+v is not physical", law, q1, q2, l)
			}
			b1, b2, err := ToSquare(law, u1, u2)
			if err != nil || math.Abs(b1-q1) > 1e-14 || math.Abs(b2-q2)*math.Sqrt(q1) > 1e-14 {
				t.Errorf("%s, q = %g, %g: back to %g, %g, error %v", law, q1, q2, b1, b2, err)
			}
			// The area of the image of the square is that of the triangle, spread evenly.
			density := math.Abs(grad[0]*grad[3] - grad[1]*grad[2])
			area := map[string]float64{Quadratic: 1, SquareRoot: 1, Logarithmic: 0.5, Power2: 0.5}[law]
			if law == Power2 { // in h1 and h2
				h1, h2 := ToHalf(u1, u2)
				c, alpha, back, err := FromHalf(h1, h2)
				if err != nil || math.Abs(c-u1) > 1e-14 || math.Abs(alpha-u2) > 1e-14*(1+u2)/h2 {
					t.Errorf("power-2 law %g, %g: by way of h1 = %g and h2 = %g %g, %g, error %v", u1, u2, h1, h2, c, alpha, err)
				}
				density /= math.Abs(back[0]*back[3] - back[1]*back[2])
				if math.Abs(l.Intensity(0.5)-h1) > 1e-14 || math.Abs(l.Intensity(0)-(h1-h2)) > 1e-14 {
					t.Errorf("power-2 law %g, %g: intensities are not h1 = %g and h1 - h2, h2 = %g", u1, u2, h1, h2)
				}
			}
			if math.Abs(density-area) > 1e-10 {
				t.Errorf("%s, q = %g, %g: density %g, expected %g", law, q1, q2, density, area)
			}
			root := math.Sqrt(q1)
			v1, v2, byRoot, err := FromRoot(law, root, q2)
			if err != nil || v1 != u1 || v2 != u2 || math.Abs(byRoot[0]-grad[0]*2*root) > 1e-12*math.Abs(byRoot[0]) || byRoot[3] != grad[3] {
				t.Errorf("%s, q = %g, %g: from the root %g, %g, %v, error %v", law, q1, q2, v1, v2, byRoot, err)
			}
			for k := range 4 {
				value := func(h float64) float64 {
					at := [2]float64{root, q2}
					at[k%2] += h
					u1, u2, _, _ := FromRoot(law, at[0], at[1])
					return [2]float64{u1, u2}[k/2]
				}
				h := 1e-3 * min(1-root, 1-q2)
				if law != Power2 {
					h = 1e-3
				}
				want := (45*(value(h)-value(-h)) - 9*(value(2*h)-value(-2*h)) + value(3*h) - value(-3*h)) / (60 * h)
				if !(math.Abs(byRoot[k]-want) <= 1e-10*(1+math.Abs(want))+3e-15/h*(1+math.Abs(value(0)))) {
					t.Errorf("%s, q = %g, %g: derivative %d by root is %.12g, by differences %.12g", law, q1, q2, k, byRoot[k], want)
				}
			}
		}
	}
	// Every physical law comes from the square.
	for range 20000 {
		law := squares[rng.IntN(len(squares))]
		l := Law{law, []float64{3*rng.Float64() - 1, 3*rng.Float64() - 1}}
		q1, q2, err := ToSquare(law, l.Coefficients[0], l.Coefficients[1])
		inside := err == nil && q1 >= 0 && q1 <= 1 && q2 >= 0 && q2 <= 1
		if l.Physical() != inside {
			t.Errorf("%+v: physical %v, from q = %g, %g, error %v", l, l.Physical(), q1, q2, err)
		}
	}
}

func TestSquareEdges(t *testing.T) {
	for _, law := range squares[:3] {
		for _, q := range [][2]float64{{0, 0}, {0, 0.5}, {0, 1}, {1, 0}, {1, 1}, {0.5, 0}, {0.5, 0.5}, {0.5, 1}} {
			u1, u2, grad, err := FromSquare(law, q[0], q[1])
			if err != nil || math.IsNaN(u1+u2) {
				t.Errorf("%s, q = %v: %g, %g, error %v", law, q, u1, u2, err)
			}
			for _, g := range grad {
				if math.IsNaN(g) || math.IsInf(g, 0) && q[0] > 0 {
					t.Errorf("%s, q = %v: gradient %v", law, q, grad)
				}
			}
			if _, _, byRoot, err := FromRoot(law, q[0], q[1]); err != nil || math.IsInf(byRoot[0]+byRoot[1]+byRoot[2]+byRoot[3], 0) {
				t.Errorf("%s, q = %v: by the root %v, error %v", law, q, byRoot, err)
			}
		}
	}
	for _, q := range [][2]float64{{0, 0.5}, {1, 0.5}, {0.5, 1}} {
		if _, _, _, err := FromSquare(Power2, q[0], q[1]); err == nil {
			t.Errorf("no error for the power-2 law at q = %v", q)
		}
	}
	for _, q := range [][2]float64{{-1e-9, 0.5}, {1.1, 0.5}, {0.5, -0.1}, {0.5, math.NaN()}, {math.NaN(), 0.5}, {0.5, math.Inf(1)}} {
		if _, _, _, err := FromSquare(Quadratic, q[0], q[1]); err == nil {
			t.Errorf("no error at q = %v", q)
		}
	}
	for _, law := range []string{Linear, FourParameter, "", "cubic"} {
		if _, _, _, err := FromSquare(law, 0.5, 0.5); err == nil {
			t.Errorf("no error for the law %q", law)
		}
		if _, _, err := ToSquare(law, 0.5, 0.5); err == nil {
			t.Errorf("no error for the law %q", law)
		}
	}
	for _, u := range [][2]float64{{0.2, -0.2}, {-0.3, 0.1}, {math.NaN(), 0}, {0, math.Inf(1)}} {
		if q1, q2, err := ToSquare(Quadratic, u[0], u[1]); err == nil {
			t.Errorf("u = %v comes from q = %g, %g", u, q1, q2)
		}
	}
	if q1, q2, err := ToSquare(Quadratic, 0, 0); q1 != 0 || q2 != 0.5 || err != nil {
		t.Errorf("without limb darkening q = %g, %g, error %v", q1, q2, err)
	}
}
