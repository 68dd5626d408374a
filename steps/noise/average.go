package noise

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"

	"rimlight/steps/table"
)

const (
	leastBins      = 10      // of a size, for its scatter to count
	sizesPerOctave = 3       // of bins
	gap            = 1.5     // median cadences after which bins begin anew
	minutesPerDay  = 24 * 60 // converts times
	slack          = 1e-6    // lets bins of exactly the shortest or longest length count although times are rounded
)

// Averages says how the scatter of residuals falls when they are averaged in bins,
// one row per bin size: the time-averaging test of Pont, Zucker & Queloz (2006) and
// Winn et al. (2008), and beside it the Allan deviation. All slices are of equal
// length; scatters are in the unit of the residuals.
type Averages struct {
	Size     []int     // residuals per bin, from 1, about three sizes per octave
	Minutes  []float64 // length of a bin: size times the median cadence
	Bins     []int     // full bins without a gap, at least ten
	RMS      []float64 // root mean square of the bin means about zero
	Expected []float64 // that of uncorrelated noise: the first RMS over the root of the size
	Lo       []float64 // of uncorrelated normal noise, RMS lies between Lo and Hi
	Hi       []float64 // in 68.27% of cases (χ² of as many degrees of freedom as bins)
	Ratio    []float64 // RMS over Expected
	Allan    []float64 // overlapping Allan deviation; noise that is white follows Expected, too
}

// AverageTable measures residuals at times in days, which increase. Both a
// residual that is not finite and a gap of more than 1.5 median cadences end a bin;
// one that is not full is left out. It is an error when lengths differ, or there
// are fewer than ten residuals.
func AverageTable(time, residual []float64) (Averages, error) {
	runs, kept, cadence, err := runsOf(time, residual)
	if err != nil {
		return Averages{}, fmt.Errorf("averages of residuals: %w", err)
	}
	if kept < leastBins {
		return Averages{}, fmt.Errorf("averages of residuals: %d finite residuals; expected at least %d", kept, leastBins)
	}
	var out Averages
	for step, last := 0, 0; ; step++ {
		size := int(math.Round(math.Exp2(float64(step) / sizesPerOctave)))
		if size == last {
			continue
		}
		last = size
		rms, bins := binned(runs, size)
		if bins < leastBins {
			return out, nil
		}
		expected := rms
		if size > 1 {
			expected = out.RMS[0] / math.Sqrt(float64(size))
		}
		chi2 := distuv.ChiSquared{K: float64(bins)}
		edge := func(p float64) float64 { return expected * math.Sqrt(chi2.Quantile(p)/float64(bins)) }
		ratio := 1.0
		if expected > 0 {
			ratio = rms / expected
		}
		out.Size, out.Bins = append(out.Size, size), append(out.Bins, bins)
		out.Minutes = append(out.Minutes, float64(size)*cadence*minutesPerDay)
		out.RMS, out.Expected, out.Ratio = append(out.RMS, rms), append(out.Expected, expected), append(out.Ratio, ratio)
		out.Lo, out.Hi = append(out.Lo, edge(oneSigma)), append(out.Hi, edge(1-oneSigma))
		out.Allan = append(out.Allan, allan(runs, size))
	}
}

// oneSigma is the probability below minus one standard deviation.
const oneSigma = 0.15865525393145707

// Table shows averages in a report.
func (a Averages) Table(title string) table.Table {
	count := func(x []int) []float64 {
		out := make([]float64, len(x))
		for i, v := range x {
			out[i] = float64(v)
		}
		return out
	}
	return table.Table{Title: title, Columns: []table.Column{
		{Name: "bin", About: "residuals per bin", Number: count(a.Size)},
		{Name: "length", Unit: "min", About: "length of a bin", Number: a.Minutes, Digits: 4},
		{Name: "bins", About: "full bins without a gap", Number: count(a.Bins)},
		{Name: "rms", About: "scatter of the bin means", Number: a.RMS, Digits: 4},
		{Name: "white", About: "scatter of uncorrelated noise", Number: a.Expected, Digits: 4},
		{Name: "low", About: "lower end of 68% of uncorrelated noise", Number: a.Lo, Digits: 4},
		{Name: "high", About: "upper end of 68% of uncorrelated noise", Number: a.Hi, Digits: 4},
		{Name: "ratio", About: "scatter over that of uncorrelated noise", Number: a.Ratio, Digits: 4},
		{Name: "Allan", About: "overlapping Allan deviation", Number: a.Allan, Digits: 4},
	}}
}

