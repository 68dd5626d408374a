package check

import (
	"fmt"
	"math"
)

// Between passes when lo ≤ value ≤ hi. A value that is NaN fails.
func Between(name string, value, lo, hi float64, unit, why string) Check {
	return Check{
		Name:   name,
		Value:  value,
		Unit:   unit,
		Limit:  fmt.Sprintf("between %s and %s", number(lo), number(hi)),
		Passed: value >= lo && value <= hi,
		Why:    why,
	}
}

// AtMost passes when value ≤ limit. A value that is NaN fails.
func AtMost(name string, value, limit float64, unit, why string) Check {
	return Check{
		Name:   name,
		Value:  value,
		Unit:   unit,
		Limit:  "at most " + number(limit),
		Passed: value <= limit,
		Why:    why,
	}
}

// AtLeast passes when value ≥ limit. A value that is NaN fails.
func AtLeast(name string, value, limit float64, unit, why string) Check {
	return Check{
		Name:   name,
		Value:  value,
		Unit:   unit,
		Limit:  "at least " + number(limit),
		Passed: value >= limit,
		Why:    why,
	}
}

// NotComputed is a failed check of something that could not be looked at:
// reason says why, in place of a limit.
func NotComputed(name, reason, why string) Check {
	return Check{Name: name, Value: math.NaN(), Limit: "could not be computed: " + reason, Why: why}
}

// Failed returns those of the checks that did not pass, in their order.
func Failed(checks []Check) []Check {
	var out []Check
	for _, c := range checks {
		if !c.Passed {
			out = append(out, c)
		}
	}
	return out
}

// number writes a limit as people do: six significant digits, no trailing zeros.
func number(x float64) string { return fmt.Sprintf("%.6g", x) }
