package sample

import (
	"cmp"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"rimlight/steps/chain"
)

// A livePoint is a point of the unit cube, which has one side more than there are
// parameters. Points are ordered by likelihood, and those of the same by the last
// coordinate, a label which nothing depends on.
type livePoint struct {
	u          []float64
	x          []float64 // parameters
	likelihood float64   // logarithm
}

func newLivePoint(parameters int) livePoint {
	return livePoint{u: make([]float64, parameters+1), x: make([]float64, parameters)}
}

func (p *livePoint) compare(q *livePoint) int {
	label := len(p.x)
	return cmp.Or(cmp.Compare(p.likelihood, q.likelihood), cmp.Compare(p.u[label], q.u[label]))
}

func (p *livePoint) set(q *livePoint) {
	copy(p.u, q.u)
	copy(p.x, q.x)
	p.likelihood = q.likelihood
}

func (p *livePoint) clone() *livePoint {
	return &livePoint{slices.Clone(p.u), slices.Clone(p.x), p.likelihood}
}

// A nest is nested sampling under way.
type nest struct {
	parameters []Parameter
	prior      func(u []float64) []float64
	evaluator  *evaluator
	rng        *rand.Rand
	settings   NestedSettings

	live  []*livePoint // sorted, the worst first
	empty int          // points of the prior that were found to have no likelihood
	dead  []*livePoint // in the order of their death
	ranks []int        // of new points among the live, from 0
	stuck int

	logZ            float64 // of the dead
	at, next        livePoint
	direction, cube []float64
}

func newNest(parameters []Parameter, prior func(u []float64) []float64, logLikelihood func(x []float64) float64, s NestedSettings) *nest {
	n := len(parameters)
	return &nest{
		parameters: parameters, prior: prior, settings: s,
		evaluator: newEvaluator(logLikelihood, n, s.Evaluations),
		rng:       rand.New(rand.NewPCG(s.Seed, streamNested+uint64(s.Stream))),
		at:        newLivePoint(n), next: newLivePoint(n),
		direction: make([]float64, n+1), cube: make([]float64, n),
	}
}

// evaluate sets all of a point but its place in the cube.
func (n *nest) evaluate(p *livePoint) (err error) {
	if n.prior == nil {
		for k, q := range n.parameters {
			p.x[k] = UniformQuantile(p.u[k], q.Lo, q.Hi)
		}
	} else {
		copy(n.cube, p.u)
		x := n.prior(n.cube)
		if len(x) != len(p.x) {
			return fmt.Errorf("the prior gave %d numbers; expected %d, one for each parameter", len(x), len(p.x))
		}
		copy(p.x, x)
		for k, x := range p.x {
			if x-x != 0 {
				return fmt.Errorf("the prior gave %g for %.40s at %g of the unit cube; expected a finite number", x, n.parameters[k].Name, p.u[k])
			}
		}
	}
	p.likelihood, err = n.evaluator.value(p.x, nil)
	return err
}

// fill draws the live points from the prior, passing over those without
// likelihood.
func (n *nest) fill() error {
	for len(n.live) < n.settings.Live {
		for k := range n.at.u {
			n.at.u[k] = n.rng.Float64()
		}
		err := n.evaluate(&n.at)
		if err == errSpent {
			return fmt.Errorf("%d points of the prior in %d evaluations have a likelihood; expected %d: %w", len(n.live), n.evaluator.calls, n.settings.Live, err)
		}
		if err != nil {
			return err
		}
		if math.IsInf(n.at.likelihood, -1) {
			n.empty++
			continue
		}
		n.live = append(n.live, n.at.clone())
	}
	slices.SortFunc(n.live, (*livePoint).compare)
	return nil
}

// logVolume is the expected logarithm of the prior's volume above the last of
// count dead points, and at first that where there is any likelihood.
func (n *nest) logVolume(count int) float64 {
	return n.logShare() - float64(count)/float64(n.settings.Live)
}

// logShare is the logarithm of the share of the prior where there is likelihood,
// of which Live - 1 over one less than the draws it took is an unbiased estimate.
func (n *nest) logShare() float64 {
	others := float64(n.settings.Live - 1)
	return math.Log(others / (others + float64(n.empty)))
}

// logWidth is the logarithm of the share of the volume that dies with a point.
func (n *nest) logWidth() float64 { return math.Log(-math.Expm1(-1 / float64(n.settings.Live))) }

