package transit

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"rimlight/steps/limb"
)

// moved returns p with an argument, by its name, increased.
func (p Params) moved(name string, step float64) Params {
	p.Law.Coefficients = slices.Clone(p.Law.Coefficients)
	p.Spots = slices.Clone(p.Spots)
	fields := map[string]*float64{
		"Period": &p.Orbit.Period, "MidTransit": &p.Orbit.MidTransit, "AxisRatio": &p.Orbit.AxisRatio,
		"Inclination": &p.Orbit.Inclination, "Eccentricity": &p.Orbit.Eccentricity, "Periastron": &p.Orbit.Periastron,
		"RadiusRatio": &p.RadiusRatio, "Companion": &p.Companion, "Evening": &p.Evening, "Terminator": &p.Terminator,
	}
	for i := range p.Law.Coefficients {
		fields["u"+string(rune('1'+i))] = &p.Law.Coefficients[i]
	}
	for i := range p.Spots {
		s := &p.Spots[i]
		prefix := "spot" + string(rune('1'+i)) + "."
		fields[prefix+"Latitude"], fields[prefix+"Longitude"] = &s.Latitude, &s.Longitude
		fields[prefix+"Radius"], fields[prefix+"Contrast"] = &s.Radius, &s.Contrast
	}
	*fields[name] += step
	return p
}

// rich are light curves of two limbs and of spots.
func rich() map[string]Params {
	base := scenes()["B"]
	base.Companion = 0.07
	base.Tolerance = LeastTolerance
	limbs := base
	limbs.Evening, limbs.Terminator = 0.083, 0.3
	plain := limbs
	plain.Law = limb.Law{Name: limb.FourParameter, Coefficients: []float64{0.5, -0.2, 0.6, -0.3}}
	spots := base
	impact := base.Orbit.ImpactParameter()
	spots.Spots = []Spot{{Latitude: -impact, Longitude: 0.2, Radius: 0.12, Contrast: 0.7}, {Latitude: -impact + 0.15, Longitude: -0.9, Radius: 0.2, Contrast: 1.1}, {Latitude: 1, Longitude: 1.5, Radius: 0.3, Contrast: 0.5}}
	more := spots
	more.Law = limb.Law{Name: limb.Power2, Coefficients: []float64{0.7, 0.6}}
	return map[string]Params{"two limbs": limbs, "two limbs, four coefficients": plain, "spots": spots, "spots, power-2": more}
}

// TestFaceGradient compares derivatives with differences of fourth order.
func TestFaceGradient(t *testing.T) {
	for name, p := range rich() {
		contacts := p.Orbit.Path().Contacts(max(p.RadiusRatio, p.Evening))
		var times []float64
		for k := range 60 {
			times = append(times, p.Orbit.MidTransit+2*p.Orbit.Period+contacts.First+(contacts.Fourth-contacts.First)*(float64(k)+0.37)/60)
		}
		flux, grad, err := CurveGradient(times, p)
		if err != nil {
			t.Fatal(err)
		}
		if plain, _ := Curve(times, p); !slices.Equal(plain, flux) {
			t.Errorf("%s: flux differs without derivatives", name)
		}
		names := p.Arguments()
		if len(names) != len(grad) {
			t.Fatalf("%s: %d derivatives for %d names", name, len(grad), len(names))
		}
		for a, argument := range names {
			step := 2e-5
			if argument == "Period" || argument == "MidTransit" {
				step = 3e-6
			}
			var at [5][]float64
			for k := range at {
				if at[k], err = Curve(times, p.moved(argument, step*float64(k-2))); err != nil {
					t.Fatal(err)
				}
			}
			large := 0.0
			for _, g := range grad[a] {
				large = max(large, math.Abs(g))
			}
			for i := range times {
				want := (8*(at[3][i]-at[1][i]) - (at[4][i] - at[0][i])) / (12 * step)
				// Near a contact or where edges touch, differences lose digits.
				if off := math.Abs(grad[a][i] - want); off > 3e-5*large+1e-9 {
					t.Errorf("%s, sample %d: derivative by %s is %.10g, differences give %.10g (largest %.3g)", name, i, argument, grad[a][i], want, large)
				}
			}
			if large == 0 && !strings.HasPrefix(argument, "Period") {
				t.Errorf("%s: no derivative by %s", name, argument)
			}
		}
	}
}

// TestFaceExposure compares averages with those of many samples.
func TestFaceExposure(t *testing.T) {
	for name, p := range rich() {
		contacts := p.Orbit.Path().Contacts(max(p.RadiusRatio, p.Evening))
		const minutes = 12
		p.Tolerance = 0
		long := p
		long.Exposure = 60 * minutes
		var times []float64
		for k := range 12 {
			times = append(times, p.Orbit.MidTransit+1.02*(contacts.First+(contacts.Fourth-contacts.First)*float64(k)/11))
		}
		flux, grad, err := CurveGradient(times, long)
		if err != nil {
			t.Fatal(err)
		}
		for i, at := range times {
			const n = 1000
			dense := make([]float64, n)
			for k := range dense {
				dense[k] = at + minutes/1440.*((float64(k)+0.5)/n-0.5)
			}
			each, slopes, err := CurveGradient(dense, p)
			if err != nil {
				t.Fatal(err)
			}
			want := 0.0
			for _, f := range each {
				want += f / n
			}
			if math.Abs(flux[i]-want) > 1e-7 {
				t.Errorf("%s, sample %d: mean flux %.12g, want %.12g", name, i, flux[i], want)
			}
			for a := range grad {
				want := 0.0
				for _, g := range slopes[a] {
					want += g / n
				}
				if math.Abs(grad[a][i]-want) > 1e-3*max(1, math.Abs(want)) {
					t.Errorf("%s, sample %d: mean derivative %d is %.8g, want %.8g", name, i, a, grad[a][i], want)
				}
			}
		}
	}
}

