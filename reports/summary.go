package reports

import (
	"fmt"
	"math"
	"strings"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

// A Headline is one of the few numbers that say what a run came to.
type Headline struct {
	Label string // what it is: "median depth"
	Value string // the number with its unit: "14520 ppm"
	Note  string // what qualifies it, may be empty
	Alert bool   // something failed
}

// Headlines gives the headline numbers of a run, in the order in which the
// report and the command line show them: spectrum, masked samples, white-light
// parameters. What a run has no results for is left out. How it ended and its
// checks are told apart from them.
func Headlines(d Document) []Headline {
	out := spectrumHeadlines(d)
	if c, ok := lastCube(d); ok {
		if m := c.masks(); m.all > 0 {
			out = append(out, Headline{Label: "masked samples", Value: percent(m.masked, m.all), Note: m.String()})
		}
	}
	if p, _, ok := whitePosterior(d); ok {
		out = append(out, posteriorHeadlines(p)...)
	}
	return out
}

// stepCounts says how many steps there are, and how many of them in which
// state.
func stepCounts(d Document) string {
	n := map[State]int{}
	for _, s := range d.Steps {
		n[s.State]++
	}
	var parts []string
	for _, state := range []State{Computed, Reused, Failed, NotReached} {
		if n[state] > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n[state], state))
		}
	}
	if len(parts) == 0 {
		return count(len(d.Steps), "step")
	}
	return count(len(d.Steps), "step") + ": " + strings.Join(parts, ", ")
}

// checksHeadline counts the checks, and names those that failed.
func checksHeadline(v []verdict) Headline {
	failed := 0
	var names []string
	for _, c := range v {
		if !c.Passed {
			failed++
			names = append(names, label(c.Name))
		}
	}
	h := Headline{Label: "checks", Value: fmt.Sprintf("%d of %d passed", len(v)-failed, len(v)), Alert: failed > 0}
	if failed > 0 {
		h.Note = sentence("failed: " + strings.Join(names, "; "))
	}
	return h
}

func spectrumHeadlines(d Document) []Headline {
	s, ok := lastSpectrum(d)
	if !ok {
		return nil
	}
	var channels []lightcurve.Channel
	var depth, err, resolution []float64
	flagged, unmeasured := 0, 0
	for _, p := range s.Points {
		channels = append(channels, p.Channel)
		if p.Flag != "" {
			flagged++
		}
		if !p.Good() {
			unmeasured++
			continue
		}
		depth, err = append(depth, p.Depth), append(err, p.DepthErr)
		if w := p.Channel.Hi - p.Channel.Lo; w > 0 {
			resolution = append(resolution, (p.Channel.Lo+p.Channel.Hi)/2/w)
		}
	}
	h := Headline{Label: "channels measured", Value: fmt.Sprintf("%d of %d", len(depth), len(s.Points))}
	if flagged > 0 {
		h.Note = fmt.Sprintf("%d flagged, %d of them without a depth", flagged, unmeasured)
	}
	out := []Headline{h}
	if lo, hi, ok := span(channels); ok {
		h := Headline{Label: "wavelengths", Value: fmt.Sprintf("%s to %s µm", number(lo, 4), number(hi, 4))}
		if len(resolution) > 0 {
			h.Note = "median λ/Δλ of the channels " + fixed(median(resolution), 0)
		}
		out = append(out, h)
	}
	if len(depth) > 0 {
		lo, hi, _ := extent(depth)
		out = append(out,
			Headline{Label: "median depth", Value: ppm(median(depth), 0) + " ppm", Note: ppm(lo, 0) + " to " + ppm(hi, 0) + " ppm"},
			Headline{Label: "median depth error", Value: fixed(median(err)*1e6, 1) + " ppm", Note: "one standard deviation, one channel"})
	}
	return out
}

// symbols are how papers write the parameters that have a symbol.
var symbols = map[string]string{
	"radiusRatio": "Rp/Rs", "depth": "(Rp/Rs)²", "midTransit": "T₀", "period": "P", "axisRatio": "a/Rs",
	"inclination": "i", "impact": "b", "impactParameter": "b", "eccentricity": "e", "periastron": "ω",
	"duration": "T₁₄", "T14": "T₁₄", "T23": "T₂₃", "u1": "u₁", "u2": "u₂", "q1": "q₁", "q2": "q₂", "density": "ρs",
}

// leading are the parameters that belong into a summary, with their headline.
var leading = []struct{ name, headline string }{
	{"radiusRatio", "radius ratio Rp/Rs"}, {"depth", "depth (Rp/Rs)²"}, {"midTransit", "mid-transit time T₀"},
	{"axisRatio", "axis ratio a/Rs"}, {"inclination", "inclination"}, {"impact", "impact parameter"},
	{"impactParameter", "impact parameter"}, {"duration", "duration T₁₄"}, {"T14", "duration T₁₄"}, {"u1", "u₁"}, {"u2", "u₂"},
}

func posteriorHeadlines(p fit.Posterior) []Headline {
	var out []Headline
	for _, want := range leading {
		if q, ok := quantity(p, want.name); ok {
			out = append(out, Headline{Label: "white-light " + want.headline, Value: strings.TrimSpace(measured(q.Value, q.Err) + " " + label(q.Unit))})
		}
	}
	if p.Dof > 0 && !math.IsNaN(p.Chi2) {
		out = append(out, Headline{Label: "white-light reduced χ²", Value: fixed(p.Chi2/float64(p.Dof), 3),
			Note: strings.TrimSuffix(grouped(p.Dof)+" degrees of freedom, "+label(p.Status), ", ")})
	}
	return out
}

// quantity looks up a free or derived parameter.
func quantity(p fit.Posterior, want string) (fit.Quantity, bool) {
	for i, n := range p.Names {
		if n == want && i < len(p.Value) {
			q := fit.Quantity{Name: n, Value: p.Value[i], Err: math.NaN()}
			if i < len(p.Err) {
				q.Err = p.Err[i]
			}
			if i < len(p.Units) {
				q.Unit = p.Units[i]
			}
			return q, true
		}
	}
	for _, q := range p.Derived {
		if q.Name == want {
			return q, true
		}
	}
	return fit.Quantity{}, false
}
