package sample

import (
	"fmt"
	"math"

	"rimlight/steps/chain"
)

const (
	defaultDraws       = 1000
	defaultAcceptance  = 0.8
	defaultDepth       = 10
	defaultEvaluations = 1_000_000
	mostEvaluations    = 1_000_000_000
	mostDepth          = 15
	mostDraws          = 1_000_000
)

// NUTSSettings says how to run [NUTS]. The zero value is sound.
type NUTSSettings struct {
	Seed        uint64      // of all random numbers
	Stream      int         // chain c has the random numbers of stream Stream + c; from 0
	WarmUp      int         // draws to adapt with, which are not kept; 0 for 1000
	Draws       int         // to keep, of each chain; 0 for 1000
	Acceptance  float64     // acceptance statistic to aim for; 0 for 0.8, nearer to 1 against divergences
	Depth       int         // doublings of a trajectory at most; 0 for 10, which is 1023 steps
	Dense       bool        // adapt to correlations, by a full mass matrix, and not to scales alone
	Covariance  [][]float64 // of the parameters, a first guess; may be nil
	Evaluations int         // of the target, at most, by each chain; 0 for 1,000,000
}

// NUTS draws from a density with a gradient by the No-U-Turn sampler (Hoffman &
// Gelman 2014) in the multinomial form of Betancourt (2017), one chain from each
// start.
//
// f gives the logarithm of the density at x, and sets gradient to its derivatives.
// Both are of the parameters themselves: limits are dealt with here, by
// coordinates without limits that the chains move in, whose derivative is a part
// of their density. In the warm-up, the step size is adapted by dual averaging and
// the mass matrix to the draws of windows that double in length.
//
// Errors: parameters without names or ranges; a nil target; no start, or one
// outside the limits or without density; settings outside their ranges; more
// evaluations than allowed, which may be too few, or a target without end.
func NUTS(parameters []Parameter, f func(x, gradient []float64) float64, start [][]float64, settings NUTSSettings) (chain.Draws, error) {
	const what = "NUTS"
	fail := func(err error) (chain.Draws, error) { return chain.Draws{}, fmt.Errorf("%s: %w", what, err) }
	if err := checkParameters(parameters); err != nil {
		return fail(err)
	}
	if f == nil {
		return fail(errNoTarget)
	}
	s := settings.filled()
	if err := s.check(len(parameters), len(start)); err != nil {
		return fail(err)
	}
	for c, x := range start {
		if err := checkStart(parameters, x); err != nil {
			return fail(fmt.Errorf("chain %d: %w", c+1, err))
		}
	}
	d := chain.Draws{Chains: len(start), Length: s.Draws}
	d.Names, d.Units = namesAndUnits(parameters)
	for c, x := range start {
		m, err := s.metric(parameters, x)
		if err != nil {
			return fail(err)
		}
		run := newNUTSChain(parameters, f, m, s, c)
		if err := run.chain(x, &d, s); err != nil {
			return fail(fmt.Errorf("chain %d: %w", c+1, err))
		}
	}
	return d, nil
}

func (s NUTSSettings) filled() NUTSSettings {
	s.WarmUp, s.Draws = otherwise(s.WarmUp, defaultDraws), otherwise(s.Draws, defaultDraws)
	s.Depth, s.Evaluations = otherwise(s.Depth, defaultDepth), otherwise(s.Evaluations, defaultEvaluations)
	if s.Acceptance == 0 {
		s.Acceptance = defaultAcceptance
	}
	return s
}

func otherwise(n, zero int) int {
	if n == 0 {
		return zero
	}
	return n
}

func (s NUTSSettings) check(parameters, chains int) error {
	switch {
	case chains < 1 || chains > mostStarts:
		return fmt.Errorf("%d starts; expected one for each chain, 1 to %d", chains, mostStarts)
	case s.Stream < 0 || s.Stream > math.MaxInt32:
		return fmt.Errorf("stream %d; expected 0 to %d", s.Stream, math.MaxInt32)
	case s.WarmUp < 1 || s.WarmUp > mostDraws || s.Draws < 1 || s.Draws > mostDraws:
		return fmt.Errorf("a warm-up of %d and %d draws; expected 1 to %d of each", s.WarmUp, s.Draws, mostDraws)
	case s.Draws > chain.MostNumbers/(chains*parameters):
		return fmt.Errorf("%d chains of %d draws of %d parameters; expected at most %d numbers altogether", chains, s.Draws, parameters, chain.MostNumbers)
	case !(s.Acceptance > 0 && s.Acceptance < 1):
		return fmt.Errorf("an acceptance of %g; expected a number between 0 and 1", s.Acceptance)
	case s.Depth < 1 || s.Depth > mostDepth:
		return fmt.Errorf("trajectories of %d doublings; expected 1 to %d", s.Depth, mostDepth)
	case s.Evaluations < 1 || s.Evaluations > mostEvaluations:
		return fmt.Errorf("%d evaluations; expected 1 to %d", s.Evaluations, mostEvaluations)
	}
	return nil
}

// metric is the one to begin with: the guess of the covariance, as far as there
// is one, in the coordinates at the start.
func (s NUTSSettings) metric(parameters []Parameter, start []float64) (metric, error) {
	n := len(parameters)
	m := newMetric(n, s.Dense)
	if s.Covariance == nil {
		return m, nil
	}
	guess, err := flatCovariance(s.Covariance, n)
	if err != nil {
		return m, err
	}
	for k, p := range parameters {
		c := newCoordinate(p)
		_, slope, _, _ := c.value(c.of(start[k]))
		for l := range n {
			guess[k*n+l] /= slope
			guess[l*n+k] /= slope
		}
	}
	if s.Dense {
		if !cholesky(guess, n) {
			return m, errCovariance
		}
		m.factor = guess
		return m, nil
	}
	for k := range n {
		if m.factor[k] = math.Sqrt(guess[k*n+k]); !(m.factor[k] > 0) || math.IsInf(m.factor[k], 1) {
			return m, errCovariance
		}
	}
	return m, nil
}

// flatCovariance is a covariance matrix by rows.
func flatCovariance(matrix [][]float64, n int) ([]float64, error) {
	if len(matrix) != n {
		return nil, fmt.Errorf("a covariance of %d rows; expected one for each of %d parameters", len(matrix), n)
	}
	flat := make([]float64, 0, n*n)
	for k, row := range matrix {
		if len(row) != n {
			return nil, fmt.Errorf("row %d of the covariance has %d numbers; expected one for each of %d parameters", k+1, len(row), n)
		}
		flat = append(flat, row...)
	}
	return flat, nil
}

var errCovariance = fmt.Errorf("the covariance is not that of finite numbers that vary; expected a positive-definite matrix")
