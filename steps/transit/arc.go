package transit

import (
	"fmt"
	"math"
)

// DefaultTolerance and LeastTolerance are the default of the error that limb
// darkening by other than the uniform, linear and quadratic laws may cause, and
// the least that can be asked for.
const (
	DefaultTolerance = 1e-9
	LeastTolerance   = 1e-12
)

// The light behind the planet is an integral along its edge (Green's theorem, as
// in Pál 2012, MNRAS 420, 1630). With ψ the angle along the edge from the point
// farthest from the star's centre, ρ the distance of a point of the edge from
// that centre and μ² = 1-ρ², a term g(μ) of the intensity with moment M (see
// profile.values) has the deficit
//
//	π D = 2M × (area covered) + 2r ∫ h(μ) (r + z cos ψ) dψ
//
// over the half of the edge within the star's disc, and derivatives 2r ∫ g dψ by r
// and 2r ∫ g cos ψ dψ by z. The integrands have no singularity where the planet's
// edge passes the star's centre. What singularity they have, at μ = 0, lies at or
// near the end of the edge, ψ → 0 or the crossing with the star's edge.
//
// Where μ² is far from 0 all along, the integrands are periodic and analytic, and
// equal steps in ψ converge geometrically. Otherwise cos(ψ/2) is replaced by its
// largest value times tanh(π/2 sinh x) (Takahasi & Mori 1974): the end, with any
// power of μ and however near the contact, moves to infinity, and equal steps in
// x converge as fast for all.

// maxNodes is the largest number of points along half an edge.
const maxNodes = 65

// nodes are the points of the quadratures at one tolerance.
type nodes struct {
	coarse, fine equal     // for edges far from the limb
	squares      []float64 // 1 - tanh²(π/2 sinh x)
	weights      []float64 // those of the step in x times the squares

	// For outlines that are not circles, see walk: errors are below exp(-digits), and
	// an argument of tanh is followed towards infinity to farthest.
	digits, farthest float64
}

// equal are equal steps in ψ from 0 to π.
type equal struct {
	ratio   float64   // least (1-z²-r²)/(2zr), the hyperbolic cosine of the strip of analyticity
	squares []float64 // sin²(ψ/2)
}

// edge are the points along half of a planet's edge, with all that the integrals
// need.
type edge struct {
	n       int
	mu2     [maxNodes]float64
	squares [maxNodes]float64 // sin²(ψ/2)
	weights [maxNodes]float64 // of dψ
}

// levels are the rules by tolerance, loosest first. The errors of the steps in x
// are those found against 30-digit integrals at all
// distances from the contacts: 4e-11 and 6e-12 times 2r/π in the derivatives for
// μ^0.2, 3e-12 and 2e-13 for √μ, less for higher powers and for the flux.
var levels = []struct {
	tolerance float64
	nodes     nodes
}{
	{DefaultTolerance, newNodes(27, 16, 32, 0.07, 52, 28, 15)},
	{LeastTolerance, newNodes(34, 32, 128, 0.06, 62, 36, 18)},
}

// finest are the last of the levels.
func finest() *nodes { return &levels[len(levels)-1].nodes }

// newNodes prepares rules: of equal steps all around, to exp(-around), and of n
// steps of h; the others are those of nodes.
func newNodes(around float64, coarse, fine int, h float64, n int, digits, farthest float64) nodes {
	steps := func(n int) equal {
		e := equal{ratio: math.Cosh(around / float64(n))}
		for k := range n/2 + 1 {
			s := math.Sin(math.Pi * float64(k) / float64(n))
			e.squares = append(e.squares, s*s)
		}
		return e
	}
	out := nodes{coarse: steps(coarse), fine: steps(fine), digits: digits, farthest: farthest}
	for k := range n {
		sinh, cosh := math.Sinh(h*float64(k)), math.Cosh(h*float64(k))
		c := math.Cosh(math.Pi / 2 * sinh)
		weight := math.Pi / 2 * cosh * h / (c * c)
		if k == 0 {
			weight /= 2
		}
		out.squares, out.weights = append(out.squares, 1/(c*c)), append(out.weights, weight)
	}
	return out
}

// nodesFor returns the rules for a tolerance; 0 means [DefaultTolerance].
func nodesFor(tolerance float64) (*nodes, error) {
	if tolerance == 0 {
		tolerance = DefaultTolerance
	}
	for i := range levels {
		if tolerance >= levels[i].tolerance {
			return &levels[i].nodes, nil
		}
	}
	return nil, fmt.Errorf("transit: tolerance is %g, must be %g or more, or 0 for %g", tolerance, LeastTolerance, DefaultTolerance)
}

// around lays equal steps on the edge of a planet with 1-(z+r)² = opr > 0 and
// reports whether they do.
func (e *edge) around(n *nodes, r, z, opr float64) bool {
	half := 2 * z * r
	var steps *equal
	switch middle := opr + half; {
	case middle >= n.coarse.ratio*half:
		steps = &n.coarse
	case middle >= n.fine.ratio*half:
		steps = &n.fine
	default:
		return false
	}
	e.n = len(steps.squares)
	weight := math.Pi / float64(e.n-1)
	for i, square := range steps.squares {
		e.mu2[i] = opr + 2*half*square
		e.squares[i] = square
		e.weights[i] = weight
	}
	e.weights[0], e.weights[e.n-1] = weight/2, weight/2
	return true
}

// graded lays graded steps on an edge with μ² = least + lead s and
// sin²(ψ/2) = least square + v² s, where s = 1 - (cos(ψ/2)/v)².
func (e *edge) graded(n *nodes, least, lead, leastSquare, v2 float64) {
	e.n = len(n.squares)
	double := 2 * math.Sqrt(v2)
	for i, s := range n.squares {
		square := leastSquare + v2*s
		e.mu2[i] = least + lead*s
		e.squares[i] = square
		e.weights[i] = double * n.weights[i] / math.Sqrt(square)
	}
}

// integrate sets the deficits of the last two terms. d has that of the first.
func (e *edge) integrate(p *profile, r, z float64, d *deficits) {
	var a, b, ha, hb, za, zb float64
	far := r + z
	for i, mu2 := range e.mu2[:e.n] {
		weight, square := e.weights[i], e.squares[i]
		lever := weight * (far - 2*z*square) // r + z cos ψ
		ga, gb, la, lb := p.values(mu2)
		ha += lever * la
		hb += lever * lb
		ga *= weight
		gb *= weight
		a += ga
		b += gb
		za += ga * square
		zb += gb * square
	}
	c := 2 / math.Pi * r
	ma, mb := p.moments()
	d.value[3], d.value[4] = 2*ma*d.value[0]+c*ha, 2*mb*d.value[0]+c*hb
	d.byR[3], d.byR[4] = c*a, c*b
	d.byZ[3], d.byZ[4] = c*(a-2*za), c*(b-2*zb)
}
