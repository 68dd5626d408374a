package transit

import (
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"

	"rimlight/steps/limb"
)

// steep are the nodes of integrals over an interval from 0 to 1 of functions with
// singular points at or near its ends: steps of the tanh-sinh rule, each with its
// distances from both ends.
var steep = func() (nodes []struct{ low, high, weight float64 }) {
	const h = 1. / 16
	for k := -56; k <= 56; k++ {
		s, c := math.Sinh(h*float64(k)), math.Cosh(h*float64(k))
		e := math.Exp(-math.Pi * math.Abs(s))
		near, far := e/(1+e), 1/(1+e)
		weight := h * math.Pi * c * near * far
		if k < 0 {
			near, far = far, near
		}
		nodes = append(nodes, struct{ low, high, weight float64 }{far, near, weight})
	}
	return nodes
}()

// bruteForce integrates, without any closed form of the light that is covered,
// over rings about the star's centre for the flux and its derivatives by the
// coefficients, and along the planet's edge for the other derivatives.
func bruteForce(law limb.Law, r, z float64) (flux, dr, dz float64, by [limb.Most]float64) {
	intensity := func(mu float64) [5]float64 {
		i, g := law.Gradient(min(mu, 1))
		return [5]float64{i, g[0], g[1], g[2], g[3]}
	}
	var covered [5]float64
	add := func(low, high float64, fraction func(d, e float64) float64) {
		length := high - low
		if !(length > 0) {
			return
		}
		for _, n := range steep {
			d, e := length*n.low, length*n.high
			gap := 1 - high + e
			w := 2 * (low + d) * n.weight * length * fraction(d, e)
			for k, v := range intensity(math.Sqrt(gap * (2 - gap))) {
				covered[k] += w * v
			}
		}
	}
	// Pieces between whose ends the half-angle of the rings has no singular point,
	// and a cut in the middle, since the one beyond the far end may be close.
	middle := func(low, high float64, fraction func(base, d, top, e float64) float64) {
		for _, p := range [][2]float64{{low, low + (high-low)/8}, {low + (high-low)/8, high - (high-low)/8}, {high - (high-low)/8, high}} {
			add(p[0], p[1], func(d, e float64) float64 { return fraction(p[0]-low, d, high-p[1], e) })
		}
	}
	if r > z {
		middle(0, min(r-z, 1), func(_, _, _, _ float64) float64 { return 1 })
	}
	low, high := math.Abs(z-r), min(z+r, 1)
	middle(low, high, func(base, d, top, e float64) float64 {
		d, e = d+base, e+top
		rho, over := low+d, z+r-high+e
		a, b := d*over, (rho+z-r)*(rho+z+r)
		if z < r {
			a, b = (rho-z+r)*over, d*(rho+z+r)
		}
		return 2 / math.Pi * math.Atan2(math.Sqrt(a), math.Sqrt(b))
	})
	norm, byNorm := law.NormGradient()
	deficit := covered[0] / norm
	for k := range by {
		by[k] = -(covered[1+k] - deficit*byNorm[k]) / norm
	}
	start := 0.0
	square := 0.0
	beyond := (r - 1) + z
	if r < 0.5 {
		beyond = (z - 1) + r
	}
	if z > 0 {
		square = beyond * (z + r + 1) / (4 * z * r)
	}
	if square > 0 {
		start = 2 * math.Asin(math.Sqrt(min(square, 1)))
	}
	for _, p := range [][2]float64{{0, 1. / 64}, {1. / 64, 1. / 8}, {1. / 8, 1}} {
		span := math.Pi - start
		for _, n := range steep {
			d := span * (p[0] + (p[1]-p[0])*n.low)
			s := math.Sin(d / 2)
			mu2 := -beyond*(1+z+r) + 4*z*r*s*s
			if square > 0 {
				mu2 = 4 * z * r * s * math.Sin(start+d/2)
			}
			w := 2 * r / math.Pi / norm * n.weight * span * (p[1] - p[0]) * intensity(math.Sqrt(max(mu2, 0)))[0]
			dr -= w
			dz -= w * math.Cos(start+d)
		}
	}
	return 1 - deficit, dr, dz, by
}

// randomLaw draws a law, most often a physical one.
func randomLaw(random *rand.Rand) limb.Law {
	names := limb.Names()
	for {
		l := limb.Law{Name: names[random.IntN(len(names))]}
		n, _ := limb.Count(l.Name)
		for range n {
			l.Coefficients = append(l.Coefficients, 1.6*random.Float64()-0.6)
		}
		if l.Name == limb.Power2 {
			l.Coefficients[1] = 0.2 * math.Pow(10, random.Float64())
		}
		if l.Validate() == nil && l.Norm() > 0.3 {
			return l
		}
	}
}

// draws is how many random geometries tests try: a number, or that in
// RIMLIGHT_TRANSIT_DRAWS.
func draws(t *testing.T, ordinary int) int {
	t.Helper()
	text := os.Getenv("RIMLIGHT_TRANSIT_DRAWS")
	if text == "" {
		return ordinary
	}
	n, err := strconv.Atoi(text)
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// TestFluxRandom holds fluxes and derivatives against brute force in random
// places, among them some close to the contacts.
func TestFluxRandom(t *testing.T) {
	random := rand.New(rand.NewPCG(7, 5))
	worst := map[string][3]float64{}
	for range draws(t, 4000) {
		r := math.Exp(random.Float64()*6 - 5) // 0.007 to 2.7
		z := max(0, r-1) + random.Float64()*(1+r-max(0, r-1))
		if random.IntN(4) == 0 {
			seam := []float64{math.Abs(1 - r), 1 + r, r}[random.IntN(3)]
			z = seam * (1 + (random.Float64()-0.5)*math.Pow(10, -6*random.Float64()))
			if z > 1+r || z < r-1 {
				continue
			}
		}
		law := randomLaw(random)
		flux, dr, dz, by := bruteForce(law, r, z)
		g, err := FluxGradient(r, []float64{z}, law, 0)
		if err != nil {
			t.Fatal(err)
		}
		const tight = 1e-10
		tolerance := DefaultTolerance
		if closedLaw(law.Name) {
			tolerance = 1e-13
		}
		off := [3]float64{math.Abs(g.Flux[0] - flux)}
		off[1] = max(math.Abs(g.ByRadius[0]-dr)/max(1, math.Abs(dr)), math.Abs(g.BySeparation[0]-dz)/max(1, math.Abs(dz)))
		for k, b := range g.ByCoefficient {
			off[2] = max(off[2], math.Abs(b[0]-by[k]))
		}
		was := worst[law.Name]
		for k, o := range off {
			was[k] = max(was[k], o)
		}
		worst[law.Name] = was
		if !(off[0] <= tolerance && off[1] <= tight && off[2] <= max(tolerance, 1e-13)) {
			t.Errorf("%+v, r = %g, z = %.17g: off by %.1e (flux), %.1e (by r or z), %.1e (by coefficient)", law, r, z, off[0], off[1], off[2])
		}
	}
	for _, name := range limb.Names() {
		t.Logf("%s: largest error %.1e (flux), %.1e (by r or z), %.1e (by coefficient)", name, worst[name][0], worst[name][1], worst[name][2])
	}
}
