package command

import (
	"fmt"
	"strconv"
	"strings"

	"rimlight/runner/engine"
	"rimlight/runner/plan"
)

// showWhy prints the text of a step's key with all its ingredients, and what
// changed in it against the run before. The name may be that of an input or a
// step; "Step:7" is the seventh element of a fan-out.
func (a *app) showWhy(name string, e *engine.Engine, outcome *engine.Outcome) error {
	name, number, isElement := strings.Cut(name, ":")
	element := 0
	if isElement {
		n, err := strconv.Atoi(number)
		if err != nil || n < 1 {
			return fmt.Errorf("--why %s:%s: expected the number of an element, from 1", name, number)
		}
		element = n - 1
	}
	var known []string
	for _, in := range outcome.Inputs {
		if in.Name == name {
			a.printKey(name, in.Computation, e.Before(name, -1))
			return nil
		}
		known = append(known, in.Name)
	}
	for _, s := range outcome.Steps {
		known = append(known, s.Name)
		if s.Name != name {
			continue
		}
		if len(s.Elements) == 0 {
			if isElement {
				return fmt.Errorf("--why %s:%s: the step has no elements yet", name, number)
			}
			a.printKey(name, s.Computation, e.Before(name, -1))
			return nil
		}
		if element >= len(s.Elements) {
			return fmt.Errorf("--why %s:%s: the step has %d elements", name, number, len(s.Elements))
		}
		if !isElement { // the first one that changed tells most
			for n, el := range s.Elements {
				if el.Text.Why(e.Before(name, n)) != "" {
					element = n
					break
				}
			}
		}
		a.printKey(fmt.Sprintf("%s, element %d of %d", name, element+1, len(s.Elements)), s.Elements[element], e.Before(name, element))
		return nil
	}
	return noSuch("--why", name, "input or step", known)
}

func (a *app) printKey(what string, c engine.Computation, before plan.KeyText) {
	fmt.Fprintf(a.stdout, "\n%s\n", what)
	if c.Text == "" {
		fmt.Fprintln(a.stdout, "  its key is not known before what it takes is computed")
		return
	}
	fmt.Fprintf(a.stdout, "  key %s\n", c.Text.Key())
	switch why := c.Text.Why(before); {
	case before == "":
		fmt.Fprintln(a.stdout, "  there is no earlier run to compare with")
	case why == "":
		fmt.Fprintln(a.stdout, "  nothing changed against the run before")
	default:
		fmt.Fprintf(a.stdout, "  %s, against the run before\n", why)
	}
	for _, l := range c.Text.Diff(before) {
		fmt.Fprintf(a.stdout, "  %c %s\n", l.Mark, l.Text)
	}
}