// shrink replaces the worst point until the live ones hold little of the evidence.
func (n *nest) shrink() error {
	n.logZ = math.Inf(-1)
	most := chain.MostNumbers/len(n.parameters) - n.settings.Live
	for len(n.dead) < most {
		volume := n.logVolume(len(n.dead))
		rest := n.live[len(n.live)-1].likelihood + volume
		if rest < n.logZ+math.Log(nestedRest) {
			return nil
		}
		worst := n.live[0]
		err := n.move(worst)
		if err == errSpent {
			return fmt.Errorf("%w after %d, with a share of up to %.2g of the evidence among the live points; expected %g", err, n.evaluator.calls, 1/(1+math.Exp(n.logZ-rest)), nestedRest)
		}
		if err != nil {
			return err
		}
		n.logZ = logSum(n.logZ, worst.likelihood+volume+n.logWidth())
		n.dead = append(n.dead, worst)
		born := n.at.clone()
		rank, _ := slices.BinarySearchFunc(n.live[1:], born, (*livePoint).compare)
		n.ranks = append(n.ranks, rank)
		copy(n.live, n.live[1:rank+1])
		n.live[rank] = born
	}
	return fmt.Errorf("more than %d draws; expected fewer", most)
}

// move takes the walking point from a live one to a new one above the worst.
func (n *nest) move(worst *livePoint) error {
	others := len(n.live) - 1
	begin := 1 + n.rng.IntN(others)
	n.at.set(n.live[begin])
	width := sliceWidth / math.Sqrt(float64(len(n.at.u)))
	for range n.settings.Slices {
		// Two others, which know nothing of the walking point.
		i, j := n.rng.IntN(others), n.rng.IntN(others-1)
		if j >= i {
			j++
		}
		if i >= begin {
			i++
		}
		if j >= begin {
			j++
		}
		for k := range n.direction {
			n.direction[k] = width * (n.live[i].u[k] - n.live[j].u[k])
		}
		if err := n.slice(worst); err != nil {
			return err
		}
	}
	return nil
}

// slice moves the walking point along the direction, to a point above the worst
// one of an interval that has the direction's length and that it lies somewhere
// in: the interval shrinks towards it where it fails (Neal 2003).
func (n *nest) slice(worst *livePoint) error {
	lo := -n.rng.Float64()
	hi := lo + 1
	for range mostShrink {
		t := lo + (hi-lo)*n.rng.Float64()
		inside := true
		for k, d := range n.direction {
			u := n.at.u[k] + t*d
			n.next.u[k] = u
			inside = inside && u >= 0 && u < 1
		}
		if inside {
			if err := n.evaluate(&n.next); err != nil {
				return err
			}
			if n.next.compare(worst) > 0 && !math.IsInf(n.next.likelihood, -1) {
				n.at, n.next = n.next, n.at
				return nil
			}
		}
		if t < 0 {
			lo = t
		} else {
			hi = t
		}
	}
	n.stuck++
	return nil
}

// result gives the dead and the live points their weights.
func (n *nest) result() (chain.Weighted, Evidence) {
	var w chain.Weighted
	w.Names, w.Units = namesAndUnits(n.parameters)
	add := func(p *livePoint, logWidth float64) {
		w.X = append(w.X, p.x...)
		w.LogWeight = append(w.LogWeight, p.likelihood+logWidth)
		w.LogDensity = append(w.LogDensity, p.likelihood)
	}
	for i, p := range n.dead {
		add(p, n.logVolume(i)+n.logWidth())
	}
	live := float64(n.settings.Live)
	for _, p := range n.live {
		add(p, n.logVolume(len(n.dead))-math.Log(live))
	}
	e := Evidence{LogZ: math.Inf(-1), Live: n.settings.Live, Iterations: len(n.dead), Stuck: n.stuck,
		Evaluations: n.evaluator.calls, Undefined: n.evaluator.undefined, RankP: uniformRanks(n.ranks, n.settings.Live)}
	for _, v := range w.LogWeight {
		e.LogZ = logSum(e.LogZ, v)
	}
	for i := range w.LogWeight {
		w.LogWeight[i] -= e.LogZ
		e.Information += math.Exp(w.LogWeight[i]) * (w.LogDensity[i] - e.LogZ)
	}
	empty := float64(n.empty)
	within := math.Max(0, e.Information+n.logShare()) // that of the part of the prior that has likelihood
	e.Err = math.Sqrt(within/live + empty/(live*(live+empty)))
	return w, e
}
