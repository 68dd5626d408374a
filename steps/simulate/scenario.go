package simulate

import (
	"fmt"
	"math"
)

// A Scenario is an observation to be simulated.
type Scenario struct {
	Integrations int     // number of integrations, at least 10
	Channels     int     // number of wavelength channels, at least 1
	WaveLo       float64 // um, lower edge of the first channel
	WaveHi       float64 // um, upper edge of the last channel; channels are equally wide

	Start    float64 // BJD_TDB of the middle of the first integration, days
	Cadence  float64 // time from one integration to the next, s
	Exposure float64 // time over which an integration collects light, s

	Period       float64 // d
	MidTransit   float64 // BJD_TDB of inferior conjunction, days
	AxisRatio    float64 // semi-major axis in stellar radii
	Inclination  float64 // deg
	Eccentricity float64
	Periastron   float64 // argument of periastron, deg

	Depth float64 // typical transit depth, (planet radius / stellar radius)^2
	Slope float64 // scattering slope: depth added per e-folding of wavelength towards the blue, below 1.2 um
	Bands []Band  // absorption added to the depth

	Electrons   float64 // collected per integration by the brightest channel
	ReadNoise   float64 // electrons per integration and channel
	ExcessNoise float64 // scatter above the quoted errors, as a fraction, at most; differs by channel

	Settling     float64 // amplitude of the settling at the start, as a fraction of the flux, typical
	SettlingTime float64 // its e-folding time, d
	Drift        float64 // linear drift over the visit, as a fraction of the flux, typical
	PointingWalk float64 // standard deviation of the slow part of X and Y, pixels
	PointingStep float64 // standard deviation of the fast part of X and Y, pixels
	Leak         float64 // flux change per pixel of pointing, as a fraction, typical

	OutlierShare float64 // share of samples hit by cosmic rays
	MissingShare float64 // share of samples that are NaN
	ZeroShare    float64 // share of samples that are exactly zero
	DeadChannels int     // channels without signal

	Seed uint64 // of all random numbers
}

// A Band is an absorption band: a Gaussian in the logarithm of wavelength.
type Band struct {
	Wave   float64 // um, centre
	Width  float64 // standard deviation in ln(wavelength)
	Height float64 // added to the depth
}

// Continuous is the scenario of the demo: one uninterrupted stare at a warm
// giant planet that crosses a quiet star, 3000 integrations of 80 channels
// from 0.6 to 5.2 um.
func Continuous(seed uint64) Scenario {
	return Scenario{
		Integrations: 3000, Channels: 80, WaveLo: 0.6, WaveHi: 5.2,
		Start: 2460512.2113, Cadence: 8.2, Exposure: 8,
		Period: 3.2147, MidTransit: 2460512.35234, AxisRatio: 9.52, Inclination: 87.71, Eccentricity: 0, Periastron: 90,
		Depth: 0.01298, Slope: 0.0004,
		Bands:     []Band{{1.41, 0.055, 0.00021}, {1.9, 0.05, 0.00016}, {2.75, 0.09, 0.0003}, {3.35, 0.035, 0.00012}, {4.32, 0.03, 0.0004}},
		Electrons: 1.4e7, ReadNoise: 250, ExcessNoise: 0.15,
		Settling: 0.0013, SettlingTime: 0.023, Drift: 0.0004, PointingWalk: 0.06, PointingStep: 0.03, Leak: 0.002,
		OutlierShare: 0.003, MissingShare: 0.0005, ZeroShare: 0.0001, DeadChannels: 3,
		Seed: seed,
	}
}

// mostSamples bounds the samples of a simulation, and the positions of the planet
// that it takes: some 300 MB.
const mostSamples = 1e7

