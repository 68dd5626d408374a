package simulate

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"

	"rimlight/steps/lightcurve"
)

// A Truth is what was put into a simulation.
type Truth struct {
	Channels []lightcurve.Channel
	Depth    []float64 // (planet radius / stellar radius)^2, per channel
	U1       []float64 // limb-darkening coefficients, per channel
	U2       []float64
	Dead     []bool // channels without signal
}

// stream keeps the simulation's random numbers apart from any others made from
// the same seed.
const stream = 0x73696d756c617465

// Make simulates the raw data of a scenario: fluxes in electrons, errors as a
// calibration would estimate them, and the positions X and Y in pixels.
// The same scenario gives the same data. It is an error when [Scenario.Validate]
// finds one, and when the depth of a channel is not between 0 and 1.
func Make(s Scenario) (lightcurve.Cube, Truth, error) {
	if err := s.Validate(); err != nil {
		return lightcurve.Cube{}, Truth{}, err
	}
	n, m := s.Integrations, s.Channels
	rng := rand.New(rand.NewPCG(s.Seed, stream))
	cube := lightcurve.Cube{Time: make([]float64, n)}
	for i := range cube.Time {
		cube.Time[i] = s.Start + float64(i)*s.Cadence/86400
	}
	x, y := s.pointing(rng), s.pointing(rng)
	cube.Aux = []lightcurve.Series{{Name: "X", Unit: "pix", Value: x}, {Name: "Y", Unit: "pix", Value: y}}
	dead := make([]bool, m)
	for _, k := range rng.Perm(m)[:s.DeadChannels] {
		dead[k] = true
	}
	truth := Truth{Dead: dead}
	quad, z := newRule(nodes), s.separations(cube.Time)
	deaths := 0
	for k := range m {
		width := (s.WaveHi - s.WaveLo) / float64(m)
		ch := lightcurve.Channel{Index: k, Lo: s.WaveLo + width*float64(k), Hi: s.WaveLo + width*float64(k+1)}
		wave := (ch.Lo + ch.Hi) / 2
		u1, u2 := s.limb(wave)
		depth := s.depth(wave)
		if !(depth >= 0 && depth <= 1) {
			return lightcurve.Cube{}, Truth{}, fmt.Errorf("simulate: Depth, Slope and Bands come to a depth of %g at %g um; expected a number from 0 to 1", depth, wave)
		}
		cube.Channels = append(cube.Channels, ch)
		truth.Channels = append(truth.Channels, ch)
		truth.Depth = append(truth.Depth, depth)
		truth.U1 = append(truth.U1, u1)
		truth.U2 = append(truth.U2, u2)
		flux, err := s.channel(rng, quad, z, x, y, wave, math.Sqrt(depth), u1, u2)
		if dead[k] {
			s.kill(rng, deaths, flux, err)
			deaths++
		}
		cube.Flux = append(cube.Flux, flux)
		cube.Err = append(cube.Err, err)
		cube.Mask = append(cube.Mask, mask(flux, err))
	}
	return cube, truth, nil
}

// pointing is a position in pixels: a slow wander and a fast jitter about a
// mean.
func (s Scenario) pointing(rng *rand.Rand) []float64 {
	out := make([]float64, s.Integrations)
	const memory = 0.995 // correlation from one integration to the next
	slow, mean := rng.NormFloat64(), 4+rng.Float64()
	for i := range out {
		slow = memory*slow + math.Sqrt(1-memory*memory)*rng.NormFloat64()
		out[i] = mean + s.PointingWalk*slow + s.PointingStep*rng.NormFloat64()
	}
	return out
}

// separations gives, for each integration, the separations at the two Gauss
// points of each part of its exposure. The mean of their fluxes is that of the
// exposure to fourth order in the length of a part, and to about 1e-7 where a
// contact falls into it.
func (s Scenario) separations(times []float64) [][]float64 {
	parts := s.parts()
	out := make([][]float64, len(times))
	length := s.Exposure / 86400 / float64(parts)
	h := length / 2 / math.Sqrt(3)
	for i, t := range times {
		for k := range parts {
			middle := t + length*(float64(k)-float64(parts-1)/2)
			out[i] = append(out[i], s.separation(middle-h), s.separation(middle+h))
		}
	}
	return out
}

