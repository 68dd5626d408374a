package sample

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"rimlight/steps/chain"
)

// A nutsChain is one chain in the making.
type nutsChain struct {
	*hamiltonian
	evaluator  evaluator
	coordinate []coordinate

	// At one point: the parameters, their derivatives in the coordinates, those of
	// the logarithms of these, and the gradient of the density.
	x, dx, bend, gradient []float64
}

func newNUTSChain(parameters []Parameter, f func(x, gradient []float64) float64, m metric, s NUTSSettings, c int) *nutsChain {
	n := len(parameters)
	run := &nutsChain{
		evaluator: evaluator{f: f, at: make([]float64, n), most: s.Evaluations},
		x:         make([]float64, n), dx: make([]float64, n), bend: make([]float64, n), gradient: make([]float64, n),
	}
	for _, p := range parameters {
		run.coordinate = append(run.coordinate, newCoordinate(p))
	}
	rng := rand.New(rand.NewPCG(s.Seed, uint64(s.Stream)+uint64(c)))
	run.hamiltonian = newHamiltonian(n, s.Depth, m, rng, run.density)
	return run
}

// density is the target as one of coordinates without limits.
func (run *nutsChain) density(s *state) (err error) {
	logSlope, finite := 0.0, true
	for k, c := range run.coordinate {
		var log float64
		run.x[k], run.dx[k], log, run.bend[k] = c.value(s.u[k])
		logSlope += log
		finite = finite && run.x[k]-run.x[k] == 0
	}
	if !finite { // the trajectory has left what can be computed
		s.original, s.density = math.Inf(-1), math.Inf(-1)
		return nil
	}
	clear(run.gradient)
	if s.original, err = run.evaluator.value(run.x, run.gradient); err != nil {
		return err
	}
	s.density = s.original + logSlope
	for k := range run.gradient {
		run.gradient[k] = run.gradient[k]*run.dx[k] + run.bend[k]
	}
	run.metric.gradient(s.slope, run.gradient)
	return nil
}

// chain adapts and draws.
func (run *nutsChain) chain(start []float64, d *chain.Draws, s NUTSSettings) error {
	for k, c := range run.coordinate {
		run.current.u[k] = c.of(start[k])
	}
	if err := run.density(&run.current); err != nil {
		return err
	}
	if math.IsInf(run.current.density, -1) {
		return errors.New("the target has no density at the start")
	}
	if square := dot(run.current.slope, run.current.slope); math.IsNaN(square) {
		return errors.New("the gradient at the start is not finite")
	}
	if err := run.warmUp(s); err != nil {
		return fmt.Errorf("warm-up: %w after %d", err, run.evaluator.calls)
	}
	run.evaluator.undefined = 0 // far from the posterior, it means nothing
	acceptance := 0.0
	for i := range s.Draws {
		if err := run.transition(); err != nil {
			return fmt.Errorf("draw %d: %w after %d", i+1, err, run.evaluator.calls)
		}
		for k, c := range run.coordinate {
			x, _, _, _ := c.value(run.current.u[k])
			d.X = append(d.X, x)
		}
		d.LogDensity = append(d.LogDensity, run.current.original)
		d.Energy = append(d.Energy, run.start)
		d.Divergent = append(d.Divergent, run.divergent)
		d.Steps = append(d.Steps, run.steps)
		acceptance += run.acceptance / float64(run.steps)
	}
	d.Acceptance = append(d.Acceptance, acceptance/float64(s.Draws))
	d.StepSize = append(d.StepSize, run.step)
	d.Evaluations += run.evaluator.calls
	d.Undefined += run.evaluator.undefined
	return nil
}

// warmUp adapts step size and metric.
func (run *nutsChain) warmUp(s NUTSSettings) error {
	skip, lengths := windows(s.WarmUp)
	rest := s.WarmUp - skip
	if err := run.rough(skip, s); err != nil {
		return err
	}
	for _, length := range lengths {
		draws, _, err := run.adaptStep(length, s.Acceptance)
		if err != nil {
			return err
		}
		run.metric.adapt(draws)
		if err := run.density(&run.current); err != nil { // its slope was that of the old metric
			return err
		}
		rest -= length
	}
	_, _, err := run.adaptStep(rest, s.Acceptance)
	return err
}

// rough begins a warm-up, with n draws: it finds the scales while the chain is
// still on its way.
func (run *nutsChain) rough(n int, s NUTSSettings) error {
	run.deepest = min(s.Depth, roughDepth)
	for n > 0 {
		length := min(n, roughDraws)
		draws, slopes, err := run.adaptStep(length, s.Acceptance)
		if err != nil {
			return err
		}
		run.metric.rescale(draws, slopes)
		if err := run.density(&run.current); err != nil {
			return err
		}
		n -= length
	}
	run.deepest = s.Depth
	return nil
}

const (
	roughDraws = 10 // for one guess of the scales
	roughDepth = 5  // of their trajectories, which would be as long as the scales are unlike
)

// adaptStep makes n draws, which it returns with their slopes, and sets the step
// to what suits them.
func (run *nutsChain) adaptStep(n int, acceptance float64) (draws, slopes []float64, err error) {
	if err := run.firstStep(); err != nil || n == 0 {
		return nil, nil, err
	}
	size := newStepSize(acceptance, run.step)
	for range n {
		if err := run.transition(); err != nil {
			return nil, nil, err
		}
		run.step = size.update(run.acceptance / float64(run.steps))
		draws = append(draws, run.current.u...)
		slopes = append(slopes, run.current.slope...)
	}
	run.step = size.final()
	return draws, slopes, nil
}
