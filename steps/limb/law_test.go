package limb

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// valid are laws to test with: physical ones, and others.
func valid() []Law {
	return []Law{
		{Uniform, nil}, {Linear, []float64{0.6}}, {Linear, []float64{-0.3}}, {Quadratic, []float64{0.4, 0.3}}, {Quadratic, []float64{-0.2, 1.4}},
		{SquareRoot, []float64{0.1, 0.7}}, {SquareRoot, []float64{-0.3, 0.9}}, {Logarithmic, []float64{0.6, 0.2}}, {Logarithmic, []float64{0.2, 0.6}},
		{Power2, []float64{0.6, 0.7}}, {Power2, []float64{0.7, 3.5}}, {Power2, []float64{-0.1, 0.01}},
		{ThreeParameter, []float64{1.2, -0.9, 0.4}}, {FourParameter, []float64{0.5, 0.3, -0.4, 0.2}}, {FourParameter, []float64{-1.5, 4, -3.5, 1.2}},
	}
}

func TestValidate(t *testing.T) {
	for _, l := range valid() {
		if err := l.Validate(); err != nil {
			t.Errorf("%+v: %v", l, err)
		}
		if n, err := Count(l.Name); err != nil || n != len(l.Coefficients) {
			t.Errorf("%s: %d coefficients, error %v", l.Name, n, err)
		}
	}
	for want, l := range map[string]Law{
		`no limb-darkening law "quadratc"; expected one of uniform, linear`: {"quadratc", []float64{0.1, 0.2}},
		"nearest known name: square-root":                                   {"squareroot", nil},
		"1 coefficients for the quadratic law, expected 2":                  {Quadratic, []float64{0.3}},
		"coefficient u2 of the quadratic law is NaN":                        {Quadratic, []float64{0.3, math.NaN()}},
		"coefficient u1 of the linear law is -Inf":                          {Linear, []float64{math.Inf(-1)}},
		"exponent u2 of the power-2 law is 0":                               {Power2, []float64{0.3, 0}},
		"a flux of -1 times that of a uniform disc":                         {Linear, []float64{6}},
	} {
		if _, err := New(l.Name, l.Coefficients); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%+v: got error %v, expected %s", l, err, want)
		}
		if l.Physical() {
			t.Errorf("%+v counts as physical", l)
		}
	}
}

// brute returns 1 - I(mu) by the formula as written in the papers.
func brute(l Law, mu float64) float64 {
	u := append(append([]float64{}, l.Coefficients...), 0, 0, 0, 0)
	switch l.Name {
	case Linear:
		return u[0] * (1 - mu)
	case Quadratic:
		return u[0]*(1-mu) + u[1]*math.Pow(1-mu, 2)
	case SquareRoot:
		return u[0]*(1-mu) + u[1]*(1-math.Sqrt(mu))
	case Logarithmic:
		if mu == 0 {
			return u[0]
		}
		return u[0]*(1-mu) + u[1]*mu*math.Log(mu)
	case Power2:
		return u[0] * (1 - math.Pow(mu, u[1]))
	case ThreeParameter:
		return u[0]*(1-mu) + u[1]*(1-math.Pow(mu, 1.5)) + u[2]*(1-mu*mu)
	case FourParameter:
		return u[0]*(1-math.Sqrt(mu)) + u[1]*(1-mu) + u[2]*(1-math.Pow(mu, 1.5)) + u[3]*(1-mu*mu)
	}
	return 0
}

func TestIntensity(t *testing.T) {
	for _, l := range valid() {
		if got := l.Intensity(1); got != 1 {
			t.Errorf("%+v: intensity %g at the centre", l, got)
		}
		for i := range 101 {
			mu := float64(i) / 100
			got, grad := l.Gradient(mu)
			if want := 1 - brute(l, mu); math.Abs(got-want) > 4e-15 {
				t.Errorf("%+v: I(%g) = %.17g, expected %.17g", l, mu, got, want)
			}
			for k, u := range l.Coefficients {
				const step = 1e-5
				moved := Law{l.Name, append([]float64{}, l.Coefficients...)}
				difference := func(h float64) float64 {
					moved.Coefficients[k] = u + h
					up := moved.Intensity(mu)
					moved.Coefficients[k] = u - h
					return (up - moved.Intensity(mu)) / (2 * h)
				}
				want := (4*difference(step/2) - difference(step)) / 3
				if math.Abs(grad[k]-want) > 2e-10 {
					t.Errorf("%+v: derivative by u%d at %g is %.12g, by differences %.12g", l, k+1, mu, grad[k], want)
				}
			}
			for _, g := range grad[len(l.Coefficients):] {
				if g != 0 {
					t.Errorf("%+v: derivative %g by a coefficient that there is not", l, g)
				}
			}
		}
		for _, mu := range []float64{-1e-300, 1.0000001, math.NaN(), math.Inf(1)} {
			if got := l.Intensity(mu); !math.IsNaN(got) {
				t.Errorf("%+v: I(%g) = %g, expected NaN", l, mu, got)
			}
		}
	}
	if got := (Law{Linear, []float64{1, 2}}).Intensity(0.5); !math.IsNaN(got) {
		t.Errorf("two coefficients of the linear law give %g", got)
	}
}