// TestSpotBump has the sign of a crossed dark spot, and a spot of no contrast.
func TestSpotBump(t *testing.T) {
	p := rich()["spots"]
	plain := p
	plain.Spots = nil
	times := []float64{p.Orbit.MidTransit}
	for k := range 40 {
		times = append(times, p.Orbit.MidTransit+0.002*float64(k-20))
	}
	without, err := Curve(times, plain)
	if err != nil {
		t.Fatal(err)
	}
	p.Spots = p.Spots[:1]
	with, err := Curve(times, p)
	if err != nil {
		t.Fatal(err)
	}
	highest := 0.0
	for i := range with {
		highest = max(highest, with[i]-without[i])
	}
	if highest < 0.2*0.08*0.08 {
		t.Errorf("a planet before a dark spot adds %g to the flux at most", highest)
	}
	p.Spots[0].Contrast = 1
	if with, err = Curve(times, p); err != nil {
		t.Fatal(err)
	}
	for i := range with {
		if math.Abs(with[i]-without[i]) > 1e-15 {
			t.Fatalf("a spot like its surroundings changes the flux by %g", with[i]-without[i])
		}
	}
}

func TestFaceRefuses(t *testing.T) {
	for want, change := range map[string]func(p *Params){
		"Evening is -1":       func(p *Params) { p.Evening = -1 },
		"Terminator is NaN":   func(p *Params) { p.Terminator = math.NaN() },
		"1 spots and two":     func(p *Params) { p.Evening, p.Spots = 0.1, []Spot{{Radius: 0.1}} },
		"latitude of spot 2":  func(p *Params) { p.Spots = []Spot{{Radius: 0.1}, {Latitude: 2, Radius: 0.1}} },
		"longitude of spot 1": func(p *Params) { p.Spots = []Spot{{Longitude: math.Inf(1), Radius: 0.1}} },
		"radius of spot 1":    func(p *Params) { p.Spots = []Spot{{}} },
		"contrast of spot 1":  func(p *Params) { p.Spots = []Spot{{Radius: 0.1, Contrast: -1}} },
		"leave the star":      func(p *Params) { p.Spots = []Spot{{Radius: math.Pi / 2}} },
	} {
		p := scenes()["A"]
		change(&p)
		if _, _, err := CurveGradient([]float64{0}, p); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: error %v", want, err)
		}
	}
}

// TestFaceExtremes has planets and spots of all sizes in all places: nothing may
// come out that is not a number.
func TestFaceExtremes(t *testing.T) {
	random := rand.New(rand.NewPCG(10, 4))
	lengths := []float64{0, 1e-12, 1e-5, 0.1, 0.5, 1, 1.5, 3, 1e3, 1e9}
	for range draws(t, 4000) {
		pick := func() float64 { return lengths[random.IntN(len(lengths))] }
		law := randomLaw(random)
		p, err := newProfile(law, 0)
		if err != nil {
			t.Fatal(err)
		}
		r, x, y := pick(), pick()*(1-2*float64(random.IntN(2))), pick()
		if random.IntN(2) == 0 {
			x, y = math.Abs(1-r)+1e-9*pick(), 0
		}
		all := [][terms]float64{}
		h := Halves{Morning: r, Evening: pick(), Terminator: math.Pi / 4 * float64(random.IntN(9))}
		s := h.cover(&p, x, y)
		all = append(all, s.value, s.byX, s.byY, s.byMorning, s.byEvening, s.byTerminator)
		c := newCap(Spot{Latitude: math.Pi / 4 * float64(random.IntN(5)-2), Longitude: math.Pi / 4 * float64(random.IntN(9)-4), Radius: []float64{1e-9, 0.1, math.Pi / 4, math.Pi / 2}[random.IntN(4)]})
		for _, st := range []stain{c.whole(&p), func() stain { st, _ := c.covered(&p, r, x, y); return st }()} {
			all = append(all, st.value, st.byX, st.byY, st.byR, st.byLatitude, st.byLongitude, st.byRadius)
		}
		for _, v := range all {
			for _, v := range v {
				if v-v != 0 {
					t.Fatalf("r = %g at (%g, %g), %+v, %+v: %v", r, x, y, h, c, all)
				}
			}
		}
		if v := p.weigh(&s.value); law.Physical() && (v < -1e-9*max(1, r, h.Evening) || v > 1+1e-9*max(1, r, h.Evening)) {
			t.Errorf("%+v at (%g, %g), profile %+v: covered %g", h, x, y, p.shape, v)
		}
	}
}
