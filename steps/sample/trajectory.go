package sample

import (
	"math"
	"math/rand/v2"
)

// mostEnergy is the growth of the energy along a trajectory that counts as a
// divergence (Hoffman & Gelman 2014).
const mostEnergy = 1000

// A state is a point of phase space: position, momentum and the target there.
type state struct {
	u        []float64 // position, as coordinates without limits
	r        []float64 // momentum, in the coordinates of the metric, of unit mass
	slope    []float64 // gradient of density in the coordinates of the metric
	density  float64   // logarithm of the density of u
	original float64   // logarithm of the density of the parameters
}

func newState(n int) state {
	return state{u: make([]float64, n), r: make([]float64, n), slope: make([]float64, n)}
}

func (s *state) set(from *state) {
	copy(s.u, from.u)
	copy(s.r, from.r)
	copy(s.slope, from.slope)
	s.density, s.original = from.density, from.original
}

// energy is the Hamiltonian.
func (s *state) energy() float64 { return dot(s.r, s.r)/2 - s.density }

// A branch is a part of a trajectory, in the order in which it was integrated.
type branch struct {
	sum         []float64 // of all momenta
	first, last []float64 // momenta at the ends
	weight      float64   // logarithm of the sum of exp(-energy), relative to the start
	draw        state     // one of its states, drawn by these weights
}

func newBranch(n int) branch {
	return branch{sum: make([]float64, n), first: make([]float64, n), last: make([]float64, n), draw: newState(n)}
}

// set makes a branch of one state.
func (b *branch) set(s *state, weight float64) {
	copy(b.sum, s.r)
	copy(b.first, s.r)
	copy(b.last, s.r)
	b.weight = weight
	b.draw.set(s)
}

// A hamiltonian draws from a density of n coordinates without limits by the
// No-U-Turn sampler (Hoffman & Gelman 2014), with states drawn by their weights
// and the criterion that ends a trajectory as in Betancourt (2017), held also
// between the halves of each branch.
type hamiltonian struct {
	evaluate func(s *state) error // sets slope and density at s.u
	metric   metric
	rng      *rand.Rand
	step     float64
	deepest  int // doublings of a trajectory at most

	current state
	edge    [2]state // ends of the trajectory, back and front
	whole   branch
	spare   []branch // one for each depth
	start   float64  // energy

	// Of the trajectory.
	steps      int
	acceptance float64 // sum of the probabilities of its states as Metropolis moves
	divergent  bool
}

func newHamiltonian(n, deepest int, m metric, rng *rand.Rand, evaluate func(s *state) error) *hamiltonian {
	h := &hamiltonian{evaluate: evaluate, metric: m, rng: rng, step: 1, deepest: deepest,
		current: newState(n), whole: newBranch(n), spare: make([]branch, deepest+1)}
	h.edge[0], h.edge[1] = newState(n), newState(n)
	for i := range h.spare {
		h.spare[i] = newBranch(n)
	}
	return h
}

// leap makes one leapfrog step of the length step, which may be negative.
func (h *hamiltonian) leap(s *state, step float64) error {
	for k, g := range s.slope {
		s.r[k] += step / 2 * g
	}
	h.metric.add(s.u, step, s.r)
	if err := h.evaluate(s); err != nil {
		return err
	}
	for k, g := range s.slope {
		s.r[k] += step / 2 * g
	}
	return nil
}

// kick gives the current state a new momentum.
func (h *hamiltonian) kick() {
	for k := range h.current.r {
		h.current.r[k] = h.rng.NormFloat64()
	}
	h.start = h.current.energy()
}

// transition draws the next state.
func (h *hamiltonian) transition() error {
	h.kick()
	h.steps, h.acceptance, h.divergent = 0, 0, false
	h.edge[0].set(&h.current)
	h.edge[1].set(&h.current)
	h.whole.set(&h.current, 0)
	for depth := range h.deepest {
		side := int(h.rng.Uint64() >> 63)
		next := &h.spare[depth]
		more, err := h.grow(next, depth, side)
		if err != nil {
			return err
		}
		if !more {
			break
		}
		if math.Log(h.rng.Float64()) < next.weight-h.whole.weight {
			h.whole.draw.set(&next.draw)
		}
		far, near := &h.whole.first, &h.whole.last
		if side == 0 {
			far, near = near, far
		}
		turned := turns(h.whole.sum, *far, *near, next)
		h.whole.weight = logSum(h.whole.weight, next.weight)
		for k, r := range next.sum {
			h.whole.sum[k] += r
		}
		copy(*near, next.last)
		if turned {
			break
		}
	}
	h.current.set(&h.whole.draw)
	return nil
}

// grow extends the trajectory at one edge by 2^depth states, which it makes a
// branch of. more is false when they turn back among themselves or diverge.
func (h *hamiltonian) grow(b *branch, depth, side int) (more bool, err error) {
	if depth == 0 {
		step := h.step
		if side == 0 {
			step = -step
		}
		if err := h.leap(&h.edge[side], step); err != nil {
			return false, err
		}
		weight := h.start - h.edge[side].energy()
		if math.IsNaN(weight) {
			weight = math.Inf(-1)
		}
		h.steps++
		h.acceptance += math.Exp(math.Min(0, weight))
		if weight < -mostEnergy {
			h.divergent = true
			return false, nil
		}
		b.set(&h.edge[side], weight)
		return true, nil
	}
	if more, err := h.grow(b, depth-1, side); !more {
		return false, err
	}
	second := &h.spare[depth-1]
	if more, err := h.grow(second, depth-1, side); !more {
		return false, err
	}
	weight := logSum(b.weight, second.weight)
	if math.Log(h.rng.Float64()) < second.weight-weight {
		b.draw, second.draw = second.draw, b.draw
	}
	turned := turns(b.sum, b.first, b.last, second)
	b.weight = weight
	for k, r := range second.sum {
		b.sum[k] += r
	}
	b.last, second.last = second.last, b.last
	return !turned, nil
}

// turns reports whether a trajectory turns back when a branch is added to a part
// of the momenta sum, with the momenta far at its free end and near where the
// branch begins.
func turns(sum, far, near []float64, b *branch) bool {
	var wholeFar, wholeLast, firstFar, firstNext, secondNear, secondLast float64
	for k, s := range sum {
		all := s + b.sum[k]
		wholeFar += all * far[k]
		wholeLast += all * b.last[k]
		most := s + b.first[k]
		firstFar += most * far[k]
		firstNext += most * b.first[k]
		most = near[k] + b.sum[k]
		secondNear += most * near[k]
		secondLast += most * b.last[k]
	}
	return !(wholeFar > 0 && wholeLast > 0 && firstFar > 0 && firstNext > 0 && secondNear > 0 && secondLast > 0)
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for k, v := range a {
		sum += v * b[k]
	}
	return sum
}

// logSum is log(exp a + exp b).
func logSum(a, b float64) float64 {
	if a < b {
		a, b = b, a
	}
	if math.IsInf(a, -1) {
		return a
	}
	return a + math.Log1p(math.Exp(b-a))
}
