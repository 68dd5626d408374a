package transit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"rimlight/steps/limb"
)

// TestHalvesRound holds two equal halves against the round planet.
func TestHalvesRound(t *testing.T) {
	random := rand.New(rand.NewPCG(9, 1))
	worst := [2]float64{}
	for range draws(t, 3000) {
		r := math.Exp(random.Float64()*6 - 5)
		z := max(0, r-1) + random.Float64()*(1+r-max(0, r-1))
		if random.IntN(4) == 0 {
			z = math.Abs(1-r) * (1 + (random.Float64()-0.5)*math.Pow(10, -6*random.Float64()))
		}
		law := randomLaw(random)
		p, err := newProfile(law, LeastTolerance)
		if err != nil {
			t.Fatal(err)
		}
		if random.IntN(8) == 0 {
			r = math.Round(8*r+0.5) / 8 // where sums are exact
		}
		phi, angle := 7*random.Float64(), 7*random.Float64()
		s := Halves{Morning: r, Evening: r, Terminator: angle}.cover(&p, z*math.Cos(phi), z*math.Sin(phi))
		var d deficits
		var e edge
		d.cover(&p, r, z, &e)
		norm := math.Max(1, r)
		off := math.Abs(p.weigh(&s.value) - p.weigh(&d.value))
		byR := p.weigh(&s.byMorning) + p.weigh(&s.byEvening)
		byZ := p.weigh(&s.byX)*math.Cos(phi) + p.weigh(&s.byY)*math.Sin(phi)
		across := p.weigh(&s.byY)*math.Cos(phi) - p.weigh(&s.byX)*math.Sin(phi)
		offBy := max(math.Abs(byR-p.weigh(&d.byR)), math.Abs(byZ-p.weigh(&d.byZ)), math.Abs(across), math.Abs(p.weigh(&s.byTerminator)))
		worst = [2]float64{max(worst[0], off), max(worst[1], offBy)}
		if !(off < 1e-13*norm && offBy < 2e-12*norm) {
			t.Errorf("%+v, r = %g, z = %.17g, angles %g, %g: off by %.1e, derivatives %.1e", law, r, z, phi, angle, off, offBy)
		}
	}
	t.Logf("largest error %.1e, of derivatives %.1e", worst[0], worst[1])
}

// bruteHalves integrates over rings about the star's centre, with the stretch of
// each that either half covers.
func bruteHalves(law limb.Law, h Halves, x, y float64) float64 {
	z, phi := math.Hypot(x, y), math.Atan2(y, x)
	sum := 0.0
	for side, r := range []float64{h.Morning, h.Evening} {
		angle := h.Terminator + math.Pi*float64(side)
		sin, cos := math.Sincos(angle)
		along := x*cos + y*sin
		covered := func(rho float64) float64 {
			half := 0.0
			switch {
			case rho+z <= r:
				half = math.Pi
			case rho < z+r && rho > z-r:
				half = 2 * math.Atan(math.Sqrt((r-rho+z)*(r+rho-z)/((rho+z-r)*(rho+z+r))))
			}
			return overlap(phi, half, angle, math.Acos(max(-1, min(1, along/rho))))
		}
		cuts := []float64{0, 1, math.Abs(z - r), z + r, z, math.Abs(along), math.Hypot(x+r*sin, y-r*cos), math.Hypot(x-r*sin, y+r*cos)}
		slices.Sort(cuts)
		for i := 1; i < len(cuts) && cuts[i] <= 1; i++ {
			length := cuts[i] - cuts[i-1]
			for _, n := range steep {
				rho := cuts[i-1] + length*n.low
				if length > 0 && rho > 0 && rho < 1 {
					sum += rho * length * n.weight * covered(rho) * law.Intensity(math.Sqrt((1-rho)*(1+rho)))
				}
			}
		}
	}
	return sum / math.Pi / law.Norm()
}

func TestHalvesRandom(t *testing.T) {
	random := rand.New(rand.NewPCG(9, 2))
	worst := 0.0
	for range draws(t, 1500) {
		h := Halves{Morning: math.Exp(random.Float64()*4 - 4), Evening: math.Exp(random.Float64()*4 - 4), Terminator: 7 * random.Float64()}
		if random.IntN(2) == 0 {
			h.Evening = h.Morning * (1 + 0.2*(random.Float64()-0.5))
		}
		z, phi := random.Float64()*(1+max(h.Morning, h.Evening)), 7*random.Float64()
		x, y := z*math.Cos(phi), z*math.Sin(phi)
		law := randomLaw(random)
		p, err := newProfile(law, LeastTolerance)
		if err != nil {
			t.Fatal(err)
		}
		s := h.cover(&p, x, y)
		want := bruteHalves(law, h, x, y)
		off := math.Abs(p.weigh(&s.value) - want)
		worst = max(worst, off)
		if off > 1e-13*max(1, h.Morning, h.Evening) {
			t.Errorf("%+v at (%g, %g), %+v: covered %.14g, want %.14g", h, x, y, law, p.weigh(&s.value), want)
		}
	}
	t.Logf("largest difference %.1e", worst)
}
