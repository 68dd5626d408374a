package engine

import (
	"errors"
	"fmt"
	"strings"

	"rimlight/runner/canon"
	"rimlight/runner/plan"
	"rimlight/runner/worker"
)

// An element of a fan-out that fails leaves a gap, where the step can flag it:
// where one of its results is a structure with a text field Flag. The gap takes
// the place of the element in all results of the step; see [canon.Gap] for what
// is in it. It is not kept under the element's key, so that the next run tries
// the element again, and whatever uses the results is known by the hash of what
// has the gap in it.
//
// A fan-out fails as a whole when none of its elements gave a result, when an
// element failed for reasons other than its own (a full disk, say), and when
// elements were left alone because too many had cost their worker its life.

// fatal reports whether an error is that a worker had to be stopped or died.
func fatal(err error) bool {
	var late *worker.TimeLimitError
	var lost *worker.LostError
	var fault *Fault
	return errors.As(err, &late) || errors.As(err, &lost) || errors.As(err, &fault) && fault.Fatal
}

// own reports whether an error is the doing of the element that was computed.
func own(err error) bool {
	var failure *worker.Failure
	return errors.As(err, &failure) || fatal(err)
}

// A patience counts how many elements of a fan-out cost their worker its life,
// each of which may have taken its full limit of time, and says when to leave
// the rest alone.
type patience struct {
	total  int
	good   int // elements that gave a result
	deaths int
}

// Bounds on how many elements may cost their worker its life: while none has
// given a result, a few; then a share of them all.
const (
	firstDeaths = 4
	deathShare  = 16 // one in so many
)

// out reports whether to leave the rest alone.
func (p *patience) out() bool {
	if p.good == 0 {
		return p.deaths >= firstDeaths
	}
	return p.deaths >= max(firstDeaths, p.total/deathShare)
}

// fillGaps puts gaps in the place of elements that failed. The error says why
// the step fails instead.
func (e *Engine) fillGaps(spec *plan.Step, items []Value, comps []Computation) error {
	var like []Value // the results of an element that did not fail
	failed, untried := []int{}, []int{}
	var foreign *Computation
	for n := range comps {
		switch c := &comps[n]; {
		case c.Finished():
			like = c.Results
		case c.State == Failed:
			failed = append(failed, n)
			if !own(c.cause) && foreign == nil {
				foreign = c
			}
		default:
			untried = append(untried, n)
		}
	}
	if len(failed)+len(untried) == 0 {
		return nil
	}
	first := ""
	if len(failed) > 0 {
		first = fmt.Sprintf("; element %d: %s", failed[0]+1, comps[failed[0]].Err)
	}
	some := fmt.Sprintf("%d of %d elements failed", len(failed), len(comps))
	switch {
	case foreign != nil:
		return foreign.cause
	case len(untried) > 0:
		return fmt.Errorf("%s, of which so many cost their worker its life that the rest, %s, was not tried%s", some, numbers(untried), first)
	case len(failed) == len(comps), e.NoGaps:
		return errors.New(some + first)
	case !flagged(like):
		return errors.New(some + first + "; they leave no gaps, as no result of the step is a structure with a text field Flag to say so (spectrum.Point is one)")
	}
	for _, n := range failed {
		var err error
		if comps[n].Results, err = e.gap(spec, like, items[n], comps[n].cause); err != nil {
			return fmt.Errorf("element %d: %w", n+1, err)
		}
	}
	return nil
}

// flagged reports whether one of an element's results can say that it is a gap.
func flagged(results []Value) bool {
	for _, v := range results {
		if canon.Flagged(v.Layout) {
			return true
		}
	}
	return false
}

// maxFlag is how many bytes of an error stand in a gap; all of it stands in the
// record of the run.
const maxFlag = 300

// gap gives and keeps what takes the place of an element's results; like are
// those of another element.
func (e *Engine) gap(spec *plan.Step, like []Value, item Value, cause error) ([]Value, error) {
	b, err := sealed(e.Store, item)
	if err != nil {
		return nil, err
	}
	_, layout, data, err := canon.Open(b)
	if err != nil {
		return nil, err
	}
	flag := cause.Error()
	var failure *worker.Failure
	if errors.As(cause, &failure) {
		flag = failure.Text // without the recipe's path, which is not to be part of a result
	}
	flag = strings.Join(strings.Fields(flag), " ")
	if len(flag) > maxFlag {
		flag = strings.ToValidUTF8(flag[:maxFlag], "") + " …"
	}
	out := make([]Value, len(like))
	for r, v := range like {
		b, err := canon.Gap(v.Layout, flag, layout, data)
		if err != nil {
			return nil, fmt.Errorf("no gap can be left in %s: %w", spec.Results[r].Name, err)
		}
		if out[r], err = putSealed(e.Store, canon.Seal(v.Type, v.Layout, b)); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// Gaps gives the numbers, from 0, of the elements in whose place the results of
// a step have gaps.
func (s *Step) Gaps() []int {
	if !s.Finished() {
		return nil
	}
	var out []int
	for n := range s.Elements {
		if s.Elements[n].State == Failed {
			out = append(out, n)
		}
	}
	return out
}

// GapText says in a sentence which elements have no result, and why the first
// one has none; it is empty without gaps.
func (s *Step) GapText() string {
	gaps := s.Gaps()
	if len(gaps) == 0 {
		return ""
	}
	verb := "have"
	if len(gaps) == 1 {
		verb = "has"
	}
	return fmt.Sprintf("%d of %d elements %s no result (%s); element %d: %s", len(gaps), len(s.Elements), verb, numbers(gaps), gaps[0]+1, s.Elements[gaps[0]].Err)
}

// numbers lists elements, counted from 0, as people count them: "2, 5 to 9".
func numbers(list []int) string {
	const most = 12
	var parts []string
	for i := 0; i < len(list); {
		if len(parts) == most {
			return strings.Join(parts, ", ") + fmt.Sprintf(" and %d more", len(list)-i)
		}
		end := i
		for end+1 < len(list) && list[end+1] == list[end]+1 {
			end++
		}
		if end-i < 2 {
			end = i
			parts = append(parts, fmt.Sprint(list[i]+1))
		} else {
			parts = append(parts, fmt.Sprintf("%d to %d", list[i]+1, list[end]+1))
		}
		i = end + 1
	}
	return strings.Join(parts, ", ")
}

// carry keeps, of elements that were looked up again, those failed that had
// failed before, so that a step which is mended comes to the same results.
func carry(before, comps []Computation, todo []int) []int {
	if len(before) != len(comps) {
		return todo
	}
	var left []int
	for _, n := range todo {
		if b := &before[n]; b.State == Failed && b.Text == comps[n].Text {
			comps[n] = *b
		} else {
			left = append(left, n)
		}
	}
	return left
}
