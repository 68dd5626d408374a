package compress

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
	"rimlight/steps/transit"
)

const (
	// degree is that of the polynomials in the radius ratio. Between contacts the
	// deficits are smooth and a higher one gains nothing; at contacts their error goes
	// as the width of the interval to the power 3/2 whatever the degree.
	degree = 6
	// negligible is the norm of a function of time, relative to the largest, below which
	// it is left out whatever the noise.
	negligible = 1e-7
)

// trials are where in an interval of radii a table is compared with the exact deficits,
// from -1 to 1: between nodes, and near one end.
var trials = []float64{-0.93, -0.21, 0.64}

// Deficits are what a planet of a radius ratio between Lo and Hi covers of a star, as a
// sum of functions of time.
type Deficits struct {
	Lo, Hi float64

	law    *law
	first  []int       // of runs of integrations at which a planet of radius ratio Hi touches the star
	until  []int       // their ends
	size   int         // integrations in runs
	values [][]float64 // functions, most important first, at the integrations of the runs
	rotate [][]float64 // of each function: its share in each T_k of each term
	norm   []float64   // root of the sum of squares of each function
	error  []float64   // of the deficits, at the worst of the trials, at the integrations of the runs
}

// A Star says which transit light curves are of. Times are in days.
type Star struct {
	Times     []float64
	Orbit     orbit.Orbit
	Exposure  float64 // s
	Law       string  // of limb darkening
	Companion float64 // light of other stars, in units of the star's
}

// newDeficits makes a table for radius ratios between lo and hi.
func newDeficits(star *Star, l *law, lo, hi float64) (*Deficits, error) {
	if !(lo >= 0 && lo < hi) {
		return nil, fmt.Errorf("radius ratios from %g to %g; expected an increasing range", lo, hi)
	}
	d := &Deficits{Lo: lo, Hi: hi, law: l}
	if err := d.find(star); err != nil {
		return nil, err
	}
	points := degree + 1
	nodes, transform := chebyshevNodes(points), chebyshevTransform(points)
	terms := len(l.terms)
	at := make([][][]float64, points) // node, term
	for q, x := range nodes {
		var err error
		if at[q], err = d.exact(star, d.radius(x)); err != nil {
			return nil, err
		}
	}
	// Coefficients of the polynomials, functions of time.
	raw := make([][]float64, terms*points)
	for n := range terms {
		for k := range points {
			c := make([]float64, d.size)
			for q := range points {
				floats.AddScaled(c, transform[k][q], at[q][n])
			}
			raw[n*points+k] = c
		}
	}
	d.turn(raw)
	return d, d.compare(star)
}

// radius is the radius ratio at x, from -1 to 1.
func (d *Deficits) radius(x float64) float64 { return (d.Lo+d.Hi)/2 + x*(d.Hi-d.Lo)/2 }

// find looks for the integrations in transit.
func (d *Deficits) find(star *Star) error {
	covered, err := transit.CurveTerms(star.Times, d.params(star, d.Hi))
	if err != nil {
		return err
	}
	inside := false
	for i, c := range covered[0] {
		if c > 0 && !inside {
			d.first, d.until = append(d.first, i), append(d.until, i)
		}
		inside = c > 0
		if inside {
			d.until[len(d.until)-1] = i + 1
			d.size++
		}
	}
	return nil
}

func (d *Deficits) params(star *Star, r float64) transit.Params {
	law := limb.Law{Name: d.law.name, Coefficients: make([]float64, d.law.count)}
	return transit.Params{Orbit: star.Orbit, RadiusRatio: r, Law: law, Exposure: star.Exposure}
}

// exact is what is covered of each term at the integrations of the runs.
func (d *Deficits) exact(star *Star, r float64) ([][]float64, error) {
	times := make([]float64, 0, d.size)
	for k, first := range d.first {
		times = append(times, star.Times[first:d.until[k]]...)
	}
	all, err := transit.CurveTerms(times, d.params(star, r))
	if err != nil {
		return nil, err
	}
	out := make([][]float64, len(d.law.terms))
	for n, term := range d.law.terms {
		out[n] = all[term]
	}
	return out, nil
}

