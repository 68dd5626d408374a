package orbit

import (
	"fmt"
	"math"
)

// maxNumber is the largest number of a transit, counted from that of an
// ephemeris, either way.
const maxNumber = 1e9

// Ephemeris is a linear ephemeris: transit n is at MidTransit + n Period. Errors
// are standard deviations.
type Ephemeris struct {
	MidTransit    float64 // time of transit 0, days
	Period        float64 // days, > 0
	MidTransitErr float64 // days, ≥ 0
	PeriodErr     float64 // days, ≥ 0
	Covariance    float64 // of MidTransit and Period, days², at most the product of the errors in size
}

// Validate returns nil for an ephemeris in its range, or an error.
func (e Ephemeris) Validate() error {
	finite := func(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
	switch {
	case !finite(e.MidTransit):
		return fmt.Errorf("orbit: MidTransit is %g, must be a finite time in days", e.MidTransit)
	case !finite(e.Period) || e.Period <= 0:
		return fmt.Errorf("orbit: Period is %g days, must be finite and above 0", e.Period)
	case !finite(e.MidTransitErr) || e.MidTransitErr < 0 || !finite(e.PeriodErr) || e.PeriodErr < 0:
		return fmt.Errorf("orbit: MidTransitErr is %g and PeriodErr %g days, must be finite and not negative", e.MidTransitErr, e.PeriodErr)
	case !(math.Abs(e.Covariance) <= e.MidTransitErr*e.PeriodErr*(1+1e-9)):
		return fmt.Errorf("orbit: Covariance is %g d², must be within ±%g, the product of the errors", e.Covariance, e.MidTransitErr*e.PeriodErr)
	}
	return nil
}

// Predict returns the time of transit n, in days, and its standard deviation:
// the root of σ0² + 2 n cov + n² σP². It is an error when the ephemeris is not
// valid or n not within ±1e9.
func (e Ephemeris) Predict(n int) (time, err float64, fault error) {
	moved, fault := e.Move(n)
	return moved.MidTransit, moved.MidTransitErr, fault
}

// Move returns the same ephemeris counted from its transit n, with the
// covariance that goes with it. Errors are those of [Ephemeris.Predict].
func (e Ephemeris) Move(n int) (Ephemeris, error) {
	if err := e.Validate(); err != nil {
		return Ephemeris{}, err
	}
	if n > maxNumber || n < -maxNumber {
		return Ephemeris{}, fmt.Errorf("orbit: transit number %d, must be within ±%g", n, maxNumber)
	}
	// In the form of a square plus what the period does not explain, which is not
	// negative.
	k := float64(n)
	slope, rest := 0.0, e.MidTransitErr
	if e.PeriodErr > 0 {
		slope = e.Covariance / e.PeriodErr
		rest = math.Sqrt(math.Max(0, (e.MidTransitErr-slope)*(e.MidTransitErr+slope)))
	}
	e.MidTransit = math.FMA(k, e.Period, e.MidTransit)
	e.MidTransitErr = math.Hypot(rest, slope+k*e.PeriodErr)
	e.Covariance += k * e.PeriodErr * e.PeriodErr
	if math.IsInf(e.MidTransit, 0) || math.IsInf(e.MidTransitErr, 0) || math.IsInf(e.Covariance, 0) {
		return Ephemeris{}, fmt.Errorf("orbit: transit number %d is too far away", n)
	}
	return e, nil
}

// Uncorrelated returns the ephemeris counted from the transit at which time and
// period are correlated least, and the number of that transit: the whole number
// nearest to -cov/σP². There the error of the time is smallest. It is an error
// when the ephemeris is not valid, when PeriodErr is 0 and Covariance is not, or
// when that transit is more than 1e9 away.
func (e Ephemeris) Uncorrelated() (moved Ephemeris, n int, err error) {
	if err := e.Validate(); err != nil {
		return Ephemeris{}, 0, err
	}
	if e.Covariance == 0 {
		return e, 0, nil
	}
	k := math.Round(-e.Covariance / e.PeriodErr / e.PeriodErr)
	if !(math.Abs(k) <= maxNumber) {
		return Ephemeris{}, 0, fmt.Errorf("orbit: time and period are uncorrelated %g transits away, expected at most %g", k, maxNumber)
	}
	moved, err = e.Move(int(k))
	return moved, int(k), err
}

// Number returns the number of the transit nearest to time t, in days. Errors are
// those of [Ephemeris.Predict].
func (e Ephemeris) Number(t float64) (int, error) {
	if err := e.Validate(); err != nil {
		return 0, err
	}
	k := math.Round((t - e.MidTransit) / e.Period)
	if !(math.Abs(k) <= maxNumber) {
		return 0, fmt.Errorf("orbit: time %g is %g periods from MidTransit, must be within %g", t, k, maxNumber)
	}
	return int(k), nil
}

// Timing compares the time of one transit with an ephemeris.
type Timing struct {
	Number    int     // of the transit
	Time      float64 // observed, days
	Err       float64 // its standard deviation, days
	Predicted float64 // by the ephemeris, days
	Offset    float64 // observed minus predicted, days
	OffsetErr float64 // standard deviation of Offset: of the time and of the prediction, as independent, days
}

// Timings compares observed mid-transit times, one for each visit, with the
// transits of the ephemeris nearest to them. errs are their standard deviations,
// as many, ≥ 0. Offsets from the ephemeris of [FitEphemeris] of the same times are
// not independent of it. Errors are those of [Ephemeris.Predict], for each time.
func (e Ephemeris) Timings(times, errs []float64) ([]Timing, error) {
	if len(times) != len(errs) {
		return nil, fmt.Errorf("orbit: %d errors for %d times, expected as many", len(errs), len(times))
	}
	all := make([]Timing, len(times))
	for i, t := range times {
		n, err := e.Number(t)
		if err != nil {
			return nil, fmt.Errorf("times[%d]: %w", i, err)
		}
		if !(errs[i] >= 0) || math.IsInf(errs[i], 1) {
			return nil, fmt.Errorf("orbit: errs[%d] is %g, must be finite and not negative", i, errs[i])
		}
		at, predictedErr, err := e.Predict(n)
		if err != nil {
			return nil, fmt.Errorf("times[%d]: %w", i, err)
		}
		all[i] = Timing{Number: n, Time: t, Err: errs[i], Predicted: at, Offset: t - at, OffsetErr: math.Hypot(errs[i], predictedErr)}
	}
	return all, nil
}

// FitEphemeris returns the linear ephemeris that fits observed mid-transit times
// best, by least squares weighted with their standard deviations errs, above 0,
// and the chi-square of len(times) - 2 degrees of freedom. numbers are those of
// the transits. The ephemeris counts from transit 0; see [Ephemeris.Uncorrelated].
// It is an error when the lists differ in length, hold fewer than two transits of
// different number, or values outside their range, or the fitted period is not
// above 0.
func FitEphemeris(numbers []int, times, errs []float64) (e Ephemeris, chiSquare float64, err error) {
	if len(numbers) != len(times) || len(errs) != len(times) {
		return Ephemeris{}, 0, fmt.Errorf("orbit: %d numbers and %d errors for %d times, expected as many", len(numbers), len(errs), len(times))
	}
	if len(times) == 0 {
		return Ephemeris{}, 0, fmt.Errorf("orbit: no transit times to fit an ephemeris to")
	}
	least := math.Inf(1)
	for i, s := range errs {
		if !(s > 0) || math.IsInf(s, 1) {
			return Ephemeris{}, 0, fmt.Errorf("orbit: errs[%d] is %g, must be finite and above 0", i, s)
		}
		if math.IsNaN(times[i]) || math.IsInf(times[i], 0) {
			return Ephemeris{}, 0, fmt.Errorf("orbit: times[%d] is %g, must be a finite time in days", i, times[i])
		}
		if numbers[i] > maxNumber || numbers[i] < -maxNumber {
			return Ephemeris{}, 0, fmt.Errorf("orbit: numbers[%d] is %d, must be within ±%g", i, numbers[i], maxNumber)
		}
		least = math.Min(least, s)
	}
	// About the weighted means, in units of the smallest error.
	weight := func(i int) float64 { return (least / errs[i]) * (least / errs[i]) }
	var sum, meanNumber, meanTime float64
	for i := range times {
		w := weight(i)
		sum += w
		meanNumber += w * float64(numbers[i])
		meanTime += w * (times[i] - times[0])
	}
	meanNumber /= sum
	meanTime /= sum
	var square, product float64
	for i := range times {
		w, n := weight(i), float64(numbers[i])-meanNumber
		square += w * n * n
		product += w * n * (times[i] - times[0] - meanTime)
	}
	if !(square > 1e-9*sum) {
		return Ephemeris{}, 0, fmt.Errorf("orbit: %d times of one and the same transit say nothing of the period; give transits of different number", len(times))
	}
	e.Period = product / square
	e.MidTransit = times[0] + (meanTime - meanNumber*e.Period)
	e.PeriodErr = least / math.Sqrt(square)
	e.MidTransitErr = math.Hypot(least/math.Sqrt(sum), meanNumber*e.PeriodErr)
	e.Covariance = -meanNumber * e.PeriodErr * e.PeriodErr
	for i := range times {
		d := ((times[i] - times[0] - meanTime) - (float64(numbers[i])-meanNumber)*e.Period) / errs[i]
		chiSquare += d * d
	}
	return e, chiSquare, e.Validate()
}

// Visit returns the orbit as seen in the visit of transit n, which comes offset
// days later than the orbit's MidTransit and Period say: MidTransit is that of
// the visit. A derivative by MidTransit is then one by the offset; that by the
// orbit's own Period is the one by Period plus n times that by MidTransit. It is
// an error when the orbit is not valid, offset not finite, or n not within ±1e9.
func (o Orbit) Visit(n int, offset float64) (Orbit, error) {
	if err := o.Validate(); err != nil {
		return Orbit{}, err
	}
	if n > maxNumber || n < -maxNumber {
		return Orbit{}, fmt.Errorf("orbit: transit number %d, must be within ±%g", n, maxNumber)
	}
	o.MidTransit = math.FMA(float64(n), o.Period, o.MidTransit) + offset
	return o, o.Validate()
}
