package transit

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

func TestEclipse(t *testing.T) {
	p := EclipseParams{Orbit: scenes()["A"].Orbit, RadiusRatio: 0.1, Depth: 2e-3, Companion: 0.25}
	flux, err := Eclipse([]float64{0, 0.75, 1.5, -1.5 + 30, 3}, p)
	if err != nil {
		t.Fatal(err)
	}
	high := 1 + 2e-3/1.25
	for i, want := range []float64{high, high, 1, 1, high} {
		if math.Abs(flux[i]-want) > 1e-15 {
			t.Errorf("flux %d is %.17g, want %.17g", i, flux[i], want)
		}
	}
	// A third of the way in, by the area of two segments of circles.
	r, z := 0.1, 1.0333
	half := func(a, b float64) float64 { return math.Acos((z*z + a*a - b*b) / (2 * z * a)) }
	star, planet := half(1, r), half(r, 1)
	want := (star - math.Sin(star)*math.Cos(star) + r*r*(planet-math.Sin(planet)*math.Cos(planet))) / (math.Pi * r * r)
	if got, _, _ := eclipsed(r, z); math.Abs(got-want) > 1e-13 {
		t.Errorf("hidden %.15g, want %.15g", got, want)
	}
	// A planet larger than its star never is hidden.
	if got, _, _ := eclipsed(2, 0.5); math.Abs(got-0.25) > 1e-15 {
		t.Errorf("hidden %.15g of a planet of twice the star's radius, want a quarter", got)
	}
}

func TestEclipseGradient(t *testing.T) {
	random := rand.New(rand.NewPCG(11, 1))
	for _, exposure := range []float64{0, 900} {
		for range 12 {
			scene := randomParams(random)
			p := EclipseParams{Orbit: scene.Orbit, RadiusRatio: 0.05 + scene.RadiusRatio, Depth: 0.7, Companion: 0.1, Exposure: exposure}
			p.Orbit.Eccentricity = 0.2
			if p.Orbit.Validate() != nil {
				continue
			}
			var times []float64
			for k := range 400 {
				times = append(times, p.Orbit.MidTransit+p.Orbit.Period*(2+float64(k)/400))
			}
			flux, grad, err := EclipseGradient(times, p)
			if err != nil {
				t.Fatal(err)
			}
			fields := func(p *EclipseParams) []*float64 {
				o := &p.Orbit
				return []*float64{&o.Period, &o.MidTransit, &o.AxisRatio, &o.Inclination, &o.Eccentricity, &o.Periastron, &p.RadiusRatio, &p.Depth, &p.Companion}
			}
			for a := range grad {
				const step = 2e-6
				high, low := p, p
				*fields(&high)[a] += step
				*fields(&low)[a] -= step
				above, err1 := Eclipse(times, high)
				below, err2 := Eclipse(times, low)
				if err1 != nil || err2 != nil {
					t.Fatal(err1, err2)
				}
				bad, large := 0, 0.0
				for i := range times {
					large = max(large, math.Abs(grad[a][i]))
				}
				for i := range times {
					want := (above[i] - below[i]) / (2 * step)
					if math.Abs(grad[a][i]-want) > 1e-3*large+1e-3 {
						bad++ // differences across a contact say little
					}
				}
				if bad > 8 {
					t.Errorf("%+v: %d derivatives by %s differ", p, bad, p.Arguments()[a])
				}
			}
			for i, f := range flux {
				if !(f >= 1-1e-12 && f <= 1+0.7/1.1+1e-15) {
					t.Errorf("%+v, %g: flux %g", p, times[i], f)
				}
			}
		}
	}
}

func TestEclipseRefuses(t *testing.T) {
	for want, change := range map[string]func(p *EclipseParams){
		"RadiusRatio is 0": func(p *EclipseParams) { p.RadiusRatio = 0 },
		"Depth is NaN":     func(p *EclipseParams) { p.Depth = math.NaN() },
		"Companion is -1":  func(p *EclipseParams) { p.Companion = -1 },
		"Exposure is -1":   func(p *EclipseParams) { p.Exposure = -1 },
		"Period":           func(p *EclipseParams) { p.Orbit.Period = 0 },
	} {
		p := EclipseParams{Orbit: scenes()["A"].Orbit, RadiusRatio: 0.1}
		change(&p)
		if _, err := Eclipse([]float64{0}, p); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: error %v", want, err)
		}
	}
	if _, err := Eclipse([]float64{math.Inf(1)}, EclipseParams{Orbit: scenes()["A"].Orbit, RadiusRatio: 0.1}); err == nil {
		t.Error("an infinite time is accepted")
	}
}
