package fit

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limbtable"
)

// whiteOf fits the white curve of a scene.
func whiteOf(t testing.TB, s scene) Posterior {
	t.Helper()
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	p, _, err := White(curve, withWhite(s.model(), whitePriors()))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// truthTable is a limb-darkening table of a scene's true coefficients, off by
// the given amount.
func (s scene) truthTable(off float64) limbtable.Table {
	table := limbtable.Table{Law: LawQuadratic, Channels: s.cube.Channels}
	for j := range s.u1 {
		table.U1 = append(table.U1, s.u1[j]+off)
		table.U2 = append(table.U2, s.u2[j])
		table.U1Err = append(table.U1Err, 0.02)
		table.U2Err = append(table.U2Err, 0.02)
	}
	return table
}

func TestChannelPolicies(t *testing.T) {
	s := newScene(t, 21, 800, 4)
	white := whiteOf(t, s)
	curve := lightcurve.Curves(s.cube)[0]
	model := s.model()
	fits := map[string]struct{ depth, err, u1, u1Err float64 }{}
	for _, policy := range []string{PolicyFree, PolicyFixed, PolicyPrior} {
		model.LimbPolicy = policy
		model.Limb = s.truthTable(0)
		p, fitted, err := Channel(curve, white, withChannel(model, channelPriors("u1", "u2", -1, 2)))
		if err != nil {
			t.Fatal(err)
		}
		if p.Flag != "" || math.Abs(p.Depth-s.depth[0]) > 5*p.DepthErr || p.Used != 800 || p.Masked != 0 || p.Dof != map[string]int{PolicyFree: 792, PolicyFixed: 794, PolicyPrior: 792}[policy] {
			t.Errorf("%s: depth %g +- %g, want %g; %+v", policy, p.Depth, p.DepthErr, s.depth[0], p)
		}
		if math.Abs(p.DepthErr-2*p.RadiusRatio*p.RadiusRatioErr) > 1e-15 || math.Abs(p.Scatter/375e-6-1) > 0.1 {
			t.Errorf("%s: error %g, scatter %g", policy, p.DepthErr, p.Scatter)
		}
		if len(fitted.Transit) != 800 || fitted.Channel != curve.Channel {
			t.Errorf("%s: curve fit of %d samples", policy, len(fitted.Transit))
		}
		fits[policy] = struct{ depth, err, u1, u1Err float64 }{p.Depth, p.DepthErr, p.Limb[0], p.LimbErr[0]}
	}
	if f := fits[PolicyFixed]; f.u1 != s.u1[0] || f.u1Err != 0 {
		t.Errorf("fixed limb darkening %g +- %g, want %g", f.u1, f.u1Err, s.u1[0])
	}
	if !(fits[PolicyFixed].err < fits[PolicyPrior].err && fits[PolicyPrior].err < fits[PolicyFree].err) {
		t.Errorf("errors do not grow with freedom: %+v", fits)
	}
	if e := fits[PolicyPrior].u1Err; !(e > 0 && e <= 0.02) {
		t.Errorf("error of u1 under a prior of 0.02: %g", e)
	}
}

func TestChannelLaws(t *testing.T) {
	s := newScene(t, 22, 500, 2)
	white := whiteOf(t, s)
	curve := lightcurve.Curves(s.cube)[1]
	model := s.model()
	model.LimbLaw = LawLinear
	p, _, err := Channel(curve, white, withChannel(model, channelPriors("u1", "u2", -1, 2)))
	if err != nil {
		t.Fatal(err)
	}
	if p.Limb[1] != 0 || p.LimbErr[1] != 0 || !(p.LimbErr[0] > 0) {
		t.Errorf("linear law: %v +- %v", p.Limb, p.LimbErr)
	}
	model.LimbLaw = LawUniform
	p, _, err = Channel(curve, white, withChannel(model, channelPriors("u1", "u2", -1, 2)))
	if err != nil {
		t.Fatal(err)
	}
	if p.Limb[0] != 0 || p.Limb[1] != 0 || p.LimbErr[0] != 0 {
		t.Errorf("uniform law: %v +- %v", p.Limb, p.LimbErr)
	}
	// Kipping's sampling reaches the same minimum where that is inside its range.
	model.LimbLaw = LawQuadratic
	a, _, err := Channel(curve, white, withChannel(model, channelPriors("u1", "u2", -1, 2)))
	if err != nil {
		t.Fatal(err)
	}
	b, _, err := Channel(curve, white, withChannel(model, channelPriors("q1", "q2", 0, 1)))
	if err != nil {
		t.Fatal(err)
	}
	inRange := a.Limb[0] > 0.01 && a.Limb[0]+2*a.Limb[1] > 0.01
	if !inRange || math.Abs(a.Depth-b.Depth) > 1e-3*a.DepthErr || math.Abs(a.DepthErr/b.DepthErr-1) > 1e-3 ||
		math.Abs(a.LimbErr[0]/b.LimbErr[0]-1) > 0.05 {
		t.Errorf("u1, u2: %+v\nq1, q2: %+v", a, b)
	}
}

func TestChannelUnmeasured(t *testing.T) {
	s := newScene(t, 23, 400, 2)
	white := whiteOf(t, s)
	only := func(keep func(phase float64) bool) func(c *lightcurve.Curve) {
		return func(c *lightcurve.Curve) {
			for i := range c.Mask {
				if !keep(c.Time[i] - s.orbit.MidTransit) {
					c.Mask[i] = lightcurve.Missing
					c.Flux[i] = math.NaN()
				}
			}
		}
	}
	for _, c := range []struct {
		name   string
		change func(c *lightcurve.Curve)
		want   string
	}{
		{"dead", only(func(float64) bool { return false }), "only 0 usable samples"},
		{"short", only(func(p float64) bool { return p > 0 && p < 0.02 }), "usable samples; at least 50"},
		{"no transit", only(func(p float64) bool { return math.Abs(p) > 0.06 }), "usable samples in transit"},
		{"no baseline", only(func(p float64) bool { return math.Abs(p) < 0.04 }), "usable samples out of transit"},
		{"negative", func(c *lightcurve.Curve) {
			for i := range c.Flux {
				c.Flux[i] -= 1e4
			}
		}, "median flux is not above zero"},
		{"errors missing", func(c *lightcurve.Curve) {
			for i := range c.Err {
				c.Err[i] = math.NaN()
			}
		}, "only 0 usable samples"},
	} {
		curve := lightcurve.Curves(s.cube)[0]
		c.change(&curve)
		p, fitted, err := Channel(curve, white, withChannel(s.model(), channelPriors("u1", "u2", -1, 2)))
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		if p.Good() || !math.IsNaN(p.Depth) || !strings.Contains(p.Flag, c.want) || len(fitted.Transit) != 400 || p.Used+p.Masked != 400 {
			t.Errorf("%s: %+v, want flag %q", c.name, p, c.want)
		}
	}
}

func TestChannelErrors(t *testing.T) {
	s := newScene(t, 24, 300, 2)
	white := whiteOf(t, s)
	curve := lightcurve.Curves(s.cube)[0]
	gappy := s.truthTable(0)
	gappy.Channels = gappy.Channels[1:]
	otherLaw := s.truthTable(0)
	otherLaw.Law = LawLinear
	noErrors := s.truthTable(0)
	noErrors.U1Err = make([]float64, 2)
	for _, c := range []struct {
		name   string
		policy string
		table  limbtable.Table
		white  Posterior
		priors Priors
		want   string
	}{
		{"orbit", PolicyFree, limbtable.Table{}, white, append(Priors{uniform("midTransit", 0, 1)}, channelPriors("u1", "u2", 0, 1)...), "midTransit is held at the white fit's value"},
		{"no radius", PolicyFree, limbtable.Table{}, white, Priors{uniform("u1", 0, 1)}, "no prior leaves radiusRatio free"},
		{"no rows", PolicyFree, limbtable.Table{}, white, Priors{uniform("radiusRatio", 0, 1)}, "no rows for it"},
		{"no table", PolicyFixed, limbtable.Table{}, white, channelPriors("u1", "u2", 0, 1), "channel 0 (0.6 to 2.9 um): the limb-darkening policy is fixed, but there is no"},
		{"gap", PolicyPrior, gappy, white, channelPriors("u1", "u2", 0, 1), "does not reach the channel 0.6 to 2.9 um"},
		{"law", PolicyPrior, otherLaw, white, channelPriors("u1", "u2", 0, 1), "is for the linear law"},
		{"no errors", PolicyPrior, noErrors, white, channelPriors("u1", "u2", 0, 1), "error 0 for u1"},
		{"no white fit", PolicyFree, limbtable.Table{}, Posterior{}, channelPriors("u1", "u2", 0, 1), "expected the result of a white fit"},
	} {
		model := s.model()
		model.LimbPolicy, model.Limb = c.policy, c.table
		_, _, err := Channel(curve, c.white, withChannel(model, c.priors))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q", c.name, err, c.want)
		}
	}
}

