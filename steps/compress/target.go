package compress

import "math"

// A node is the posterior of a light curve at one settling time.
type node struct {
	logTau    float64
	logWeight float64  // of the node: rule of integration, prior of the time and of the coefficients
	pieces    []tables // in order of radius ratio, each beginning where the one before ends

	mode     []float64 // in free coordinates
	factor   []float64 // Cholesky factor of the inverse of the covariance there, packed
	logPeak  float64   // of the density at the mode
	logMass  float64   // of the integral, if the density is normal
	variance []float64 // of the coordinates
}

// target is the posterior in the coordinates of a light curve, with space to work in.
type target struct {
	parameters *Parameters
	law        string
	free       []int
	// marginal is the number of samples less that of columns where the scale of the
	// errors is integrated over, 0 where they are as given.
	marginal float64

	at       place
	phi      *shares
	g        []float64
	s        []float64
	inverse  []float64
	half     []float64 // scratch of a function's block times a vector
	outer    []float64 // weights of the matrix's elements in the derivative
	byPhi    []float64
	curve    []float64 // second derivatives in φ, packed
	across   []float64 // of each function: products of its derivative with the columns
	solution []float64
}

// piece is the table for a radius ratio, nil where there is none.
func (n *node) piece(r float64) *tables {
	for k := range n.pieces {
		t := &n.pieces[k]
		if r <= t.deficits.Hi {
			if r < t.deficits.Lo {
				return nil
			}
			return t
		}
	}
	return nil
}

// room makes space for tables.
func (t *target) room(b *tables) {
	n := len(b.flat)
	if len(t.g) != n {
		t.g, t.outer, t.half = make([]float64, n), make([]float64, n), make([]float64, b.size+1)
		t.s, t.inverse = make([]float64, b.size), make([]float64, pairs(b.size))
		t.solution = make([]float64, b.size)
	}
	if k := len(b.deficits.values); t.phi == nil || len(t.phi.value) < k {
		t.phi = newShares(b.deficits)
		t.byPhi, t.curve = make([]float64, k), make([]float64, pairs(k))
	}
	if k := len(b.deficits.values) * (b.size + 1); len(t.across) < k {
		t.across = make([]float64, k)
	}
}

// value is the logarithm of the density at coordinates z, up to a constant; -Inf where
// there is none, and where the tables do not reach.
func (t *target) value(n *node, z []float64) float64 {
	_, chi2, logDet := t.fit(n, z, false)
	if math.IsInf(chi2, 1) {
		return math.Inf(-1)
	}
	return t.density(chi2, logDet, z)
}

// fit takes what the coefficients can explain off, at coordinates z: chi-square of the
// rest and the logarithm of the determinant, from the tables b that reach there. Chi-square
// is +Inf where there is no density.
func (t *target) fit(n *node, z []float64, slopes bool) (b *tables, chi2, logDet float64) {
	t.parameters.at(t.law, t.free, z, slopes, &t.at)
	if b = n.piece(t.at.r); b == nil {
		return nil, math.Inf(1), 0
	}
	t.room(b)
	var ok bool
	if slopes {
		ok = t.phi.slopes(b.deficits, b.functions, t.at.r, &t.at.u)
	} else {
		ok = t.phi.set(b.deficits, b.functions, t.at.r, &t.at.u)
	}
	if !ok {
		return b, math.Inf(1), 0
	}
	b.fill(t.phi.value, t.g)
	if chi2, logDet, ok = factorise(t.g, b.size); !ok {
		return b, math.Inf(1), 0
	}
	return b, chi2, logDet
}

func (t *target) density(chi2, logDet float64, z []float64) float64 {
	sum := logDet
	if t.marginal > 0 {
		sum += t.marginal * math.Log(chi2)
	} else {
		sum += chi2
	}
	for _, x := range z {
		sum += x * x
	}
	return -sum/2 + t.at.extra
}

