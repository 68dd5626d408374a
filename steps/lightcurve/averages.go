package lightcurve

import (
	"fmt"
	"math"
)

// mostIntervals bounds the memory of averages.
const mostIntervals = 100_000

// Averages are a series averaged over equal intervals of time: what can be seen
// of a long series at the resolution of a figure. The slices have one element per
// interval.
type Averages struct {
	Begin   float64   // of the first interval, days: half a cadence before the first time
	End     float64   // of the last interval: half a cadence after the last time
	Time    []float64 // mean time of the usable values in the interval; NaN without any
	Value   []float64 // their mean; NaN without any
	Used    []int     // how many they are
	Samples []int     // times in the interval, whether their values are usable or not
}

// Average averages the finite values of a series over equal intervals of time, at
// most as many as asked for (1 to 100000), and no more than there are cadences
// between begin and end, so that an interval of a series without gaps holds at
// least one sample. Times that are not finite are passed over; without a finite
// time there is no interval. It is an error when times and values differ in
// number.
func Average(time, value []float64, intervals int) (Averages, error) {
	if len(time) != len(value) {
		return Averages{}, fmt.Errorf("averages: %d times and %d values; expected as many of one as of the other", len(time), len(value))
	}
	if intervals < 1 || intervals > mostIntervals {
		return Averages{}, fmt.Errorf("averages: %d intervals; expected 1 to %d", intervals, mostIntervals)
	}
	first, last := math.Inf(1), math.Inf(-1)
	for _, t := range time {
		if finite(t) {
			first, last = math.Min(first, t), math.Max(last, t)
		}
	}
	if first > last {
		return Averages{Begin: math.NaN(), End: math.NaN()}, nil
	}
	step := Cadence(time) / minutesPerDay
	if !(step > 0) {
		step = 1.0 / minutesPerDay
	}
	out := Averages{Begin: first - step/2, End: last + step/2}
	width := out.End - out.Begin
	n := 1
	if cadences := math.Round(width / step); finite(width) && cadences > 1 {
		n = int(math.Min(cadences, float64(intervals)))
	}
	out.Time, out.Value = make([]float64, n), make([]float64, n)
	out.Used, out.Samples = make([]int, n), make([]int, n)
	for i, t := range time {
		if !finite(t) {
			continue
		}
		k := 0
		if n > 1 {
			k = min(max(int(float64(n)*((t-out.Begin)/width)), 0), n-1)
		}
		out.Samples[k]++
		if finite(value[i]) {
			out.Used[k]++
			out.Time[k] += t - out.Begin // a sum of small numbers keeps its digits
			out.Value[k] += value[i]
		}
	}
	for k, used := range out.Used {
		// Without a usable value this is 0/0.
		out.Time[k] = out.Begin + out.Time[k]/float64(used)
		out.Value[k] /= float64(used)
	}
	return out, nil
}

// Cadence returns the median time between neighbouring integrations, in minutes;
// NaN with fewer than two times.
func Cadence(time []float64) float64 {
	var steps []float64
	for i := 1; i < len(time); i++ {
		if d := time[i] - time[i-1]; finite(d) {
			steps = append(steps, d)
		}
	}
	return medianInPlace(steps) * minutesPerDay
}
