package sample

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"rimlight/steps/chain"
)

// stretch is the widest stretch of a move, a of Goodman & Weare (2010), who
// recommend 2.
const stretch = 2

// EnsembleSettings says how to run [Ensemble]. The zero value is sound.
type EnsembleSettings struct {
	Seed         uint64  // of all random numbers
	Stream       int     // the walkers have the random numbers of this stream; from 0
	WarmUp       int     // steps of each walker that are not kept; 0 for 1000
	Draws        int     // to keep, of each walker; 0 for 1000
	Thin         int     // steps for each draw that is kept; 0 for 1
	Differential float64 // share of moves along the difference of two other walkers, 0 to 1; the rest are stretches
}

// Ensemble draws from a density by walkers that move along lines through one
// another (Goodman & Weare 2010): no gradient is needed, and neither scales nor
// linear correlations of the parameters matter. One half of the walkers moves at a
// time, with the other as partners. Moves are stretches, or, as many as
// settings.Differential says, differential-evolution moves (ter Braak 2006), which
// pass between modes more easily. It is a sampler for a dozen parameters at most;
// in many more it looks settled long before it is (see [chain.RHat] of several
// ensembles).
//
// f gives the logarithm of the density at x. Starts are of walkers, an even number
// of at least twice that of the parameters and two more, and must differ in every
// direction, as those of [Around] do. Each walker is a chain of the draws; R-hat compares four
// groups of them, or two.
//
// Errors: parameters without names or ranges; a nil target; starts that are too
// few, outside the limits, without density or all in one plane; settings outside
// their ranges, or that ask for more than 10⁹ steps of walkers.
func Ensemble(parameters []Parameter, f func(x []float64) float64, start [][]float64, settings EnsembleSettings) (chain.Draws, error) {
	const what = "ensemble"
	fail := func(err error) (chain.Draws, error) { return chain.Draws{}, fmt.Errorf("%s: %w", what, err) }
	if err := checkParameters(parameters); err != nil {
		return fail(err)
	}
	if f == nil {
		return fail(errNoTarget)
	}
	n, walkers := len(parameters), len(start)
	s := settings.filled()
	if err := s.check(n, walkers); err != nil {
		return fail(err)
	}
	for w, x := range start {
		if err := checkStart(parameters, x); err != nil {
			return fail(fmt.Errorf("walker %d: %w", w+1, err))
		}
	}
	if flat(start) {
		return fail(errors.New("the starts of the walkers lie in one plane; expected them to differ in every direction"))
	}
	e := &ensemble{
		parameters: parameters, evaluator: newEvaluator(f, n, mostEvaluations+mostStarts),
		rng: rand.New(rand.NewPCG(s.Seed, uint64(s.Stream))), differential: s.Differential, proposal: make([]float64, n),
		x: make([][]float64, walkers), density: make([]float64, walkers), accepted: make([]int, walkers),
	}
	for w, x := range start {
		e.x[w] = append([]float64(nil), x...)
		var err error
		if e.density[w], err = e.evaluator.value(x, nil); err != nil {
			return fail(err)
		}
		if math.IsInf(e.density[w], -1) {
			return fail(fmt.Errorf("walker %d: the target has no density at the start", w+1))
		}
	}
	d := chain.Draws{Chains: walkers, Length: s.Draws, X: make([]float64, walkers*s.Draws*n), LogDensity: make([]float64, walkers*s.Draws)}
	d.Names, d.Units = namesAndUnits(parameters)
	if d.Group = walkers / 2; walkers%4 == 0 {
		d.Group = walkers / 4
	}
	for i := range s.WarmUp {
		if err := e.step(); err != nil {
			return fail(fmt.Errorf("step %d of the warm-up: %w", i+1, err))
		}
	}
	clear(e.accepted)
	e.evaluator.undefined = 0 // far from the posterior, it means nothing
	for i := range s.Draws {
		for range s.Thin {
			if err := e.step(); err != nil {
				return fail(fmt.Errorf("draw %d: %w", i+1, err))
			}
		}
		for w, x := range e.x {
			copy(d.X[(w*s.Draws+i)*n:], x)
			d.LogDensity[w*s.Draws+i] = e.density[w]
		}
	}
	for _, a := range e.accepted {
		d.Acceptance = append(d.Acceptance, float64(a)/float64(s.Draws*s.Thin))
	}
	d.Evaluations, d.Undefined = e.evaluator.calls, e.evaluator.undefined
	return d, nil
}

func (s EnsembleSettings) filled() EnsembleSettings {
	s.WarmUp, s.Draws, s.Thin = otherwise(s.WarmUp, defaultDraws), otherwise(s.Draws, defaultDraws), otherwise(s.Thin, 1)
	return s
}

