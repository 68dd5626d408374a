package transit

import (
	"math"
	"math/rand/v2"
	"testing"

	"rimlight/steps/limb"
)

// bruteStain integrates what a planet covers of a spot over strips of constant x;
// the spot's part of a strip follows from a quadratic equation.
func bruteStain(law limb.Law, s Spot, r, x, y float64) float64 {
	c := newCap(s)
	const n = 2500
	sum := 0.0
	for k := range n {
		sin, cos := math.Sincos(math.Pi * ((float64(k)+0.5)/n - 0.5))
		px := x + r*sin
		width := r * cos * math.Pi / n
		if math.Abs(px) >= 1 {
			continue
		}
		// y = R sin t, μ = R cos t within the planet and where axis_y y + axis_z μ ≥ rest.
		R := math.Sqrt((1 - px) * (1 + px))
		rest := (c.cos - c.axis[0]*px) / R
		size, at := math.Hypot(c.axis[1], c.axis[2]), math.Atan2(c.axis[1], c.axis[2])
		if rest >= size {
			continue
		}
		half := math.Pi
		if rest > -size {
			half = math.Acos(rest / size)
		}
		low, high := (y-r*cos)/R, (y+r*cos)/R
		if low >= 1 || high <= -1 {
			continue
		}
		for turn := -1.0; turn <= 1; turn++ {
			a := max(math.Asin(max(low, -1)), at-half+2*math.Pi*turn)
			b := min(math.Asin(min(high, 1)), at+half+2*math.Pi*turn)
			if a >= b {
				continue
			}
			for i, node := range ends.nodes {
				mu := R * math.Cos((a+b)/2+(b-a)/2*node)
				sum += width * law.Intensity(min(1, max(0, mu))) * mu * ends.weights[i] * (b - a) / 2
			}
		}
	}
	return sum / math.Pi / law.Norm()
}

// randomSpot draws a spot, often near the limb or beyond it.
func randomSpot(random *rand.Rand) Spot {
	return Spot{
		Latitude: 2 * (random.Float64() - 0.5), Longitude: 3.4 * (random.Float64() - 0.5),
		Radius: 0.03 + 0.5*random.Float64()*random.Float64(), Contrast: 1.2 * random.Float64(),
	}
}

func TestSpotCovered(t *testing.T) {
	random := rand.New(rand.NewPCG(10, 1))
	worst, some := 0.0, 0
	for range 60 {
		s, law := randomSpot(random), randomLaw(random)
		p, err := newProfile(law, 0)
		if err != nil {
			t.Fatal(err)
		}
		c := newCap(s)
		r := 0.05 + 0.4*random.Float64()
		x := c.axis[0]*c.cos + (random.Float64()-0.5)*(r+c.sin)*1.5
		y := c.axis[1]*c.cos + (random.Float64()-0.5)*(r+c.sin)*1.5
		got, _ := c.covered(&p, r, x, y)
		want := bruteStain(law, s, r, x, y)
		off := math.Abs(p.weigh(&got.value) - want)
		worst = max(worst, off)
		if want > 0 {
			some++
		}
		// The error of the strips, whose ends meet edges; with 600000 of them the
		// difference falls to 4e-10.
		if off > 3e-6 {
			t.Errorf("%+v, %+v, planet %g at (%g, %g): covered %.12g, want %.12g", s, law, r, x, y, p.weigh(&got.value), want)
		}
	}
	if some < 30 {
		t.Errorf("only %d of the planets cover some of the spot", some)
	}
	t.Logf("largest difference %.1e", worst)
}

// TestSpotLimits has planets that cover all of a spot, and spots that hold all of a
// planet.
func TestSpotLimits(t *testing.T) {
	random := rand.New(rand.NewPCG(10, 2))
	for range 300 {
		law := randomLaw(random)
		p, err := newProfile(law, LeastTolerance)
		if err != nil {
			t.Fatal(err)
		}
		s := randomSpot(random)
		c := newCap(s)
		whole, got := c.whole(&p), stain{}
		r := c.sin * 1.2
		x, y := c.cos*c.axis[0], c.cos*c.axis[1]
		if math.Hypot(x, y) < 1+r-2*c.sin {
			if got, _ = c.covered(&p, r, x, y); math.Abs(p.weigh(&got.value)-p.weigh(&whole.value)) > 1e-12 {
				t.Errorf("%+v, %+v: planet over all of the spot covers %.14g of %.14g", s, law, p.weigh(&got.value), p.weigh(&whole.value))
			}
		}
		s = Spot{Latitude: random.Float64() - 0.5, Longitude: random.Float64() - 0.5, Radius: 0.3 + 0.3*random.Float64()}
		c = newCap(s)
		r = 0.2 * c.sin
		x, y = c.cos*c.axis[0], c.cos*c.axis[1]
		got, _ = c.covered(&p, r, x, y)
		var d deficits
		var e edge
		d.cover(&p, r, math.Hypot(x, y), &e)
		if math.Abs(p.weigh(&got.value)-p.weigh(&d.value)) > 1e-12 || math.Abs(p.weigh(&got.byR)-p.weigh(&d.byR)) > 1e-11 {
			t.Errorf("%+v, %+v: planet of %g within the spot covers %.14g, want %.14g", s, law, r, p.weigh(&got.value), p.weigh(&d.value))
		}
		// The area of a cap seen face on, and of its projection anywhere on the disc.
		s = Spot{Latitude: 0.4, Longitude: 0.2, Radius: 0.1 + 0.5*random.Float64()}
		c = newCap(s)
		uniform, _ := newProfile(limb.Law{Name: limb.Uniform}, 0)
		whole = c.whole(&uniform)
		if want := c.sin * c.sin * c.axis[2]; math.Abs(uniform.weigh(&whole.value)-want) > 1e-13 {
			t.Errorf("%+v: area %.14g, want %.14g", s, uniform.weigh(&whole.value), want)
		}
	}
}
