package sample

import (
	"errors"
	"math"
)

// An evaluator calls a target, and counts.
type evaluator struct {
	f         func(x, gradient []float64) float64
	at        []float64 // what f gets
	calls     int
	most      int // calls allowed
	undefined int
}

var errSpent = errors.New("the evaluations allowed are spent")

// value is the target at x, -Inf for NaN and +Inf, and its gradient; errSpent
// when it was called as often as allowed.
func (e *evaluator) value(x, gradient []float64) (float64, error) {
	if e.calls >= e.most {
		return math.Inf(-1), errSpent
	}
	e.calls++
	copy(e.at, x)
	v := e.f(e.at, gradient)
	if math.IsNaN(v) || math.IsInf(v, 1) {
		e.undefined++
		return math.Inf(-1), nil
	}
	return v, nil
}

func newEvaluator(f func(x []float64) float64, parameters, most int) *evaluator {
	return &evaluator{f: func(x, _ []float64) float64 { return f(x) }, at: make([]float64, parameters), most: most}
}
