package compress

import (
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"sync"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"rimlight/steps/limb"
)

// simulations is how many of them a calibration has, given by RIMLIGHT_POSTERIORS: some
// thousands take minutes.
func simulations(t *testing.T) int {
	text := os.Getenv("RIMLIGHT_POSTERIORS")
	if text == "" {
		return 40
	}
	n, err := strconv.Atoi(text)
	if err != nil || n < 40 {
		t.Fatalf("RIMLIGHT_POSTERIORS is %q; expected a number of simulations from 40 up", text)
	}
	return n
}

// long reports whether tests that take minutes are asked for.
func long() bool { return os.Getenv("RIMLIGHT_POSTERIORS") != "" }

// TestCalibration is simulation-based calibration (Talts et al. 2018): of parameters
// drawn from their priors, the share of the posterior below the true value is uniform if
// the posterior is right. Uniformity is tested by chi-square in 20 equal bins, at a chance
// of 1 in 1000; the shares of true values in the central 68 % and 95 % are held against
// the binomial distribution, at 3.3 standard deviations.
func TestCalibration(t *testing.T) {
	count := simulations(t)
	base := scene{n: 400, b: 0.3, noise: 8e-4, slope: true, seed: 8,
		parameters: Parameters{Radius: Prior{Kind: Uniform, A: 0.03, B: 0.17}, Square: true, Limb: [2]Prior{{Kind: Uniform, A: 0, B: 1}, {Kind: Uniform, A: 0, B: 1}}},
		normal:     []Coefficient{{1, 0, 1e-3}}}
	settled, graze, normal, scaled := base, base, base, base
	scaled.normal = nil
	base.seed, settled.seed, graze.seed, normal.seed, scaled.seed = 21, 22, 23, 24, 25
	settled.settling = true
	settled.normal = append(settled.normal, Coefficient{2, 0, 2e-3})
	settled.unequal, settled.masked = 0.2, 0.05
	graze.b, graze.noise = 0.88, 4e-4
	normal.parameters.Square = false
	normal.parameters.Limb = [2]Prior{{Kind: Normal, A: 0.3, B: 0.1}, {Kind: TruncatedNormal, A: 0.2, B: 0.1, Lo: 0, Hi: 0.5}}
	for _, test := range []struct {
		name  string
		s     scene
		scale bool
	}{{"plain", base, false}, {"settling", settled, false}, {"grazing", graze, false}, {"normal priors", normal, false}, {"scale of errors", scaled, true}} {
		t.Run(test.name, func(t *testing.T) {
			if test.name != "plain" && test.name != "settling" && !long() {
				t.Skip("takes its time; RIMLIGHT_POSTERIORS=1000 asks for it")
			}
			calibrate(t, test.s, test.scale, count)
		})
	}
}

func calibrate(t *testing.T, s scene, scale bool, count int) {
	star := s.star()
	trend := s.trend(star)
	shared, err := NewShared(star, trend)
	if err != nil {
		t.Fatal(err)
	}
	ranks := make([]float64, count)
	walked, bad := 0, 0
	var mutex sync.Mutex
	var group sync.WaitGroup
	for worker := range 2 {
		group.Go(func() {
			for i := worker; i < count; i += 2 {
				rank, out := s.rank(t, shared, star, trend, scale, uint64(i))
				mutex.Lock()
				ranks[i] = rank
				if out.By == ByWalkers {
					walked++
				}
				if !out.Mixed {
					bad++
				}
				mutex.Unlock()
			}
		})
	}
	group.Wait()
	const bins = 20
	var in [bins]int
	var in68, in95 int
	for _, r := range ranks {
		in[min(bins-1, int(r*bins))]++
		if math.Abs(r-0.5) < 0.34 {
			in68++
		}
		if math.Abs(r-0.5) < 0.475 {
			in95++
		}
	}
	chi2 := 0.0
	for _, n := range in {
		d := float64(n) - float64(count)/bins
		chi2 += d * d * bins / float64(count)
	}
	chance := distuv.ChiSquared{K: bins - 1}.Survival(chi2)
	share68, share95 := float64(in68)/float64(count), float64(in95)/float64(count)
	t.Logf("%d simulations: uniform with a chance of %.3f; %.1f %% in the central 68 %%, %.1f %% in 95 %%; %d by walkers, %d not mixed",
		count, chance, 100*share68, 100*share95, walked, bad)
	if chance < 1e-3 {
		t.Errorf("ranks %v are not uniform", in)
	}
	for _, c := range [][2]float64{{share68, 0.68}, {share95, 0.95}} {
		if sd := math.Sqrt(c[1] * (1 - c[1]) / float64(count)); math.Abs(c[0]-c[1]) > 3.3*sd {
			t.Errorf("%.1f %% of true values are in the central %g %%", 100*c[0], 100*c[1])
		}
	}
}

// rank draws parameters from the priors and a light curve from them, and returns the
// share of the posterior of the radius ratio that is below its true value.
func (s scene) rank(t *testing.T, shared *Shared, star Star, trend Trend, scale bool, i uint64) (float64, Posterior) {
	rng := rand.New(rand.NewPCG(s.seed, 1000+i))
	draw := func(p Prior) float64 {
		for {
			switch p.Kind {
			case Uniform:
				return p.A + (p.B-p.A)*rng.Float64()
			case LogUniform:
				return p.A * math.Exp(math.Log(p.B/p.A)*rng.Float64())
			case Normal:
				return p.A + p.B*rng.NormFloat64()
			}
			if x := p.A + p.B*rng.NormFloat64(); x > p.Lo && x < p.Hi {
				return x
			}
		}
	}
	s.r = draw(s.parameters.Radius)
	s.u = [2]float64{draw(s.parameters.Limb[0]), draw(s.parameters.Limb[1])}
	if s.parameters.Square {
		s.u[0], s.u[1], _, _ = limb.FromSquare(limb.Quadratic, s.u[0], s.u[1])
	}
	s.tau = draw(trend.Settle)
	s.sizes = make([]float64, 3)
	for _, p := range s.normal {
		s.sizes[p.Column] = p.Mean + p.SD*rng.NormFloat64()
	}
	curve := s.curve(t, star, trend, i)
	if scale { // errors as given are wrong by a factor
		for k := range curve.Err {
			curve.Err[k] *= 3
		}
	}
	curve.Limb = [2]float64{0.3, 0.3}
	c, err := newChannel(shared, curve, scale)
	if err != nil {
		t.Error(err)
		return 0, Posterior{}
	}
	var out Posterior
	_, d, err := c.draw(Settings{Effective: 1000, Seed: 1, Scale: scale, Stream: int(i)}, &out)
	if err != nil {
		t.Errorf("simulation %d: r=%g: %v", i, s.r, err)
		return 0, out
	}
	below := 0.0
	for k, lw := range d.logWeight {
		if c.radiusOf(d.z[k*d.m:(k+1)*d.m]) < s.r {
			below += math.Exp(lw)
		}
	}
	return below, out
}
