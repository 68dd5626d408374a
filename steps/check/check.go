// Package check holds verdicts on results: a named number, the limit it was
// held against, and why it matters. A step returns checks beside its result;
// the report counts and shows all of them, and a failed one changes the exit
// status of the run.
package check

// A Check is one verdict.
type Check struct {
	Name   string  // what was looked at, a noun phrase: "residual scatter against photon noise"
	Value  float64 // what was found; NaN when it could not be computed
	Unit   string  // FITS-standard unit string, empty for a pure number
	Limit  string  // what was asked of it, in words and numbers: "between 0.8 and 1.3"
	Passed bool
	Why    string // why it matters, one sentence
}
