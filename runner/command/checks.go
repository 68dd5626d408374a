package command

import (
	"fmt"

	"rimlight/reports"
	"rimlight/runner/engine"
	"rimlight/steps/check"
)

// checks counts the checks of steps, and gives those that failed.
func checks(steps []reports.Step) (passed int, failed []check.Check) {
	for _, s := range steps {
		all := checksOf(s)
		bad := check.Failed(all)
		passed += len(all) - len(bad)
		failed = append(failed, bad...)
	}
	return passed, failed
}

// checksOf are the checks of a step: the runner's own, and those among its
// results.
func checksOf(s reports.Step) []check.Check {
	out := append([]check.Check(nil), s.Checks...)
	for _, r := range s.Results {
		switch v := r.Value.(type) {
		case check.Check:
			out = append(out, v)
		case []check.Check:
			out = append(out, v...)
		}
	}
	return out
}

// gapChecks is a failed check when the results of a step have gaps, and none
// otherwise.
func gapChecks(s *engine.Step) []check.Check {
	gaps := len(s.Gaps())
	if gaps == 0 {
		return nil
	}
	return []check.Check{check.AtMost(fmt.Sprintf("elements of %s without a result, of %d", s.Name, len(s.Elements)), float64(gaps), 0, "", s.GapText())}
}