// slopes is value with its gradient in z, and minus its second derivatives but for those
// of the determinant and of the shares in r and u, which are small at the mode.
func (t *target) slopes(n *node, z, gradient, curvature []float64) float64 {
	b, chi2, logDet := t.fit(n, z, true)
	if math.IsInf(chi2, 1) {
		return math.Inf(-1)
	}
	solved(t.g, b.size, t.s, t.inverse)
	scale := 1.0 // of the derivatives of chi-square
	if t.marginal > 0 {
		scale = t.marginal / chi2
	}
	t.byShares(b, scale)
	// From shares to coordinates.
	var by [3][]float64 // of the shares in r, u1 and u2
	by[0], by[1], by[2] = t.phi.byR, t.phi.byU[0], t.phi.byU[1]
	k := b.functions
	in := func(free, a int) float64 {
		if free == 0 {
			return by[0][a] * t.at.byZ[0]
		}
		return (by[1][a]*t.at.mix[0][free-1] + by[2][a]*t.at.mix[1][free-1]) * t.at.byZ[free]
	}
	for i, f := range t.free {
		sum := 0.0
		for a := range k {
			sum += t.byPhi[a] * in(f, a)
		}
		gradient[i] = -sum/2 - z[i] + t.at.slope[f]
		for j, other := range t.free[:i+1] {
			bend := 0.0
			for a := range k {
				row := 0.0
				for c := range k {
					row += t.curve[packed(a, c)] * in(other, c)
				}
				bend += row * in(f, a)
			}
			if i == j {
				bend += 1 + t.at.bend[f]
			}
			curvature[pairs(i)+j] = bend
		}
	}
	return t.density(chi2, logDet, z)
}

// packed is where element (a, b) of a symmetric matrix is.
func packed(a, b int) int {
	if a < b {
		a, b = b, a
	}
	return pairs(a) + b
}

// byShares sets byPhi to the derivatives of scale × chi-square + log determinant in the
// shares, and curve to half the second ones of the former.
func (t *target) byShares(b *tables, scale float64) {
	p, n, k := b.size, len(b.flat), b.functions
	// The residual is the sum of the columns with v = (-s, 1).
	v := t.half
	for j, s := range t.s {
		v[j] = -s
	}
	v[p] = 1
	// d(scale chi2 + logDet) = Σ outer dG over the packed elements.
	for j := range p + 1 {
		for l := range j + 1 {
			w := scale * v[j] * v[l]
			if j < p {
				w += t.inverse[pairs(j)+l]
			}
			if j != l {
				w *= 2
			}
			t.outer[pairs(j)+l] = w
		}
	}
	dot := func(block []float64) (sum float64) {
		for i, w := range t.outer {
			sum += w * block[i]
		}
		return sum
	}
	for a := range k {
		t.byPhi[a] = -dot(b.first[a*n : (a+1)*n])
	}
	x := 0
	for a := range k {
		for c := range a + 1 {
			d := dot(b.second[x : x+n])
			t.byPhi[a] += t.phi.value[c] * d
			t.byPhi[c] += t.phi.value[a] * d
			x += n
		}
	}
	t.bend(b, v, scale)
}

// bend sets curve: half the second derivatives of chi-square in the shares, the
// coefficients of the columns going along.
func (t *target) bend(b *tables, v []float64, scale float64) {
	p, n, k := b.size, len(b.flat), b.functions
	phi := t.phi.value
	// times is row j of a packed block times v.
	times := func(block []float64, j int) (sum float64) {
		for l, x := range v {
			sum += block[packed(j, l)] * x
		}
		return sum
	}
	// The chi-square is v'Gv, at the v for which its columns are orthogonal to the
	// residual; across is how that changes.
	across := t.across[:k*p]
	clear(across)
	for j := range p {
		for a := range k {
			across[a*p+j] -= times(b.first[a*n:(a+1)*n], j)
		}
	}
	x := 0
	for a := range k {
		for c := range a + 1 {
			block := b.second[x : x+n]
			for j := range p {
				d := times(block, j)
				across[a*p+j] += phi[c] * d
				across[c*p+j] += phi[a] * d
			}
			sum := 0.0
			for j := range p + 1 {
				sum += v[j] * times(block, j)
			}
			if a != c {
				sum /= 2
			}
			t.curve[pairs(a)+c] = sum
			x += n
		}
	}
	for a := range k {
		for j := range p {
			sum := 0.0
			for l := range p {
				sum += t.inverse[packed(j, l)] * across[a*p+l]
			}
			t.solution[j] = sum
		}
		for c := range a + 1 {
			sum := t.curve[pairs(a)+c]
			for j := range p {
				sum -= t.solution[j] * across[c*p+j]
			}
			t.curve[pairs(a)+c] = scale * sum
		}
	}
}