func BenchmarkChannel(b *testing.B) {
	s := newScene(b, 25, 3000, 3)
	white := whiteOf(b, s)
	curve := lightcurve.Curves(s.cube)[1]
	model, priors := s.model(), channelPriors("u1", "u2", -1, 2)
	for b.Loop() {
		if _, _, err := Channel(curve, white, withChannel(model, priors)); err != nil {
			b.Fatal(err)
		}
	}
}

// TestChannelSettling gives a channel another settling time than the white
// curve's: held there, the depth suffers; freed by a row, it does not.
func TestChannelSettling(t *testing.T) {
	s := newScene(t, 26, 800, 1)
	white := whiteOf(t, s)
	curve := quiet(t, s, 0.115, 0.35, 0.2) // settles within 0.015 d
	for k, name := range white.Names {
		switch name {
		case "settlingTime":
			white.Value[k], white.Err[k] = 0.06, 0.001
		case "axisRatio":
			white.Value[k] = 9.4
		case "inclination":
			white.Value[k] = 87.3
		case "midTransitOffset":
			white.Value[k] = s.orbit.MidTransit - s.model().MidTransit
		}
	}
	priors := channelPriors("u1", "u2", -1, 2)
	held, _, err := Channel(curve, white, withChannel(s.model(), priors))
	if err != nil {
		t.Fatal(err)
	}
	free, _, err := Channel(curve, white, withChannel(s.model(), append(priors, Prior{Name: "settlingTime", Kind: LogUniform, A: 0.001, B: 0.1})))
	if err != nil {
		t.Fatal(err)
	}
	const depth = 0.115 * 0.115
	if math.Abs(free.Depth-depth) > 1e-8 || free.Chi2 > 1e-3 || !(math.Abs(held.Depth-depth) > 10*held.DepthErr) {
		t.Errorf("depth %.8f with settling free (chi-square %g), %.8f +- %.8f held; want %.8f", free.Depth, free.Chi2, held.Depth, held.DepthErr, depth)
	}
	for k, name := range white.Names {
		if name == "settlingTime" && (held.ShiftGeometry[k] == 0 || free.ShiftGeometry[k] != 0) {
			t.Errorf("shift with the settling time %g held, %g free", held.ShiftGeometry[k], free.ShiftGeometry[k])
		}
	}
}
