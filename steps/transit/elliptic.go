package transit

import "math"

const (
	// agmTolerance ends the arithmetic-geometric mean, which converges
	// quadratically: what remains is its square over 16, below rounding.
	agmTolerance = 5e-8
	// agmSteps bounds the mean; moduli down to 1e-16 take 9 steps.
	agmSteps = 16
	// leastSquare bounds from below the squared modulus that divides terms of
	// its fourth power.
	leastSquare = 1e-14
)

// integrals are the three complete elliptic integrals of one separation. With
// 0 < kc ≤ 1, k2 = 1 - kc², q > 0 and Δ = √(cos²x + kc² sin²x), over x from 0 to
// π/2,
//
//	third = ∫ (a cos²x + b q sin²x) / ((cos²x + q² sin²x) Δ) dx,
//	cosine = ∫ cos²x/Δ dx,
//	sine = ∫ sin²x/Δ dx,
//	margin = cosine - kc² sine.
//
// These are cel(kc,q²,a,bq), cel(kc,1,1,0), cel(kc,1,0,1) and cel(kc,1,1,-kc²) of
// Bulirsch (1969); the last keeps its digits where it vanishes, at k = 0.
type integrals struct {
	kc, k2, q, a, b             float64 // kc, q, a and b serve the mean
	third, cosine, sine, margin float64

	// The arithmetic-geometric mean of m and kc, both doubled in each step.
	m, diff, e float64 // diff = m - kc, e = m kc before doubling
	sum, scale float64
	done       bool
}

// solve computes integrals from their kc, k2, q, a and b. One arithmetic-geometric
// mean serves the three of a separation: the last two follow from the sum of its
// squared differences (Abramowitz & Stegun 1964, 17.6), less its first term and
// divided by it, k². A mean is a chain in which each operation waits for the one
// before, so the means of all are taken side by side.
func solve(all []integrals) {
	for i := range all {
		t := &all[i]
		t.m, t.e, t.diff = 1, t.kc, t.k2/(1+t.kc)
		t.sum, t.scale, t.done = 0, 0.5, false
	}
	for range agmSteps {
		rest := false
		for i := range all {
			t := &all[i]
			if t.done {
				continue
			}
			inverse := 1 / t.q
			a := t.a
			t.a += t.b * inverse
			g := t.e * inverse
			t.b = 2 * (t.b + a*g)
			t.q += g
			t.sum += t.scale * t.diff * t.diff
			t.scale *= 0.5
			limit := t.m * agmTolerance
			t.m += t.kc
			if t.diff <= limit {
				t.done = true
				continue
			}
			root := math.Sqrt(t.e)
			t.kc = root + root
			t.e = t.kc * t.m
			t.diff = t.m - t.kc
			rest = true
		}
		if !rest {
			break
		}
	}
	for i := range all {
		t := &all[i]
		inverse := 0.5 * math.Pi / (t.m * (t.m + t.q))
		t.third = inverse * (t.b + t.a*t.m)
		first := 0.5 * inverse * (t.m + t.q) / t.scale // K
		rest := t.sum / max(t.k2, leastSquare)
		t.sine = first * (0.5 + 0.5*rest)
		t.cosine = first - t.sine
		t.margin = first * (0.5*t.k2 - (1-0.5*t.k2)*rest)
	}
}
