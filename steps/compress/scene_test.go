package compress

import (
	"math"
	"math/rand/v2"
	"testing"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
	"rimlight/steps/transit"
)

// A scene is a way to make light curves.
type scene struct {
	n             int
	r, b          float64
	u             [2]float64
	noise         float64 // of a sample, relative
	eccentricity  float64
	exposure      float64 // s
	slope, curved bool    // further columns
	pointing      int     // columns of random walks
	settling      bool
	tau, hook     float64 // d, relative
	fixed         float64 // settling time held, 0 for none
	additive      bool
	unequal       float64 // errors vary by this factor
	masked        float64 // share of samples
	law           string
	parameters    Parameters
	normal        []Coefficient
	sizes         []float64 // of the columns; nil for some
	seed          uint64
}

const axis = 9.0

func (s scene) star() Star {
	n := s.n
	times := make([]float64, n)
	for i := range times {
		times[i] = 0.28 * (float64(i)/float64(n) - 0.5)
	}
	o := orbit.Orbit{Period: 3.1, AxisRatio: axis, Eccentricity: s.eccentricity, Periastron: 0.7}
	e := s.eccentricity
	o.Inclination = math.Acos(s.b / axis * (1 + e*math.Sin(0.7)) / (1 - e*e))
	law := s.law
	if law == "" {
		law = limb.Quadratic
	}
	return Star{Times: times, Orbit: o, Exposure: s.exposure, Law: law}
}

func (s scene) trend(star Star) Trend {
	t := Trend{Settling: s.settling, Start: star.Times[0], Least: 1e-6, Most: 1e3, Normal: s.normal}
	t.Settle = Prior{Kind: LogUniform, A: 0.002, B: 0.2}
	if s.fixed > 0 {
		t.Settle = Prior{Kind: Fixed, A: s.fixed}
	}
	column := func(f func(x float64) float64) {
		c := make([]float64, s.n)
		for i := range c {
			c[i] = f(2*float64(i)/float64(s.n-1) - 1)
		}
		t.Columns = append(t.Columns, c)
	}
	column(func(float64) float64 { return 1 })
	if s.slope {
		column(func(x float64) float64 { return x })
	}
	if s.curved {
		column(func(x float64) float64 { return x * x })
	}
	rng := rand.New(rand.NewPCG(s.seed, 5))
	for range s.pointing {
		walk := 0.0
		column(func(float64) float64 {
			walk = 0.99*walk + 0.1*rng.NormFloat64()
			return walk + 0.5*rng.NormFloat64()
		})
	}
	if s.additive {
		t.Added = make([]bool, len(t.Columns)+1)
		for k := range t.Added {
			t.Added[k] = k > 0
		}
	}
	return t
}

// make gives a light curve of the scene.
func (s scene) make(t testing.TB, stream uint64) (*Shared, *Curve) {
	t.Helper()
	star := s.star()
	trend := s.trend(star)
	shared, err := NewShared(star, trend)
	if err != nil {
		t.Fatal(err)
	}
	return shared, s.curve(t, star, trend, stream)
}

func (s scene) curve(t testing.TB, star Star, trend Trend, stream uint64) *Curve {
	t.Helper()
	rng := rand.New(rand.NewPCG(s.seed, 100+stream))
	l, err := newLaw(star.Law)
	if err != nil {
		t.Fatal(err)
	}
	flux, err := transit.Curve(star.Times, transit.Params{Orbit: star.Orbit, RadiusRatio: s.r, Exposure: star.Exposure,
		Law: limb.Law{Name: star.Law, Coefficients: append([]float64(nil), s.u[:l.count]...)}})
	if err != nil {
		t.Fatal(err)
	}
	c := &Curve{Flux: make([]float64, s.n), Err: make([]float64, s.n), Used: make([]bool, s.n), Parameters: s.parameters, Radius: 0.1, Limb: [2]float64{0.3, 0.2}}
	if c.Parameters == (Parameters{}) {
		c.Parameters = Parameters{Radius: Prior{Kind: Uniform, A: 0.001, B: 0.5}}
		for k := range l.count {
			c.Parameters.Limb[k] = Prior{Kind: Uniform, A: -2, B: 3}
		}
	}
	size := make([]float64, len(trend.Columns))
	for k := range size {
		size[k] = 3e-4 * rng.NormFloat64()
	}
	if s.sizes != nil {
		copy(size, s.sizes)
		s.hook = s.sizes[len(size)]
	}
	for i := range flux {
		base := 0.0
		for k, column := range trend.Columns[1:] {
			base += size[k+1] * column[i]
		}
		if trend.Settling {
			base += s.hook * math.Exp(-(star.Times[i]-star.Times[0])/s.tau)
		}
		if s.additive {
			flux[i] += base
		} else {
			flux[i] *= 1 + base
		}
		c.Err[i] = s.noise
		if s.unequal > 0 {
			c.Err[i] *= math.Exp(s.unequal * (2*rng.Float64() - 1))
		}
		c.Used[i] = !(rng.Float64() < s.masked)
		c.Flux[i] = 5000 * (flux[i] + c.Err[i]*rng.NormFloat64())
		c.Err[i] *= 5000
		if !c.Used[i] {
			c.Flux[i], c.Err[i] = math.NaN(), 0
		}
	}
	return c
}
