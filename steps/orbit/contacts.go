package orbit

import "math"

const (
	// scanSteps divides the half of the orbit in front of the star in the search
	// for the smallest separation.
	scanSteps = 64
	// rootSteps bounds the search for a root in a bracket; ten are usual.
	rootSteps = 200
)

// scan holds sine and cosine of the angles of that search.
var scan = func() (all [scanSteps + 1][2]float64) {
	for i := range all {
		all[i][0], all[i][1] = math.Sincos(math.Pi / scanSteps * float64(i-scanSteps/2))
	}
	return all
}()

// Contacts are the times at which the discs of planet and star touch, in days
// since mid-transit.
type Contacts struct {
	Transit bool    // the discs overlap at some time
	Full    bool    // the smaller disc is at some time entirely within the larger
	Closest float64 // time of the smallest separation of the planet in front
	First   float64 // start of the transit; 0 without one
	Second  float64 // start of the full transit; 0 without one
	Third   float64 // end of the full transit; 0 without one
	Fourth  float64 // end of the transit; 0 without one
}

// Contacts returns the contacts of a planet of the given radius in stellar
// radii, ≥ 0, found as roots of the exact separation in true anomaly; the
// error is rounding, about 1e-15 periods. The orbit must be valid. On an orbit
// on which the planet would touch the star while beside it, transit starts or
// ends where the planet comes to the star's front.
func (p *Path) Contacts(radiusRatio float64) Contacts {
	p = p.known()
	closest, least := p.closest()
	c := Contacts{Closest: p.timeAt(closest)}
	outer, inner := 1+radiusRatio, math.Abs(1-radiusRatio)
	if !(least < outer*outer) {
		return c
	}
	c.Transit = true
	c.First, c.Fourth = p.timeAt(p.crossing(closest, -1, outer)), p.timeAt(p.crossing(closest, 1, outer))
	if least < inner*inner {
		c.Full = true
		c.Second, c.Third = p.timeAt(p.crossing(closest, -1, inner)), p.timeAt(p.crossing(closest, 1, inner))
	}
	return c
}

// closest returns the turn from conjunction at which the planet in front of the
// star is closest to its centre, and the squared separation there.
func (p *Path) closest() (angle, squared float64) {
	const width, middle = math.Pi / scanSteps, scanSteps / 2
	best := middle
	squared, _ = p.separationAt(0, 1)
	for i := range scan {
		if s, _ := p.separationAt(scan[i][0], scan[i][1]); s < squared {
			best, squared = i, s
		}
	}
	slope := func(angle float64) float64 {
		_, slope := p.separationAt(math.Sincos(angle))
		return slope
	}
	angle = width * float64(best-middle)
	low, high := width*float64(max(best-1, 0)-middle), width*float64(min(best+1, scanSteps)-middle)
	if !(slope(low) < 0 && slope(high) > 0) {
		return angle, squared
	}
	at := root(slope, low, high)
	if s, _ := p.separationAt(math.Sincos(at)); s <= squared {
		return at, s
	}
	return angle, squared
}

// crossing returns the turn from conjunction at which the separation first
// exceeds limit, going from the angle of closest approach backwards (direction
// -1) or onwards (1).
func (p *Path) crossing(closest, direction, limit float64) float64 {
	const width = math.Pi / scanSteps
	excess := func(angle float64) float64 {
		s, _ := p.separationAt(math.Sincos(angle))
		return s - limit*limit
	}
	inside, outside := closest, closest
	for {
		outside += direction * width
		if direction*outside >= math.Pi/2 {
			outside = direction * math.Pi / 2
		}
		if !(excess(outside) < 0) {
			return root(excess, inside, outside)
		}
		inside = outside
		if direction*outside >= math.Pi/2 {
			return outside
		}
	}
}

// separationAt returns the squared separation, in stellar radii, after the turn
// from conjunction with the given sine and cosine, and its derivative by the
// angle of turn.
func (p *Path) separationAt(sin, cos float64) (squared, slope float64) {
	e := p.kepler.e
	cosF, sinF := p.sinW*cos-p.cosW*sin, p.cosW*cos+p.sinW*sin
	inverse := 1 / (1 + e*cosF)
	r := p.axis * p.kepler.rest * (1 + e) * inverse
	y := cos * p.cosI
	squared = r * r * (sin*sin + y*y)
	return squared, 2*squared*e*sinF*inverse + 2*r*r*sin*cos*p.sinI*p.sinI
}

// root returns where f, which has opposite signs at a and b, is zero: by the
// rule of false position as modified by Anderson & Björck (1973, BIT 13, 253;
// from memory), with bisection when that is slow.
func root(f func(float64) float64, a, b float64) float64 {
	fa, fb := f(a), f(b)
	if fa == 0 {
		return a
	}
	for i := range rootSteps {
		if fb == 0 {
			return b
		}
		x := b - fb*(b-a)/(fb-fa)
		if i%8 == 7 || !(x > min(a, b) && x < max(a, b)) {
			x = a + (b-a)/2
		}
		if x == a || x == b { // neighbouring numbers
			break
		}
		fx := f(x)
		if (fx < 0) != (fb < 0) || fx == 0 {
			a, fa = b, fb
		} else {
			shrink := 1 - fx/fb
			if !(shrink > 0) {
				shrink = 0.5
			}
			fa *= shrink
		}
		done := math.Abs(x-b) <= 2e-16*math.Abs(x)
		b, fb = x, fx
		if done {
			break
		}
	}
	return b
}
