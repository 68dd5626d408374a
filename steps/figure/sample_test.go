package figure

import (
	"math"
	"math/rand/v2"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// A scene is made-up data of a transit, with everything a figure needs: a cube,
// its fits (the white one first) and its points.
type scene struct {
	cube   lightcurve.Cube
	fits   []fit.CurveFit
	points []spectrum.Point
}

// newScene makes a transit of n integrations in m channels from 0.6 to 5.2 um:
// noise, settling and drift, 0.3% outliers (masked), and three dead channels. The
// shape is a smooth trough, not a transit model; figures do not care.
func newScene(n, m int) scene {
	rng := rand.New(rand.NewPCG(7, 11))
	var s scene
	const span, start, mid = 6.0 / 24, 2460123.45, 2460123.45 + 2.9/24
	s.cube.Time = make([]float64, n)
	for i := range s.cube.Time {
		s.cube.Time[i] = start + span*float64(i)/float64(max(n-1, 1))
	}
	edges := make([]float64, m+1)
	for j := range edges {
		edges[j] = 0.6 * math.Pow(5.2/0.6, float64(j)/float64(m))
	}
	trough := func(t, depth, u float64) float64 {
		z := math.Abs(t-mid) * 24 / 1.35
		edge := 1 / (1 + math.Exp((z-1)*40))
		return 1 - depth*edge*(1+u*(0.45-z*z))
	}
	white := fit.CurveFit{Channel: lightcurve.Channel{Index: -1, Lo: 0.6, Hi: 5.2}, Level: 1, Mid: mid}
	s.fits = make([]fit.CurveFit, m+1)
	for j := range m {
		c := lightcurve.Channel{Index: j, Lo: edges[j], Hi: edges[j+1]}
		w := (c.Lo + c.Hi) / 2
		depth := 0.0146 - 0.00025*math.Log(w/0.6) + 0.0004*math.Exp(-math.Pow((w-2.7)/0.25, 2)) + 0.0006*math.Exp(-math.Pow((w-4.3)/0.2, 2))
		noise := 7e-4 * (0.6 + 0.25*w)
		u := 0.35 / w
		level := 9000 * math.Exp(-w/3)
		flux, errs, mask := make([]float64, n), make([]float64, n), make([]lightcurve.Flag, n)
		f := fit.CurveFit{Channel: c, Time: s.cube.Time, Flux: make([]float64, n), Err: make([]float64, n), Mask: mask,
			Transit: make([]float64, n), Trend: make([]float64, n), Level: level, Mid: mid}
		dead := m > 20 && (j == m/5 || j == m/2 || j == m-m/4)
		for i, t := range s.cube.Time {
			x := float64(i) / float64(n)
			f.Transit[i] = trough(t, depth, u)
			f.Trend[i] = 1 + 0.002*math.Exp(-x*25) - 0.0015*x*(1-0.2*w) + 0.0003*math.Sin(40*x)
			flux[i] = level * (f.Transit[i]*f.Trend[i] + noise*rng.NormFloat64())
			errs[i] = noise * level
			if rng.Float64() < 0.003 {
				flux[i] *= 1.05
				mask[i] = lightcurve.Outlier
			}
			if dead {
				flux[i], mask[i] = 0, lightcurve.Excluded
			}
			f.Flux[i], f.Err[i] = flux[i]/level, noise
		}
		s.cube.Channels = append(s.cube.Channels, c)
		s.cube.Flux = append(s.cube.Flux, flux)
		s.cube.Err = append(s.cube.Err, errs)
		s.cube.Mask = append(s.cube.Mask, mask)
		s.fits[j+1] = f
		p := spectrum.Point{Channel: c, Depth: depth + 6e-5*rng.NormFloat64()*noise/7e-4, DepthErr: 6e-5 * noise / 7e-4,
			Limb: []float64{u, 0.1 + 0.02*rng.NormFloat64()}, LimbErr: []float64{0.03, 0.04}, Chi2: float64(n), Dof: n, Used: n, Scatter: noise}
		p.RadiusRatio = math.Sqrt(p.Depth)
		if dead {
			p.Depth, p.DepthErr, p.Limb, p.LimbErr, p.Flag = nan, nan, nil, nil, "dead channel"
		} else if m > 20 && j == m/3 {
			p.Flag = "limb darkening at a bound"
		}
		s.points = append(s.points, p)
	}
	for i, t := range s.cube.Time {
		x := float64(i) / float64(n)
		trend := 1 + 0.002*math.Exp(-x*25) - 0.0012*x
		white.Time = append(white.Time, t)
		white.Transit = append(white.Transit, trough(t, 0.0145, 0.12))
		white.Trend = append(white.Trend, trend)
		white.Flux = append(white.Flux, (white.Transit[i]+1.1e-4*rng.NormFloat64()+2e-5*math.Sin(float64(i)/60))*trend)
		white.Err = append(white.Err, 1.1e-4)
		white.Mask = append(white.Mask, 0)
		if i%400 == 17 {
			white.Flux[i], white.Mask[i] = 1.01, lightcurve.Outlier
		}
	}
	s.fits[0] = white
	return s
}

// white is the fit of the white light curve.
func (s scene) white() fit.CurveFit {
	if len(s.fits) == 0 {
		return fit.CurveFit{}
	}
	return s.fits[0]
}

// channels sums the fits of the channels up.
func (s scene) channels() []diagnose.Summary {
	var out []diagnose.Summary
	for _, f := range s.fits[min(1, len(s.fits)):] {
		sum, err := diagnose.Summarise(f)
		if err != nil {
			panic(err)
		}
		out = append(out, sum)
	}
	return out
}

// spectrum assembles the points.
func (s scene) spectrum() spectrum.Spectrum {
	out, err := spectrum.Assemble(s.points, nil)
	if err != nil {
		panic(err)
	}
	out.Law, out.Policy = "quadratic", "free"
	return out
}

// A drawing is a named way to draw a scene.
type drawing struct {
	name string
	draw func(s scene) (Figure, error)
}

// drawings lists all figures.
func drawings() []drawing {
	return []drawing{
		{"map", func(s scene) (Figure, error) { return Map(s.cube) }},
		{"detrended", func(s scene) (Figure, error) { return Detrended(s.channels()) }},
		{"white", func(s scene) (Figure, error) { return WhiteFit(s.white()) }},
		{"grid", func(s scene) (Figure, error) { return ChannelGrid(s.channels(), s.points) }},
		{"scatter", func(s scene) (Figure, error) { return BinnedScatter(s.white(), s.channels()) }},
		{"limb", func(s scene) (Figure, error) { return LimbDarkening(s.points) }},
		{"spectrum", func(s scene) (Figure, error) { return Spectrum(s.spectrum()) }},
	}
}