// TestNorm integrates the intensity over the disc, in √mu, where all laws but
// power-2 with a small exponent are smooth or nearly so.
func TestNorm(t *testing.T) {
	for _, l := range valid() {
		const n = 100000
		sum := 0.0
		for i := range n {
			x := (float64(i) + 0.5) / n
			sum += l.Intensity(x*x) * 4 * x * x * x / n
		}
		norm, grad := l.NormGradient()
		if math.Abs(norm-sum) > 1e-9 {
			t.Errorf("%+v: flux norm %.12g, by integration %.12g", l, norm, sum)
		}
		for k, u := range l.Coefficients {
			moved := Law{l.Name, append([]float64{}, l.Coefficients...)}
			difference := func(h float64) float64 {
				moved.Coefficients[k] = u + h
				up := moved.Norm()
				moved.Coefficients[k] = u - h
				return (up - moved.Norm()) / (2 * h)
			}
			want := (4*difference(1e-3*math.Abs(u)) - difference(2e-3*math.Abs(u))) / 3
			if math.Abs(grad[k]-want) > 1e-10 {
				t.Errorf("%+v: derivative of the norm by u%d is %.12g, by differences %.12g", l, k+1, grad[k], want)
			}
		}
	}
}

// TestPhysical compares with a fine grid in √mu, for random coefficients.
func TestPhysical(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	yes := map[string]int{}
	for range 20000 {
		l := Law{Name: Names()[1+rng.IntN(len(Names())-1)]}
		n, _ := Count(l.Name)
		for range n {
			l.Coefficients = append(l.Coefficients, 4*rng.Float64()-1.5)
		}
		if l.Validate() != nil {
			continue
		}
		// Margins: what the grid cannot tell from touching is left out.
		lowest, flattest, before, last := math.Inf(1), math.Inf(1), 0.0, 0.0
		const steps = 200
		for i := range steps + 1 {
			x := float64(i) / steps
			at := l.Intensity(x * x)
			if i > 0 {
				flattest = min(flattest, (at-before)/(x*x-last*last)) // by mu
			}
			lowest, before, last = min(lowest, at), at, x
		}
		_, least := l.Least()
		if least > lowest+1e-12 || least < lowest-1e-2 {
			t.Errorf("%+v: least intensity %g, %g on a grid", l, least, lowest)
		}
		// Towards the edge the slope of these terms is infinite, closer than any grid.
		if (l.Name == Logarithmic || l.Name == SquareRoot) && l.Coefficients[1] < 0 || l.Name == FourParameter && l.Coefficients[0] < 0 {
			flattest = -1
		}
		if math.Abs(flattest) < 0.05 && l.Name != Linear && l.Name != Power2 {
			continue
		}
		if got, want := l.Decreasing(), flattest > 0; got != want {
			t.Errorf("%+v: decreasing %v, but the smallest slope on a grid is %g", l, got, flattest)
		}
		if got, want := l.Physical(), flattest > 0 && lowest >= 0; got != want {
			t.Errorf("%+v: physical %v, smallest slope %g, least intensity %g", l, got, flattest, lowest)
		}
		if l.Physical() {
			yes[l.Name]++
		}
	}
	for _, name := range Names()[1:] {
		if yes[name] < 10 {
			t.Errorf("only %d physical %s laws", yes[name], name)
		}
	}
	// Boundaries are included.
	for _, l := range []Law{
		{Uniform, nil}, {Linear, []float64{1}}, {Linear, []float64{0}}, {Quadratic, []float64{2, -1}}, {Quadratic, []float64{0, 1}}, {SquareRoot, []float64{-1, 2}},
		{SquareRoot, []float64{1, 0}}, {Logarithmic, []float64{1, 1}}, {Power2, []float64{1, 2}}, {Power2, []float64{0, 2}},
		{ThreeParameter, []float64{0, 0, 1}}, {FourParameter, []float64{1, 0, 0, 0}}, {FourParameter, []float64{0, 0, 0, 0}},
		{FourParameter, []float64{0, 2, 0, -1}}, // limb darkening 1 - (1-mu)², quadratic in mu, flat at the centre
	} {
		if !l.Physical() {
			t.Errorf("%+v is on the boundary and not physical", l)
		}
	}
}
