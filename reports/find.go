package reports

import (
	"cmp"
	"math"
	"math/bits"
	"slices"
	"strings"

	"rimlight/steps/check"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// A verdict is a check with the step that made it.
type verdict struct {
	check.Check
	Step string
}

// verdicts are all checks of a run: failed ones first, else in their order.
func verdicts(d Document) []verdict {
	var out []verdict
	for _, s := range d.Steps {
		for _, c := range s.Checks {
			out = append(out, verdict{c, s.Name})
		}
		for _, r := range s.Results {
			switch v := r.Value.(type) {
			case check.Check:
				out = append(out, verdict{v, s.Name})
			case []check.Check:
				for _, c := range v {
					out = append(out, verdict{c, s.Name})
				}
			case [][]check.Check:
				for _, c := range slices.Concat(v...) {
					out = append(out, verdict{c, s.Name})
				}
			}
		}
	}
	slices.SortStableFunc(out, func(a, b verdict) int {
		switch {
		case a.Passed == b.Passed:
			return 0
		case b.Passed:
			return -1
		}
		return 1
	})
	return out
}

// lastSpectrum is the spectrum that the run arrived at: the last result that
// is one, or else the last list of points.
func lastSpectrum(d Document) (spectrum.Spectrum, bool) {
	var points []spectrum.Point
	for _, s := range slices.Backward(d.Steps) {
		for _, r := range slices.Backward(s.Results) {
			switch v := r.Value.(type) {
			case spectrum.Spectrum:
				v.Points = byWavelength(v.Points)
				return v, true
			case []spectrum.Point:
				if points == nil {
					points = v
				}
			}
		}
	}
	return spectrum.Spectrum{Points: byWavelength(points)}, points != nil
}

func byWavelength(points []spectrum.Point) []spectrum.Point {
	out := slices.Clone(points)
	slices.SortStableFunc(out, func(a, b spectrum.Point) int { return cmp.Compare(a.Channel.Lo, b.Channel.Lo) })
	return out
}

// place is where a result stands: the step's and the result's number.
type place struct{ step, result int }

// spectrumFigure finds the figure that shows the spectrum: the last one whose
// title says "transmission spectrum", or else whose title or name says
// "spectrum".
func spectrumFigure(d Document) (figure.Figure, place, bool) {
	var found figure.Figure
	var at place
	best := 0
	for i, s := range d.Steps {
		for k, r := range s.Results {
			f, ok := r.Value.(figure.Figure)
			if !ok {
				continue
			}
			score := 0
			title := strings.ToLower(clip(f.Title, longestText))
			switch {
			case strings.Contains(title, "transmission spectrum"):
				score = 3
			case strings.Contains(title, "spectrum"):
				score = 2
			case strings.Contains(strings.ToLower(label(r.Name)), "spectrum"):
				score = 1
			}
			if score > 0 && score >= best {
				found, at, best = f, place{i, k}, score
			}
		}
	}
	return found, at, best > 0
}

// whitePosterior finds the fit of the white light curve: the first posterior
// whose own or whose step's name says "white", or else the first one.
func whitePosterior(d Document) (fit.Posterior, place, bool) {
	var found fit.Posterior
	var at place
	ok := false
	for i, s := range d.Steps {
		for k, r := range s.Results {
			p, is := r.Value.(fit.Posterior)
			if !is {
				continue
			}
			if strings.Contains(strings.ToLower(label(s.Name)+" "+label(r.Name)), "white") {
				return p, place{i, k}, true
			}
			if !ok {
				found, at, ok = p, place{i, k}, true
			}
		}
	}
	return found, at, ok
}

// lastCube finds the light curves that were fitted: the last result that is a
// cube, or else the last input.
func lastCube(d Document) (Light, bool) {
	for _, s := range slices.Backward(d.Steps) {
		for _, r := range slices.Backward(s.Results) {
			if l, ok := LightOf(r.Value); ok && l.Kind == cubeLight {
				return l, true
			}
		}
	}
	for _, in := range slices.Backward(d.Inputs) {
		if l, ok := LightOf(in.Value); ok && l.Kind == cubeLight {
			return l, true
		}
	}
	return Light{}, false
}

// reasons names the mask flags, in the order of their bits.
var reasons = []string{"missing", "zero", "negative", "outlier", "excluded"}

// A maskCount counts samples, and the masked ones among them by reason. A
// sample can have several reasons.
type maskCount struct {
	all, masked int
	by          [8]int // by bit of the flag
}

func (m *maskCount) add(mask []lightcurve.Flag) {
	m.all += len(mask)
	for _, f := range mask {
		if f == 0 {
			continue
		}
		m.masked++
		for ; f != 0; f &= f - 1 {
			m.by[bits.TrailingZeros8(f)]++
		}
	}
}

// String says how many samples are masked, and why.
func (m *maskCount) String() string {
	if m.all == 0 {
		return "no mask"
	}
	var parts []string
	for bit, n := range m.by {
		if n == 0 {
			continue
		}
		why := "other"
		if bit < len(reasons) {
			why = reasons[bit]
		}
		parts = append(parts, grouped(n)+" "+why)
	}
	out := grouped(m.masked) + " of " + grouped(m.all) + " samples (" + percent(m.masked, m.all) + ")"
	if len(parts) > 0 {
		out += ": " + strings.Join(parts, ", ")
	}
	return out
}

// extent is the range of the finite values; ok is false when there are none.
func extent(values []float64) (lo, hi float64, ok bool) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, v := range values {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			lo, hi, ok = min(lo, v), max(hi, v), true
		}
	}
	return lo, hi, ok
}

// span is the wavelength range that channels cover.
func span(channels []lightcurve.Channel) (lo, hi float64, ok bool) {
	var edges []float64
	for _, c := range channels {
		edges = append(edges, c.Lo, c.Hi)
	}
	return extent(edges)
}

// sorted gives the numbers that are not NaN, in order.
func sorted(values []float64) []float64 {
	s := slices.DeleteFunc(slices.Clone(values), math.IsNaN)
	slices.Sort(s)
	return s
}
