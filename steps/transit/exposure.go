package transit

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

const (
	// mostNodes is the largest number of nodes on one piece of a transit.
	mostNodes = 24
	// averageTolerance is what the predicted error of an average may reach. The
	// prediction is for the flux; derivatives are larger and lose as much more.
	averageTolerance = 1e-11
	// regular is the distance to a contact, in lengths of the interval, from
	// which the flux is smooth enough to integrate over time itself.
	regular = 4
)

// rule is a quadrature rule of Gauss and Legendre on (-1, 1).
type rule struct{ nodes, weights []float64 }

// rules holds the rule of n nodes at index n.
var rules = func() (all [mostNodes + 1]rule) {
	for n := 1; n <= mostNodes; n++ {
		all[n] = rule{make([]float64, n), make([]float64, n)}
		quad.Legendre{}.FixedLocations(all[n].nodes, all[n].weights, -1, 1)
	}
	return all
}()

// piece is a stretch of the transit with a contact at one end and no other
// contact nearer to any of its points. At a contact the flux goes as the
// distance in time to the power 3/2; as a function of the square root of that
// distance it is smooth. The other contacts limit how smooth.
type piece struct {
	from, to float64 // days since mid-transit
	contact  float64 // from or to
	opposite float64 // distance from contact to the one beyond the piece, days
	other    float64 // distance from contact to the nearest other, on either side, days
}

// split divides the transit into pieces at the contacts and half-way between
// them. A transit that never is full has no inner contacts, but nearly has them
// at its middle, which counts as one.
func (c *curve) split() {
	k := c.path.Contacts(c.radius)
	if !k.Transit {
		return
	}
	contacts := []float64{k.First, k.Closest, k.Fourth}
	if k.Full {
		contacts = []float64{k.First, k.Second, k.Third, k.Fourth}
	}
	for i := 1; i < len(contacts); i++ {
		a, b := contacts[i-1], contacts[i]
		before, after := math.Inf(1), math.Inf(1)
		if i > 1 {
			before = a - contacts[i-2]
		}
		if i+1 < len(contacts) {
			after = contacts[i+1] - b
		}
		middle := (a + b) / 2
		c.pieces = append(c.pieces,
			piece{a, middle, a, b - a, math.Min(b-a, before)},
			piece{middle, b, b, b - a, math.Min(b-a, after)})
	}
	c.from, c.to = k.First, k.Fourth
}

// average adds the samples to the result for time i that make up the mean over
// the exposure centred on a time since mid-transit.
func (c *curve) average(i int, since, elapsed float64) {
	// An exposure near half a period from mid-transit may reach the transits
	// before and after.
	for turn := -1.0; turn <= 1; turn++ {
		middle := since - turn*c.period
		from, to := middle-c.exposure/2, middle+c.exposure/2
		if to <= c.from || from >= c.to {
			continue
		}
		for k := range c.pieces {
			p := &c.pieces[k]
			a, b := math.Max(from, p.from), math.Min(to, p.to)
			switch {
			case a >= b:
			case c.face != nil:
				c.refine(i, a, b, elapsed-middle)
			default:
				c.integrate(i, p, a, b, elapsed-middle)
			}
		}
	}
}

// integrate adds the samples whose weighted sum is the integral from a to b,
// within piece p, divided by the exposure. offset + time since mid-transit is the
// time since Orbit.MidTransit.
func (c *curve) integrate(i int, p *piece, a, b, offset float64) {
	near, far, sign := a-p.contact, b-p.contact, 1.0
	if p.contact == p.to {
		near, far, sign = p.to-b, p.to-a, -1
	}
	near = math.Max(near, 0)
	length := far - near
	smooth := near >= regular*length
	var nearest float64 // singular point, in units of the half-length from the centre
	if smooth {
		nearest = math.Min(near+far, 2*p.opposite-near-far) / length
	} else {
		near, far = math.Sqrt(near), math.Sqrt(far)
		nearest = (2*math.Sqrt(p.other) - near - far) / (far - near)
	}
	r := &rules[c.nodes(nearest, length)]
	centre, half := (near+far)/2, (far-near)/2
	for k, x := range r.nodes {
		at, weight := centre+half*x, half*r.weights[k]/c.exposure
		if !smooth {
			at, weight = at*at, 2*at*weight
		}
		at = p.contact + sign*at
		c.sample(i, at, offset+at, weight)
	}
}

// nodes returns how many nodes integrate a function with a singular point at
// the given distance from the centre, in half-lengths, to the tolerance. A rule
// of n nodes errs by about ρ^(-2n), where ρ is the sum of the half-axes of the
// ellipse with foci at the ends of the interval through that point; the
// function itself is at most the depth, and this interval counts in the average
// with its share of the exposure.
func (c *curve) nodes(nearest, length float64) int {
	if !(nearest > 1) {
		return mostNodes
	}
	share := math.Min(1, c.radius*c.radius) * length / c.exposure
	rho := nearest + math.Sqrt((nearest-1)*(nearest+1))
	rho *= rho
	n := 1
	for bound := share / rho; bound > averageTolerance && n < mostNodes; n++ {
		bound /= rho
	}
	return n
}
