package lightcurve

import (
	"fmt"
	"slices"
	"strings"
)

// A listing is a light-curve table as it stands in a file: one row per
// integration, units already converted.
type listing struct {
	time  []float64 // days, n rows
	flux  rows      // n of m
	err   rows      // n of m; nil when the file has none
	lo    []float64 // um, m
	hi    []float64 // um, m
	aux   []Series
	row   func(i int) string // names a row for messages: "row 3", "line 12"
	edges func(j int) string // names a row of the channel table
}

// rows calls do with rows of numbers, some at a time, in order; first is the
// number of the first of them, from 0. The numbers are good only during the call.
type rows func(do func(first int, values []float64)) error

// cube checks a listing and turns it into a Cube: integrations in order of
// time, channels in order of wavelength, unusable samples masked.
func (l listing) cube() (Cube, []string, error) {
	n, m := len(l.time), len(l.lo)
	if n == 0 {
		return Cube{}, nil, fmt.Errorf("the table has no integrations")
	}
	if m == 0 {
		return Cube{}, nil, fmt.Errorf("the table has no channels")
	}
	times, warnings, err := l.timeOrder()
	if err != nil {
		return Cube{}, nil, err
	}
	channels, notes, err := l.channelOrder()
	if err != nil {
		return Cube{}, nil, err
	}
	warnings = append(warnings, notes...)
	c := Cube{
		Time:     make([]float64, n),
		Channels: channels,
		Flux:     make([][]float64, m),
		Err:      make([][]float64, m),
		Mask:     make([][]Flag, m),
	}
	for i, from := range times {
		c.Time[i] = l.time[from]
	}
	for j := range channels {
		c.Flux[j], c.Err[j], c.Mask[j] = make([]float64, n), make([]float64, n), make([]Flag, n)
	}
	place := make([]int, n) // of each row in the cube
	for i, from := range times {
		place[from] = i
	}
	if err := l.flux.spread(channels, place, c.Flux); err != nil {
		return Cube{}, nil, err
	}
	if l.err != nil {
		if err := l.err.spread(channels, place, c.Err); err != nil {
			return Cube{}, nil, err
		}
	}
	for j, mask := range c.Mask {
		for i := range mask {
			mask[i] = unusable(c.Flux[j][i], c.Err[j][i], l.err != nil)
		}
	}
	for _, s := range l.aux {
		value := make([]float64, n)
		for i, from := range times {
			value[i] = s.Value[from]
		}
		c.Aux = append(c.Aux, Series{Name: s.Name, Unit: s.Unit, Value: value})
	}
	if l.err == nil {
		warnings = append(warnings, "the file has no flux errors: they are set to zero until a step estimates them from the scatter")
	}
	return c, append(warnings, maskSummary(c)...), nil
}

// spread puts the numbers of rows where they belong in a cube: by channel, and
// each row in its place.
func (r rows) spread(channels []Channel, place []int, out [][]float64) error {
	m := len(channels)
	return r(func(first int, values []float64) {
		for j, channel := range channels {
			to := out[j]
			for k, at := 0, channel.Index; at < len(values); k, at = k+1, at+m {
				to[place[first+k]] = values[at]
			}
		}
	})
}

// unusable returns why a sample is masked.
func unusable(flux, sigma float64, haveErr bool) Flag {
	var f Flag
	switch {
	case !finite(flux):
		f = Missing
	case flux == 0:
		f = Zero
	case flux < 0:
		f = Negative
	}
	if haveErr {
		switch {
		case !finite(sigma):
			f |= Missing
		case sigma <= 0:
			f |= Negative
		}
	}
	return f
}

// timeOrder returns the rows in order of time.
func (l listing) timeOrder() (order []int, warnings []string, err error) {
	order = make([]int, len(l.time))
	sorted := true
	for i, t := range l.time {
		if !finite(t) {
			return nil, nil, fmt.Errorf("%s: the time is %g, expected a finite number", l.row(i), t)
		}
		order[i] = i
		sorted = sorted && (i == 0 || l.time[i-1] <= t)
	}
	if !sorted {
		slices.SortStableFunc(order, func(a, b int) int {
			switch {
			case l.time[a] < l.time[b]:
				return -1
			case l.time[a] > l.time[b]:
				return 1
			}
			return 0
		})
		warnings = append(warnings, "the integrations were not in order of time and have been sorted")
	}
	for i := 1; i < len(order); i++ {
		if a, b := order[i-1], order[i]; l.time[a] == l.time[b] {
			return nil, nil, fmt.Errorf("%s and %s have the same time %.17g: remove one of them", l.row(a), l.row(b), l.time[a])
		}
	}
	return order, warnings, nil
}

// channelOrder returns the channels in order of wavelength.
func (l listing) channelOrder() (channels []Channel, warnings []string, err error) {
	channels = make([]Channel, len(l.lo))
	for j := range channels {
		lo, hi := l.lo[j], l.hi[j]
		if !finite(lo) || !finite(hi) || lo <= 0 || lo >= hi {
			return nil, nil, fmt.Errorf("%s: the channel from %g to %g um, expected 0 < WAVE_LO < WAVE_HI", l.edges(j), lo, hi)
		}
		channels[j] = Channel{Index: j, Lo: lo, Hi: hi}
	}
	slices.SortStableFunc(channels, func(a, b Channel) int {
		switch {
		case a.Lo < b.Lo, a.Lo == b.Lo && a.Hi < b.Hi:
			return -1
		case a.Lo > b.Lo, a.Hi > b.Hi:
			return 1
		}
		return 0
	})
	overlaps := 0
	for j := 1; j < len(channels); j++ {
		// Edges that were rounded differently are not an overlap.
		if a, b := channels[j-1], channels[j]; a.Hi-b.Lo > 1e-6*(a.Hi-a.Lo) {
			overlaps++
		}
	}
	if overlaps > 0 {
		warnings = append(warnings, fmt.Sprintf("%d channels overlap the one before them: their results will not be independent", overlaps))
	}
	return channels, warnings, nil
}

// maskSummary counts the samples that are masked on reading.
func maskSummary(c Cube) []string {
	var count [8]int
	masked, dead := 0, 0
	for _, mask := range c.Mask {
		bad := 0
		for _, f := range mask {
			if f == 0 {
				continue
			}
			bad++
			for k := range count {
				count[k] += int(f >> k & 1)
			}
		}
		masked += bad
		if bad == len(mask) {
			dead++
		}
	}
	if masked == 0 {
		return nil
	}
	var parts []string
	for k, reason := range maskReasons {
		if count[k] > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", count[k], reason.name))
		}
	}
	text := fmt.Sprintf("%d of %d samples are masked: %s", masked, len(c.Time)*len(c.Channels), strings.Join(parts, ", "))
	if dead > 0 {
		text += fmt.Sprintf("; %d of %d channels have no usable sample", dead, len(c.Channels))
	}
	return []string{text}
}