// Validate checks that a scenario can be simulated. Integrations times Channels is
// at most 1e7; so is Integrations times the parts that an exposure has to be cut
// into, at most 100.
func (s Scenario) Validate() error {
	type limit struct {
		name   string
		x      float64
		lo, hi float64
	}
	for _, l := range []limit{
		{"Integrations", float64(s.Integrations), 10, 1e6}, {"Channels", float64(s.Channels), 1, 1e5},
		{"Integrations*Channels", float64(s.Integrations) * float64(s.Channels), 10, mostSamples},
		{"WaveLo", s.WaveLo, 1e-3, 1e3}, {"WaveHi", s.WaveHi, s.WaveLo * (1 + 1e-9), 1e3},
		{"Start", s.Start, -1e8, 1e8}, {"Cadence", s.Cadence, 1e-3, 1e6}, {"Exposure", s.Exposure, 0, s.Cadence},
		{"Period", s.Period, 1e-3, 1e6}, {"MidTransit", s.MidTransit, -1e8, 1e8}, {"AxisRatio", s.AxisRatio, 1, 1e6},
		{"Inclination", s.Inclination, 0, 180}, {"Eccentricity", s.Eccentricity, 0, 0.95}, {"Periastron", s.Periastron, -360, 360},
		{"Depth", s.Depth, 0, 0.25}, {"Slope", s.Slope, -0.1, 0.1}, {"Electrons", s.Electrons, 1, 1e15}, {"ReadNoise", s.ReadNoise, 0, 1e9},
		{"ExcessNoise", s.ExcessNoise, 0, 10}, {"Settling", s.Settling, -0.5, 0.5}, {"SettlingTime", s.SettlingTime, 1e-6, 1e3},
		{"Drift", s.Drift, -0.5, 0.5}, {"PointingWalk", s.PointingWalk, 0, 100}, {"PointingStep", s.PointingStep, 0, 100}, {"Leak", s.Leak, -0.1, 0.1},
		{"OutlierShare", s.OutlierShare, 0, 0.5}, {"MissingShare", s.MissingShare, 0, 0.5}, {"ZeroShare", s.ZeroShare, 0, 0.5},
		{"DeadChannels", float64(s.DeadChannels), 0, float64(s.Channels)},
	} {
		if !(l.x >= l.lo && l.x <= l.hi) {
			return fmt.Errorf("simulate: %s is %g; expected a number from %g to %g", l.name, l.x, l.lo, l.hi)
		}
	}
	if n := float64(s.Integrations) * float64(s.parts()); n > mostSamples {
		return fmt.Errorf("simulate: Exposure is %g s, in which the planet moves so far that %d integrations need %g positions; expected at most %g: shorten Exposure or lower Integrations",
			s.Exposure, s.Integrations, n, float64(mostSamples))
	}
	if len(s.Bands) > 1000 {
		return fmt.Errorf("simulate: %d bands; expected at most 1000", len(s.Bands))
	}
	for i, b := range s.Bands {
		if !(b.Wave > 0 && b.Width > 0 && math.Abs(b.Height) <= 0.1) {
			return fmt.Errorf("simulate: band %d has wavelength %g, width %g, height %g; expected positive wavelength and width, height within 0.1", i+1, b.Wave, b.Width, b.Height)
		}
	}
	return nil
}

// depth is the true transit depth at a wavelength in um.
func (s Scenario) depth(wave float64) float64 {
	d := s.Depth
	if wave < 1.2 {
		d += s.Slope * math.Log(1.2/wave)
	}
	for _, b := range s.Bands {
		x := math.Log(wave/b.Wave) / b.Width
		d += b.Height * math.Exp(-x*x/2)
	}
	return d
}

// limb gives the quadratic limb-darkening coefficients at a wavelength in um:
// strong in the blue, weak in the infrared, as for a star like the Sun.
func (s Scenario) limb(wave float64) (u1, u2 float64) {
	return 0.06 + 0.42*math.Exp(-(wave-0.6)/0.9), 0.11 + 0.1*math.Exp(-(wave-0.6)/1.6)
}

// throughput is the share of the brightest channel's electrons that a channel
// at a wavelength in um collects.
func (s Scenario) throughput(wave float64) float64 {
	star := math.Exp(-math.Pow(math.Log(wave/1.1)/0.95, 2) / 2)
	edge := 1 / (1 + math.Exp(-(wave-0.55)/0.08)) / (1 + math.Exp((wave-5.3)/0.25))
	return math.Max(0.04, star*edge)
}
