package limbtable

import (
	"fmt"
	"slices"
)

// How light of different wavelengths counts in a [Band].
const (
	Photons = "photons" // each photon counts the same: detectors that count photons or electrons
	Energy  = "energy"  // by its energy: bolometers
)

// A Profile is the intensity of the disc in one band.
type Profile struct {
	Lo, Hi    float64   // the band, um
	Wave      float64   // mean wavelength at the centre of the disc, weighted as the intensities are, um
	Mu        []float64 // increasing, to 1
	Intensity []float64 // as many; relative to the centre of the disc, where it is 1
}

// Band returns the profile over wavelengths lo to hi, in um, lo < hi: for each mu
// the integral of intensity times throughput, and, where weight is [Photons],
// times the wavelength, which is the number of photons. Intensities are linear in
// wavelength between those of the table; the integral over the product is exact.
//
// It is an error when weight is neither Photons nor Energy, when t or s are not as
// their types say, when t has one wavelength only or does not reach over all of
// the band that s lets through, or when there is no light at the centre of the
// disc.
func Band(t Intensities, s Throughput, lo, hi float64, weight string) (Profile, error) {
	fail := func(format string, args ...any) (Profile, error) {
		return Profile{}, fmt.Errorf("limb darkening in a band: "+format, args...)
	}
	if err := t.check(); err != nil {
		return fail("%w", err)
	}
	if err := s.check(); err != nil {
		return fail("%w", err)
	}
	return band(t, s, lo, hi, weight)
}

// band is Band for arguments that were checked.
func band(t Intensities, s Throughput, lo, hi float64, weight string) (Profile, error) {
	fail := func(format string, args ...any) (Profile, error) {
		return Profile{}, fmt.Errorf("limb darkening in a band: "+format, args...)
	}
	if weight != Photons && weight != Energy {
		return fail("weight %.40q, expected %s or %s", weight, Photons, Energy)
	}
	if !(lo > 0 && lo < hi) || !finite(hi) {
		return fail("the band is %g to %g um, expected 0 < lo < hi", lo, hi)
	}
	from, to := lo, hi
	if n := len(s.Wave); n > 0 {
		from, to = max(from, s.Wave[0]), min(to, s.Wave[n-1])
		if !(from < to) {
			return fail("nothing of %g to %g um is let through", lo, hi)
		}
	}
	m := len(t.Wave)
	if t.Wave[0] > from || t.Wave[m-1] < to {
		return fail("the intensities reach from %g to %g um, expected all of %g to %g um", t.Wave[0], t.Wave[m-1], from, to)
	}
	// Between these nodes intensity and throughput are linear.
	nodes := []float64{from, to}
	for _, wave := range [][]float64{t.Wave, s.Wave} {
		first, _ := slices.BinarySearch(wave, from)
		for _, w := range wave[first:] {
			if w >= to {
				break
			}
			nodes = append(nodes, w)
		}
	}
	nodes = distinct(nodes)
	p := Profile{Lo: lo, Hi: hi, Mu: slices.Clone(t.Mu), Intensity: make([]float64, len(t.Mu))}
	first := 0.0 // moment of wavelength at the centre
	add := func(wave, width float64) {
		share := width * s.at(wave)
		if weight == Photons {
			share *= wave
		}
		if share == 0 {
			return
		}
		a, exact := slices.BinarySearch(t.Wave, wave)
		if exact {
			for k, v := range t.Value[a] {
				p.Intensity[k] += share * v
			}
			first += share * wave * t.Value[a][len(t.Mu)-1]
			return
		}
		f := (wave - t.Wave[a-1]) / (t.Wave[a] - t.Wave[a-1])
		for k, v := range t.Value[a] {
			p.Intensity[k] += share * ((1-f)*t.Value[a-1][k] + f*v)
		}
		last := len(t.Mu) - 1
		first += share * wave * ((1-f)*t.Value[a-1][last] + f*t.Value[a][last])
	}
	for i := 1; i < len(nodes); i++ {
		a, b := nodes[i-1], nodes[i]
		// Simpson's rule, exact for the product of three linear functions.
		add(a, (b-a)/6)
		add(a+(b-a)/2, (b-a)*2/3)
		add(b, (b-a)/6)
	}
	centre := p.Intensity[len(p.Intensity)-1]
	if !(centre > 0) || !finite(centre) || !finite(first) {
		return fail("the light at the centre of the disc comes to %g in %g to %g um, expected a finite number above 0", centre, lo, hi)
	}
	p.Wave = first / centre
	for k := range p.Intensity {
		p.Intensity[k] /= centre
	}
	return p, nil
}