// turn rotates functions of time onto orthogonal ones.
func (d *Deficits) turn(raw [][]float64) {
	n := len(raw)
	norm, vectors := decompose(raw)
	for a := range norm {
		if !(norm[a] > negligible*norm[0]) {
			break
		}
		row, value := make([]float64, n), make([]float64, d.size)
		for k := range n {
			row[k] = vectors.At(k, a)
			floats.AddScaled(value, row[k], raw[k])
		}
		d.rotate, d.values, d.norm = append(d.rotate, row), append(d.values, value), append(d.norm, norm[a])
	}
}

// compare finds the error of the table at some radii and for stars at the corners of
// what is physical, and keeps the largest.
func (d *Deficits) compare(star *Star) error {
	corners := [][2]float64{{0, 0}, {0, 1}, {2, -1}}
	d.error = make([]float64, d.size)
	worst := -1.0
	phi := newShares(d)
	for _, x := range trials {
		r := d.radius(x)
		exact, err := d.exact(star, r)
		if err != nil {
			return err
		}
		for _, u := range corners {
			if !phi.set(d, len(d.values), r, &u) {
				continue
			}
			diff := make([]float64, d.size)
			for a, value := range d.values {
				floats.AddScaled(diff, phi.value[a], value)
			}
			for n := range exact {
				floats.AddScaled(diff, -phi.gamma[n], exact[n])
			}
			if norm := floats.Norm(diff, 2); !(norm <= worst) {
				worst = norm
				copy(d.error, diff)
			}
		}
	}
	if math.IsNaN(worst) {
		return fmt.Errorf("the deficits for radius ratios from %g to %g are not finite", d.Lo, d.Hi)
	}
	return nil
}

// shares are the coefficients φ of the functions of time for a radius ratio and
// limb-darkening coefficients, with derivatives.
type shares struct {
	value    []float64
	byR      []float64
	byU      [2][]float64
	gamma    [mostTerms]float64
	byGamma  [2][mostTerms]float64
	t, slope [degree + 1]float64
}

func newShares(d *Deficits) *shares {
	n := len(d.values)
	return &shares{value: make([]float64, n), byR: make([]float64, n), byU: [2][]float64{make([]float64, n), make([]float64, n)}}
}

// set computes the first of the shares, as many as asked for, and reports whether the
// star gives light.
func (s *shares) set(d *Deficits, count int, r float64, u *[2]float64) bool {
	if !d.law.weights(u, &s.gamma, &s.byGamma) {
		return false
	}
	half := (d.Hi - d.Lo) / 2
	chebyshev((r-d.Lo)/half-1, s.t[:], nil)
	const points = degree + 1
	for a := range count {
		row := d.rotate[a]
		sum := 0.0
		for n := range d.law.terms {
			term := 0.0
			for k, t := range s.t {
				term += row[n*points+k] * t
			}
			sum += s.gamma[n] * term
		}
		s.value[a] = sum
	}
	return true
}

// slopes is set, with derivatives.
func (s *shares) slopes(d *Deficits, count int, r float64, u *[2]float64) bool {
	if !d.law.weights(u, &s.gamma, &s.byGamma) {
		return false
	}
	half := (d.Hi - d.Lo) / 2
	chebyshev((r-d.Lo)/half-1, s.t[:], s.slope[:])
	const points = degree + 1
	for a := range count {
		row := d.rotate[a]
		s.value[a], s.byR[a], s.byU[0][a], s.byU[1][a] = 0, 0, 0, 0
		for n := range d.law.terms {
			var term, by float64
			for k, t := range s.t {
				term += row[n*points+k] * t
				by += row[n*points+k] * s.slope[k]
			}
			s.value[a] += s.gamma[n] * term
			s.byR[a] += s.gamma[n] * by / half
			s.byU[0][a] += s.byGamma[0][n] * term
			s.byU[1][a] += s.byGamma[1][n] * term
		}
	}
	return true
}