// A Beta is the outcome of the time-averaging test.
type Beta struct {
	Value   float64 // mean over the bin sizes of the ratio of measured to expected scatter, the latter times √(M/(M-1)) for M bins
	Largest float64 // the largest of these ratios
	Err     float64 // standard error of one ratio at the longest bin, for uncorrelated noise: 1/√(2M)
	From    float64 // shortest bin used, minutes
	To      float64 // longest bin used, minutes
	Sizes   int     // bin sizes used
}

// Factor is what errors are multiplied by to allow for correlated noise: Value, but
// at least 1.
func (b Beta) Factor() float64 {
	if b.Value > 1 {
		return b.Value
	}
	return 1
}

// TimeAveraging is β of Winn et al. (2008), with their correction for the number of
// bins, over the bins of lo to hi minutes, which are commonly taken around the
// duration of ingress. It is an error when no bin
// size in between fits ten times, or the residuals are those that [AverageTable]
// refuses.
func TimeAveraging(time, residual []float64, lo, hi float64) (Beta, error) {
	if !(lo > 0 && lo < hi) {
		return Beta{}, fmt.Errorf("time averaging: bins of %g to %g minutes; expected 0 < shortest < longest", lo, hi)
	}
	a, err := AverageTable(time, residual)
	if err != nil {
		return Beta{}, err
	}
	var out Beta
	for k, length := range a.Minutes {
		if length < lo*(1-slack) || length > hi*(1+slack) || a.Size[k] == 1 {
			continue
		}
		if out.Sizes == 0 {
			out.From = length
		}
		m := float64(a.Bins[k])
		ratio := a.Ratio[k] * math.Sqrt((m-1)/m)
		out.To, out.Err = length, 1/math.Sqrt(2*m)
		out.Largest = math.Max(out.Largest, ratio)
		out.Value += ratio
		out.Sizes++
	}
	if out.Sizes == 0 {
		return Beta{}, fmt.Errorf("time averaging: no bin of %g to %g minutes holds more than one residual and fits ten times into these", lo, hi)
	}
	out.Value /= float64(out.Sizes)
	return out, nil
}

// runsOf cuts residuals where some are missing, and returns how many there are in
// all and the median time between neighbours.
func runsOf(time, residual []float64) (runs [][]float64, kept int, cadence float64, err error) {
	if len(time) != len(residual) {
		return nil, 0, 0, fmt.Errorf("%d times and %d residuals; expected equal numbers", len(time), len(residual))
	}
	var steps []float64
	for i := range time {
		if !finite(time[i]) || i > 0 && time[i] < time[i-1] {
			return nil, 0, 0, fmt.Errorf("time %d is %g; expected increasing times", i, time[i])
		}
		if i > 0 {
			steps = append(steps, time[i]-time[i-1])
		}
	}
	cadence = median(steps)
	open := false
	for i, r := range residual {
		if !finite(r) {
			open = false
			continue
		}
		if !open || time[i]-time[i-1] > gap*cadence {
			runs = append(runs, nil)
		}
		open = true
		runs[len(runs)-1] = append(runs[len(runs)-1], r)
		kept++
	}
	return runs, kept, cadence, nil
}

// binned returns the root mean square of the means of full bins, and their number.
func binned(runs [][]float64, size int) (rms float64, bins int) {
	sum := 0.0
	for _, x := range runs {
		for ; len(x) >= size; x = x[size:] {
			mean := 0.0
			for _, v := range x[:size] {
				mean += v / float64(size)
			}
			sum += mean * mean
			bins++
		}
	}
	return math.Sqrt(sum / float64(bins)), bins
}

// allan is the overlapping Allan deviation: the root of half the mean squared
// difference of the means of adjacent bins, which begin at every residual; 0 when
// nowhere two bins lie side by side.
func allan(runs [][]float64, size int) float64 {
	sum, count := 0.0, 0
	for _, x := range runs {
		if len(x) < 2*size {
			continue
		}
		difference := 0.0
		for i := range size {
			difference += (x[size+i] - x[i]) / float64(size)
		}
		for i := 0; ; i++ {
			sum += difference * difference
			count++
			if i+2*size >= len(x) {
				break
			}
			difference += (x[i+2*size] - 2*x[i+size] + x[i]) / float64(size)
		}
	}
	if count == 0 {
		return 0
	}
	return math.Sqrt(sum / float64(2*count))
}

// median sorts x and returns its median, 0 of nothing.
func median(x []float64) float64 {
	if len(x) == 0 {
		return 0
	}
	slices.Sort(x)
	return x[(len(x)-1)/2]/2 + x[len(x)/2]/2
}
