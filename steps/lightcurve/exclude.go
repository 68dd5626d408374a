package lightcurve

import (
	"fmt"
	"math"
)

const minutesPerDay = 24 * 60

// Exclude returns cube with masks of its own, in which the integrations with
// from <= time <= to (BJD_TDB, days) carry [Excluded] in every channel. A range that meets no
// integration is an error, because it is most often a wrong time scale.
func Exclude(cube Cube, from, to float64) (Cube, error) {
	const what = "exclude a time range"
	if err := cube.checkShape(what); err != nil {
		return Cube{}, err
	}
	if !(from <= to) {
		return Cube{}, fmt.Errorf("%s: the range goes from %g to %g; expected from <= to", what, from, to)
	}
	out := cube.ownMasks()
	found := false
	for i, t := range out.Time {
		if t < from || t > to {
			continue
		}
		found = true
		for j := range out.Mask {
			out.Mask[j][i] |= Excluded
		}
	}
	if !found {
		return Cube{}, fmt.Errorf("%s: no integration lies between %g and %g d; %s", what, from, to, span(out.Time))
	}
	return out, nil
}

// SkipStart returns cube with masks of its own, in which the integrations of the
// first minutes after the first one carry [Excluded]; 0 excludes none. It is an error
// to skip everything.
func SkipStart(cube Cube, minutes float64) (Cube, error) {
	const what = "skip the start"
	if err := cube.checkShape(what); err != nil {
		return Cube{}, err
	}
	if !(minutes >= 0) || math.IsInf(minutes, 1) {
		return Cube{}, fmt.Errorf("%s: %g min; expected a number from 0 up", what, minutes)
	}
	out := cube.ownMasks()
	if minutes == 0 || len(out.Time) == 0 {
		return out, nil
	}
	end := out.Time[0] + minutes/minutesPerDay
	if out.Time[len(out.Time)-1] < end {
		return Cube{}, fmt.Errorf("%s: %g min would leave nothing; %s", what, minutes, span(out.Time))
	}
	for i, t := range out.Time {
		if t >= end {
			break
		}
		for j := range out.Mask {
			out.Mask[j][i] |= Excluded
		}
	}
	return out, nil
}

// span says in words what times a series covers.
func span(time []float64) string {
	if len(time) == 0 {
		return "the series is empty"
	}
	return fmt.Sprintf("the series runs from %.6f to %.6f d", time[0], time[len(time)-1])
}