func (s EnsembleSettings) check(parameters, walkers int) error {
	switch least := 2*parameters + 2; {
	case walkers < least || walkers%2 != 0 || walkers > mostStarts:
		return fmt.Errorf("%d walkers; expected an even number from %d to %d, for %d parameters", walkers, least, mostStarts, parameters)
	case s.Stream < 0 || s.Stream > math.MaxInt32:
		return fmt.Errorf("stream %d; expected 0 to %d", s.Stream, math.MaxInt32)
	case s.WarmUp < 1 || s.WarmUp > mostDraws || s.Draws < 1 || s.Draws > mostDraws || s.Thin < 1 || s.Thin > mostDraws:
		return fmt.Errorf("a warm-up of %d and %d draws of %d steps; expected 1 to %d of each", s.WarmUp, s.Draws, s.Thin, mostDraws)
	case s.Draws > chain.MostNumbers/(walkers*parameters):
		return fmt.Errorf("%d walkers, %d draws and %d parameters; expected at most %d numbers altogether", walkers, s.Draws, parameters, chain.MostNumbers)
	case !(s.Differential >= 0 && s.Differential <= 1):
		return fmt.Errorf("a share of %g of differential-evolution moves; expected a number from 0 to 1", s.Differential)
	case s.WarmUp+s.Draws*s.Thin > mostEvaluations/walkers:
		return fmt.Errorf("%d walkers, %d + %d × %d steps; expected at most %d steps of walkers altogether", walkers, s.WarmUp, s.Draws, s.Thin, mostEvaluations)
	}
	return nil
}

// flat reports whether points do not span all directions, as far as rounding lets
// one see.
func flat(points [][]float64) bool {
	n, count := len(points[0]), float64(len(points))
	mean, sd := make([]float64, n), make([]float64, n)
	for k := range n {
		for _, x := range points {
			mean[k] += x[k] / count
		}
		for _, x := range points {
			sd[k] = math.Hypot(sd[k], x[k]-mean[k])
		}
		if !(sd[k] > 0) {
			return true
		}
	}
	correlation := make([]float64, n*n)
	for k := range n {
		for l := range k + 1 {
			for _, x := range points {
				correlation[k*n+l] += (x[k] - mean[k]) / sd[k] * ((x[l] - mean[l]) / sd[l])
			}
		}
	}
	if !cholesky(correlation, n) {
		return true
	}
	for k := range n {
		if correlation[k*n+k] < 1e-7 {
			return true
		}
	}
	return false
}

// An ensemble is walkers on their way.
type ensemble struct {
	parameters   []Parameter
	evaluator    *evaluator
	rng          *rand.Rand
	differential float64
	x            [][]float64
	density      []float64
	accepted     []int
	proposal     []float64
}

// step moves each walker once.
func (e *ensemble) step() error {
	half := len(e.x) / 2
	for w := range e.x {
		others := e.x[half:]
		if w >= half {
			others = e.x[:half]
		}
		var logFactor float64
		if e.differential > 0 && e.rng.Float64() < e.differential {
			e.difference(e.x[w], others)
		} else {
			logFactor = e.stretch(e.x[w], others)
		}
		if !e.inside() {
			continue
		}
		density, err := e.evaluator.value(e.proposal, nil)
		if err != nil {
			return err
		}
		if math.Log(e.rng.Float64()) < logFactor+density-e.density[w] {
			copy(e.x[w], e.proposal)
			e.density[w] = density
			e.accepted[w]++
		}
	}
	return nil
}

// stretch proposes a point on the line through x and another walker, z times as
// far from it, with a density of z proportional to z^(-1/2) between 1/a and a.
func (e *ensemble) stretch(x []float64, others [][]float64) (logFactor float64) {
	other := others[e.rng.IntN(len(others))]
	root := 1 + (stretch-1)*e.rng.Float64()
	z := root * root / stretch
	for k := range x {
		e.proposal[k] = other[k] + z*(x[k]-other[k])
	}
	return float64(len(x)-1) * math.Log(z)
}

// difference proposes a step along the difference of two other walkers: of the
// length that suits a normal distribution, 2.38 / √(2 n) times theirs (ter Braak
// 2006), give or take, or once in ten of their own, from mode to mode.
func (e *ensemble) difference(x []float64, others [][]float64) {
	i := e.rng.IntN(len(others))
	j := e.rng.IntN(len(others) - 1)
	if j >= i {
		j++
	}
	length := 1.0
	if e.rng.IntN(10) > 0 {
		length = 2.38 / math.Sqrt(2*float64(len(x))) * (1 + 0.1*e.rng.NormFloat64())
	}
	for k := range x {
		e.proposal[k] = x[k] + length*(others[i][k]-others[j][k])
	}
}

func (e *ensemble) inside() bool {
	for k, p := range e.parameters {
		if x := e.proposal[k]; x-x != 0 || !p.inside(x) {
			return false
		}
	}
	return true
}