// parts is the number of parts that an exposure is cut into: enough for each to
// be below a fortieth of the time in which the planet moves by its diameter, and
// not more than 100.
func (s Scenario) parts() int {
	speed := 2 * math.Pi * s.AxisRatio / (s.Period * 86400) // stellar radii per second
	moved := speed * s.Exposure / (2 * math.Sqrt(math.Max(s.Depth, 1e-6)))
	return int(math.Min(100, 1+math.Floor(40*moved)))
}

// channel simulates one light curve.
func (s Scenario) channel(rng *rand.Rand, quad rule, z [][]float64, x, y []float64, wave, r, u1, u2 float64) (flux, errs []float64) {
	n := len(z)
	flux, errs = make([]float64, n), make([]float64, n)
	level := s.Electrons * s.throughput(wave)
	vary := func() float64 { return 0.6 + 0.8*rng.Float64() }
	settling, drift := s.Settling*vary()*math.Pow(wave/2, -0.3), s.Drift*(2*rng.Float64()-1)
	leakX, leakY := s.Leak*(2*rng.Float64()-1), s.Leak*(2*rng.Float64()-1)
	excess := 1 + s.ExcessNoise*rng.Float64()
	meanX, meanY := x[0], y[0]
	for i := range flux {
		dark := 0.0
		for _, at := range z[i] {
			dark += quad.blocked(r, at, u1, u2) / float64(len(z[i]))
		}
		t := float64(i) * s.Cadence / 86400
		trend := 1 - settling*math.Exp(-t/s.SettlingTime) + drift*(float64(i)/float64(n)-0.5) + leakX*(x[i]-meanX) + leakY*(y[i]-meanY)
		expected := level * trend * (1 - dark)
		sigma := math.Sqrt(expected + s.ReadNoise*s.ReadNoise)
		flux[i] = expected + excess*sigma*rng.NormFloat64()
		errs[i] = sigma
		switch hit := rng.Float64(); {
		case hit < s.OutlierShare:
			size := sigma * math.Exp(math.Log(8)+rng.Float64()*math.Log(6))
			if rng.Float64() < 0.1 {
				size = -size
			}
			flux[i] += size
		case hit < s.OutlierShare+s.MissingShare:
			flux[i] = math.NaN()
		case hit < s.OutlierShare+s.MissingShare+s.ZeroShare:
			flux[i] = 0
		}
	}
	return flux, errs
}

// kill makes a channel dead, in one of three ways in turn.
func (s Scenario) kill(rng *rand.Rand, way int, flux, errs []float64) {
	for i := range flux {
		switch way % 3 {
		case 0:
			flux[i] = math.NaN()
		case 1:
			flux[i] = 0
		default:
			flux[i], errs[i] = (s.ReadNoise+1)*rng.NormFloat64(), s.ReadNoise+1
		}
	}
}

// mask flags what a reader of the file would flag.
func mask(flux, errs []float64) []lightcurve.Flag {
	out := make([]lightcurve.Flag, len(flux))
	for i, f := range flux {
		switch {
		case f != f || errs[i] != errs[i]:
			out[i] |= lightcurve.Missing
		case f == 0:
			out[i] |= lightcurve.Zero
		case f < 0:
			out[i] |= lightcurve.Negative
		}
	}
	return out
}

// CSV gives the truth as a table: wave_lo and wave_hi in um, then depth, u1,
// u2, and dead (1 for a channel without signal). It is an error when the slices
// differ in length.
func (t Truth) CSV() ([]byte, error) {
	if m := len(t.Channels); len(t.Depth) != m || len(t.U1) != m || len(t.U2) != m || len(t.Dead) != m {
		return nil, fmt.Errorf("truth: %d depths, %d u1, %d u2 and %d marks of dead channels; expected one of each for %d channels",
			len(t.Depth), len(t.U1), len(t.U2), len(t.Dead), m)
	}
	var b strings.Builder
	b.WriteString("wave_lo,wave_hi,depth,u1,u2,dead\n")
	for i, c := range t.Channels {
		for _, x := range []float64{c.Lo, c.Hi, t.Depth[i], t.U1[i], t.U2[i]} {
			b.WriteString(strconv.FormatFloat(x, 'g', -1, 64))
			b.WriteByte(',')
		}
		if t.Dead[i] {
			b.WriteString("1\n")
		} else {
			b.WriteString("0\n")
		}
	}
	return []byte(b.String()), nil
}
