package recipe

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// MaxGrid is the largest number of elements of a grid.
const MaxGrid = 1_000_000

// gridParts splits lo:hi:step. It reports whether s has this form, with
// something meant as a number in each place.
func gridParts(s string) (lo, hi, step string, ok bool) {
	parts := strings.Split(s, ":")
	if len(parts) != 3 {
		return "", "", "", false
	}
	for i := range parts {
		parts[i] = strings.TrimSpace(parts[i])
		if _, err := number(parts[i]); err == errNoNumber {
			return "", "", "", false
		}
	}
	return parts[0], parts[1], parts[2], true
}

// grid gives the numbers lo, lo+step, lo+2*step and so on, up to hi, which is
// the last when it lies within 1e-9 steps of the grid. As far as the decimals
// allow, each is the float64 nearest to its decimal value: element 3 of
// 0:1:0.1 is 0.3.
func grid(loText, hiText, stepText string) ([]float64, error) {
	var v [3]float64
	for i, s := range []string{loText, hiText, stepText} {
		x, err := number(s)
		if err != nil {
			return nil, err
		}
		v[i] = x
	}
	lo, hi, step := v[0], v[1], v[2]
	steps := (hi - lo) / step
	switch {
	case step == 0:
		return nil, errors.New("the step of the grid is zero")
	case steps < 0:
		return nil, fmt.Errorf("the step %s leads away from %s", stepText, hiText)
	case !(steps < MaxGrid): // NaN too
		return nil, fmt.Errorf("the grid has more than %d elements", MaxGrid)
	case lo != hi && (lo+step == lo || hi-step == hi):
		return nil, fmt.Errorf("the step %s is lost beside %s and %s", stepText, loText, hiText)
	}
	n := int(math.Floor(steps + 1e-9))
	at := func(i int) float64 { return lo + float64(i)*step }
	if exact, ok := decimalGrid(loText, hiText, stepText); ok {
		at = exact
	}
	out := make([]float64, n+1)
	for i := range out {
		out[i] = at(i)
	}
	if math.Abs(out[n]-hi) <= 1e-9*math.Abs(step) {
		out[n] = hi
	}
	return out, nil
}

// decimalGrid computes the elements in whole multiples of the smallest decimal
// place, so that each is rounded once. It gives up when the numbers have too
// many digits for that.
func decimalGrid(loText, hiText, stepText string) (at func(i int) float64, ok bool) {
	places := 0
	for _, s := range []string{loText, hiText, stepText} {
		if strings.ContainsAny(s, "eE") {
			return nil, false
		}
		if i := strings.IndexByte(s, '.'); i >= 0 {
			places = max(places, len(s)-i-1)
		}
	}
	const most = 15 // powers of ten and sums up to 1e15 are exact
	if places > most {
		return nil, false
	}
	var units [3]int64
	for i, s := range []string{loText, hiText, stepText} {
		whole, fraction, _ := strings.Cut(s, ".")
		digits := whole + fraction + strings.Repeat("0", places-len(fraction))
		if len(digits) > most {
			return nil, false
		}
		n, err := strconv.ParseInt(digits, 10, 64)
		if err != nil {
			return nil, false
		}
		units[i] = n
	}
	scale := math.Pow10(places)
	return func(i int) float64 { return float64(units[0]+int64(i)*units[2]) / scale }, true
}
