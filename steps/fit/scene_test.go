package fit

import (
	"math"
	"math/rand/v2"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
	"rimlight/steps/orbit"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
	"rimlight/steps/transit"
	"rimlight/steps/vector"
)

// quadratic is a quadratic limb-darkening law.
func quadratic(u1, u2 float64) limb.Law {
	return limb.Law{Name: limb.Quadratic, Coefficients: []float64{u1, u2}}
}

// A scene is simulated data with what went into them. Its transits come from
// the same code as the fit's, so that tests of the fit test the fit alone.
type scene struct {
	cube   lightcurve.Cube
	orbit  orbit.Orbit
	depth  []float64
	u1, u2 []float64
}

// newScene makes n integrations of m channels over 0.6 to 5.2 um: noise of 300 to
// 900 ppm, limb darkening that weakens with wavelength, settling, drift and a
// leak of the pointing.
func newScene(t testing.TB, seed uint64, n, m int) scene {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 77))
	s := scene{orbit: orbit.Orbit{
		Period: 3.1, MidTransit: 2460100.4 + 0.004*(2*rng.Float64()-1), AxisRatio: 9.4,
		Inclination: 87.3 * degree, Periastron: math.Pi / 2,
	}}
	s.cube.Time = make([]float64, n)
	x, y := make([]float64, n), make([]float64, n)
	var wx, wy float64
	for i := range n {
		s.cube.Time[i] = 2460100.4 + 0.26*(float64(i)/float64(n)-0.5)
		wx, wy = 0.99*wx+0.1*rng.NormFloat64(), 0.99*wy+0.1*rng.NormFloat64()
		x[i], y[i] = 12+0.01*(wx+rng.NormFloat64()), -4+0.01*(wy+0.3*wx+rng.NormFloat64())
	}
	s.cube.Aux = []lightcurve.Series{{Name: "X", Value: x}, {Name: "Y", Value: y}}
	for j := range m {
		f := (float64(j) + 0.5) / float64(m)
		k := 0.11 + 0.002*math.Sin(9*f) + 0.002*(1-f)
		u1, u2 := 0.45-0.37*f, 0.22-0.12*f
		flux, err := transit.Curve(s.cube.Time, transit.Params{Orbit: s.orbit, RadiusRatio: k, Law: quadratic(u1, u2)})
		if err != nil {
			t.Fatal(err)
		}
		noise := 1e-6 * (300 + 600*f)
		a, b, c, d := 1e-3*rng.NormFloat64(), 5e-4*rng.NormFloat64(), 0.02*rng.NormFloat64(), 0.02*rng.NormFloat64()
		level := 1000 + 5000*(1-f)
		sigma, mask := make([]float64, n), make([]lightcurve.Flag, n)
		for i := range flux {
			age := s.cube.Time[i] - s.cube.Time[0]
			flux[i] *= 1 + a*math.Exp(-age/0.012) + b*age/0.26 + c*(x[i]-12) + d*(y[i]+4)
			flux[i] = level * (flux[i] + noise*rng.NormFloat64())
			sigma[i] = level * noise
		}
		lo := 0.6 + 4.6*float64(j)/float64(m)
		s.cube.Channels = append(s.cube.Channels, lightcurve.Channel{Index: j, Lo: lo, Hi: lo + 4.6/float64(m)})
		s.cube.Flux = append(s.cube.Flux, flux)
		s.cube.Err = append(s.cube.Err, sigma)
		s.cube.Mask = append(s.cube.Mask, mask)
		s.depth = append(s.depth, k*k)
		s.u1, s.u2 = append(s.u1, u1), append(s.u2, u2)
	}
	return s
}

// model is what a user would give for a scene: a mid-transit time good to 0.01 d
// and other values near the true ones.
func (s scene) model() Model {
	return Model{
		Period: s.orbit.Period, MidTransit: 2460100.4, AxisRatio: 9.6, Inclination: 87.6, Periastron: 90, RadiusRatio: 0.1,
		Trend: systematics.Trend{Polynomial: 1, Settling: true, SettlingTime: 0.02, Regressors: []string{"X", "Y"}},
	}
}

func uniform(name string, a, b float64) Prior { return Prior{Name: name, Kind: Uniform, A: a, B: b} }

// whitePriors leave the orbit's shape, the time and u1, u2 free.
func whitePriors() Priors {
	return Priors{uniform("midTransitOffset", -0.03, 0.03), uniform("axisRatio", 3, 30), uniform("inclination", 75, 90),
		uniform("radiusRatio", 0.02, 0.3), uniform("u1", -1, 2), uniform("u2", -1, 2), uniform("settlingTime", 0.001, 0.1)}
}

func channelPriors(a, b string, lo, hi float64) Priors {
	return Priors{uniform("radiusRatio", 0.02, 0.3), uniform(a, lo, hi), uniform(b, lo, hi)}
}

// reduce runs all channel fits after a white fit.
func (s scene) reduce(t testing.TB, model Model, white, channel Priors) (Posterior, []spectrum.Point) {
	t.Helper()
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	posterior, _, err := White(curve, withWhite(model, white))
	if err != nil {
		t.Fatal(err)
	}
	var points []spectrum.Point
	for _, c := range lightcurve.Curves(s.cube) {
		p, _, err := Channel(c, posterior, withChannel(model, channel))
		if err != nil {
			t.Fatal(err)
		}
		points = append(points, p)
	}
	return posterior, points
}

// pulls returns mean and root mean square of (depth - truth)/error, the error
// with or without the part shared by all channels.
func (s scene) pulls(points []spectrum.Point, shared [][]float64) (mean, rms float64) {
	for i, p := range points {
		variance := p.DepthErr * p.DepthErr
		if shared != nil {
			variance += shared[i][i]
		}
		pull := (p.Depth - s.depth[i]) / math.Sqrt(variance)
		mean += pull / float64(len(points))
		rms += pull * pull / float64(len(points))
	}
	return mean, math.Sqrt(rms)
}

// withWhite is a model with parameters of the white light curve, and withChannel
// one with parameters of each channel.
func withWhite(model Model, rows Priors) Model   { model.White = rows; return model }
func withChannel(model Model, rows Priors) Model { model.Channel = rows; return model }

// whiteWith, channelWith and functionOf fit models with parameters and a function
// put in.
func whiteWith(curve lightcurve.Curve, model Model, rows Priors, names []string, f func(p []float64) vector.V) (Posterior, CurveFit, error) {
	model.White, model.Function = rows, names
	return WhiteWith(curve, model, f)
}

func channelWith(curve lightcurve.Curve, white Posterior, model Model, rows Priors, names []string, f func(p []float64) vector.V) (spectrum.Point, CurveFit, error) {
	model.Channel, model.Function = rows, names
	return ChannelWith(curve, white, model, f)
}

func functionOf(curve lightcurve.Curve, trend systematics.Trend, rows Priors, names []string, f func(p []float64) vector.V) (Posterior, CurveFit, error) {
	return Function(curve, Model{Trend: trend, White: rows, Function: names}, f)
}
