package orbit

import "math"

const (
	// scanSteps divides the half of the orbit in front of the star in the search
	// for the smallest separation.
	scanSteps = 64
	// goldenSteps shrink a bracket of two scan steps to below 1e-9 rad, where
	// the minimum is flat to rounding.
	goldenSteps = 40
	// bisections reduce a bracket to neighbouring numbers.
	bisections = 64
)

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
	const width = math.Pi / scanSteps
	best := 0
	squared = p.separationAt(0)
	for i := -scanSteps / 2; i <= scanSteps/2; i++ {
		if s := p.separationAt(width * float64(i)); s < squared {
			best, squared = i, s
		}
	}
	const ratio = 0.6180339887498949
	low, high := width*float64(best-1), width*float64(best+1)
	a, b := high-ratio*(high-low), low+ratio*(high-low)
	sa, sb := p.separationAt(a), p.separationAt(b)
	for range goldenSteps {
		if sa < sb {
			high, b, sb = b, a, sa
			a = high - ratio*(high-low)
			sa = p.separationAt(a)
		} else {
			low, a, sa = a, b, sb
			b = low + ratio*(high-low)
			sb = p.separationAt(b)
		}
	}
	angle = width * float64(best)
	if s := p.separationAt((low + high) / 2); s < squared {
		angle, squared = (low+high)/2, s
	}
	return angle, squared
}

// crossing returns the turn from conjunction at which the separation first
// exceeds limit, going from the angle of closest approach backwards (direction
// -1) or onwards (1).
func (p *Path) crossing(closest, direction, limit float64) float64 {
	const width = math.Pi / scanSteps
	limit *= limit
	inside, outside := closest, closest
	for {
		outside += direction * width
		if direction*outside >= math.Pi/2 {
			outside = direction * math.Pi / 2
		}
		if p.separationAt(outside) >= limit {
			break
		}
		inside = outside
		if direction*outside >= math.Pi/2 {
			return outside
		}
	}
	for range bisections {
		middle := (inside + outside) / 2
		if p.separationAt(middle) < limit {
			inside = middle
		} else {
			outside = middle
		}
	}
	return (inside + outside) / 2
}

// Duration returns the time from first to fourth contact and from second to
// third contact, in days, for a planet of the given radius in stellar radii,
// ≥ 0; each is 0 if there are no such contacts. Exact, see [Path.Contacts].
func (o Orbit) Duration(radiusRatio float64) (t14, t23 float64) {
	c := o.Path().Contacts(radiusRatio)
	return c.Fourth - c.First, c.Third - c.Second
}
