package chain

import (
	"fmt"
	"math"
	"slices"
)

// A Summary says what the draws tell of one parameter, and how well.
//
// R-hat and the Monte-Carlo errors are NaN for weighted draws. The diagnostics of
// a parameter whose draws are all equal are NaN.
type Summary struct {
	Name   string
	Unit   string
	Mean   float64
	SD     float64 // standard deviation
	Median float64
	Lo68   float64 // the central 68.27%, one standard deviation of a normal distribution to either side
	Hi68   float64
	Lo95   float64 // the central 95.45%, two standard deviations
	Hi95   float64

	RHat        float64
	BulkESS     float64 // effective sample size; that of the weights for weighted draws
	TailESS     float64 // the same for weighted draws
	MeanError   float64 // Monte-Carlo standard error of Mean
	MedianError float64 // Monte-Carlo standard error of Median
	SDError     float64 // Monte-Carlo standard error of SD
}

// probabilities are those of Median, Lo68, Hi68, Lo95 and Hi95.
var probabilities = [5]float64{0.5, 0.15865525393145707, 0.8413447460685429, 0.022750131948179195, 0.9772498680518208}

func (s *Summary) set(quantile func(p float64) float64) {
	for i, to := range []*float64{&s.Median, &s.Lo68, &s.Hi68, &s.Lo95, &s.Hi95} {
		*to = quantile(probabilities[i])
	}
}

// Summaries describes each parameter. Errors: a shape that does not fit; chains
// of fewer than 8 draws; draws that are not finite.
func Summaries(d Draws) ([]Summary, error) {
	if err := d.Check(); err != nil {
		return nil, fmt.Errorf("summary: %w", err)
	}
	out := make([]Summary, len(d.Names))
	for p, name := range d.Names {
		s := &out[p]
		s.Name = name
		if len(d.Units) > 0 {
			s.Unit = d.Units[p]
		}
		x := column(d.X, len(d.Names), p)
		err := checkColumn(x, d.Chains)
		if err != nil && err != errConstant {
			return nil, fmt.Errorf("summary of %.40s: %w", name, err)
		}
		sorted := slices.Clone(x)
		slices.Sort(sorted)
		mean, variance := meanVariance(x)
		s.Mean, s.SD = mean, math.Sqrt(variance)
		s.set(func(p float64) float64 { return quantile(sorted, p) })
		if err == errConstant {
			nan := math.NaN()
			s.RHat, s.BulkESS, s.TailESS, s.MeanError, s.MedianError, s.SDError = nan, nan, nan, nan, nan, nan
			continue
		}
		s.diagnose(x, sorted, d.Chains, max(1, d.Group))
	}
	return out, nil
}

func (s *Summary) diagnose(x, sorted []float64, chains, group int) {
	halves, count := split(x, chains)
	scores := rankNormalise(halves)
	s.RHat = nestedRHat(x, scores, chains, count, group)
	s.BulkESS = effectiveSize(scores, count)
	s.TailESS = math.Min(quantileSize(x, sorted, chains, tailProbability), quantileSize(x, sorted, chains, 1-tailProbability))
	s.MeanError = s.SD / math.Sqrt(effectiveSize(halves, count))
	s.MedianError = quantileError(sorted, quantileSize(x, sorted, chains, 0.5), 0.5)
	s.SDError, _ = SDError(x, chains) // x was checked
}

// WeightedSummaries describes each parameter. Errors: a shape that does not fit;
// draws with weight that are not finite.
func WeightedSummaries(w Weighted) ([]Summary, error) {
	weight, err := w.weights()
	if err != nil {
		return nil, fmt.Errorf("summary: %w", err)
	}
	size := weightSize(weight)
	nan := math.NaN()
	out := make([]Summary, len(w.Names))
	for p, name := range w.Names {
		s := &out[p]
		*s = Summary{Name: name, RHat: nan, BulkESS: size, TailESS: size, MeanError: nan, MedianError: nan, SDError: nan}
		if len(w.Units) > 0 {
			s.Unit = w.Units[p]
		}
		x := column(w.X, len(w.Names), p)
		if err := checkFinite(x, weight); err != nil {
			return nil, fmt.Errorf("summary of %.40s: %w", name, err)
		}
		mean, covariance := moments(w.X, weight, len(w.Names), p, p)
		s.Mean, s.SD = mean, math.Sqrt(covariance)
		s.set(newDistribution(x, weight).quantile)
	}
	return out, nil
}

// weights checks the shape of w and gives its weights, of the sum 1.
func (w Weighted) weights() ([]float64, error) {
	if err := w.Check(); err != nil {
		return nil, err
	}
	return weights(w.LogWeight)
}

// moments gives the mean of parameter p, and its covariance with q. The weights
// sum to 1.
func moments(x, weight []float64, stride, p, q int) (mean, covariance float64) {
	var other float64
	for i, w := range weight {
		if w > 0 {
			mean += w * x[i*stride+p]
			other += w * x[i*stride+q]
		}
	}
	for i, w := range weight {
		if w > 0 {
			covariance += w * (x[i*stride+p] - mean) * (x[i*stride+q] - other)
		}
	}
	return mean, covariance
}

// Covariance is the covariance matrix of the parameters, all chains together, with
// the divisor n - 1 for n draws. Errors: a shape that does not fit; fewer than two
// draws.
func Covariance(d Draws) ([][]float64, error) {
	if err := d.Check(); err != nil {
		return nil, fmt.Errorf("covariance: %w", err)
	}
	n := d.Chains * d.Length
	if n < 2 {
		return nil, fmt.Errorf("covariance of one draw; expected at least 2")
	}
	weight := make([]float64, n)
	for i := range weight {
		weight[i] = 1 / float64(n)
	}
	return covariance(d.X, weight, len(d.Names), float64(n)/float64(n-1))
}

// WeightedCovariance is the covariance matrix of the parameters, the weighted mean
// of the products of deviations from the weighted means. Errors: a shape that does
// not fit.
func WeightedCovariance(w Weighted) ([][]float64, error) {
	weight, err := w.weights()
	if err != nil {
		return nil, fmt.Errorf("covariance: %w", err)
	}
	return covariance(w.X, weight, len(w.Names), 1)
}

// mostCovariance bounds the parameters of a covariance matrix.
const mostCovariance = 1000

func covariance(x, weight []float64, stride int, factor float64) ([][]float64, error) {
	if stride > mostCovariance {
		return nil, fmt.Errorf("covariance of %d parameters; expected at most %d", stride, mostCovariance)
	}
	out := make([][]float64, stride)
	for p := range out {
		out[p] = make([]float64, stride)
		for q := range p + 1 {
			_, c := moments(x, weight, stride, p, q)
			out[p][q], out[q][p] = factor*c, factor*c
		}
	}
	return out, nil
}
