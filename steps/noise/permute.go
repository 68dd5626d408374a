package noise

import "fmt"

// Shift returns a series for residual permutation, the "prayer bead": the model
// plus the residuals moved by a number of samples, those that leave at the end
// coming in at the start. Fitting as many series as there are samples, and taking
// the scatter of what is found, carries correlated noise into the errors of
// parameters (Jenkins, Caldwell & Borucki 2002; Winn et al. 2008). The series are
// not independent: noise as slow as the series itself is not seen, and the scatter
// is no posterior; Cubillos et al. (2017) advise against the method. Use it to
// compare.
//
// A negative number moves backwards. Residuals that are not finite stay where they
// are, as do those beside a model that is not finite, and the others move around
// them. It is an error when lengths differ.
func Shift(model, residual []float64, by int) ([]float64, error) {
	if len(model) != len(residual) {
		return nil, fmt.Errorf("residual permutation: %d model values and %d residuals; expected equal numbers", len(model), len(residual))
	}
	out := make([]float64, len(model))
	var used []int
	for i, r := range residual {
		out[i] = model[i] + r
		if finite(out[i]) {
			used = append(used, i)
		}
	}
	n := len(used)
	if n == 0 {
		return out, nil
	}
	by = (by%n + n) % n
	for k, from := range used {
		to := used[(k+by)%n]
		out[to] = model[to] + residual[from]
	}
	return out, nil
}

// Shifts returns count different shifts of n residuals, spread evenly from 0; all n
// of them when count is 0 or more than n. It is an error when a number is negative
// or n exceeds 2097152.
func Shifts(n, count int) ([]int, error) {
	if n < 0 || count < 0 || n > mostSamples {
		return nil, fmt.Errorf("residual permutation: %d shifts of %d residuals; expected at least 0 and at most %d", count, n, mostSamples)
	}
	if count == 0 || count > n {
		count = n
	}
	out := make([]int, count)
	for k := range out {
		out[k] = k * n / count
	}
	return out, nil
}
