package sample

import "math"

// A stepSize finds the step at which trajectories have a wanted acceptance
// statistic, by dual averaging (Nesterov 2009; Hoffman & Gelman 2014, section
// 3.2, with the constants given there).
type stepSize struct {
	wanted float64
	centre float64 // of the logarithms that are tried first
	sum    float64 // of what the acceptance lacks, weighed
	mean   float64 // of the logarithms, weighed: what is used in the end
	count  float64
}

const (
	stepShrinkage = 0.05
	stepDelay     = 10
	stepForget    = 0.75
)

func newStepSize(wanted, first float64) stepSize {
	return stepSize{wanted: wanted, centre: math.Log(10 * first), mean: math.Log(first)}
}

// update learns the acceptance statistic of a trajectory and gives the next step.
func (s *stepSize) update(acceptance float64) float64 {
	s.count++
	share := 1 / (s.count + stepDelay)
	s.sum = (1-share)*s.sum + share*(s.wanted-acceptance)
	next := s.centre - s.sum*math.Sqrt(s.count)/stepShrinkage
	weight := math.Pow(s.count, -stepForget)
	s.mean = weight*next + (1-weight)*s.mean
	return boundedStep(next)
}

// final is the step to keep.
func (s *stepSize) final() float64 { return boundedStep(s.mean) }

func boundedStep(log float64) float64 { return math.Exp(min(max(log, -70), 70)) }

// firstStep doubles or halves the step until the acceptance of one leapfrog step
// crosses 0.8 (Hoffman & Gelman 2014, algorithm 4).
func (h *hamiltonian) firstStep() error {
	grows := 0
	trial := &h.edge[0]
	for range 100 {
		h.kick()
		trial.set(&h.current)
		if err := h.leap(trial, h.step); err != nil {
			return err
		}
		direction := -1
		if h.start-trial.energy() > math.Log(0.8) {
			direction = 1
		}
		if grows == 0 {
			grows = direction
		}
		if direction != grows {
			return nil
		}
		if grows > 0 {
			h.step *= 2
		} else {
			h.step /= 2
		}
	}
	h.step = 1 // nothing restrains it; adaptation will
	return nil
}

// windows gives the lengths of the parts of a warm-up at whose ends the metric is
// adapted, after a start of the length skip without: each is twice as long as the
// one before, from 25 on, and a twentieth of the warm-up remains for the step size
// alone. The proportions, 75, 25 and 50 of 1000, are common practice, no source.
func windows(warmUp int) (skip int, lengths []int) {
	skip, first, end := 75, 25, 50
	if warmUp < skip+first+end {
		skip, end = warmUp*15/100, warmUp*10/100
		first = warmUp - skip - end
	} else {
		end = warmUp / 20
	}
	for left := warmUp - skip - end; left > 0; first *= 2 {
		length := first
		if left < 3*first { // the next would not fit
			length = left
		}
		lengths = append(lengths, length)
		left -= length
	}
	return skip, lengths
}
