package transit

import (
	"fmt"
	"math"
)

// A Spot is a round spot on the star: a cap of its sphere, brighter or darker by
// the same factor everywhere, that stays where it is during a transit. The
// sphere's poles are on the Y axis of the sky, its equator is seen as the X axis,
// and the meridian of longitude 0 as the Y axis. What lies beyond the star's edge
// is not seen.
type Spot struct {
	Latitude  float64 // of the centre, radians, -π/2 to π/2, towards the Y axis
	Longitude float64 // of the centre, radians, towards the X axis
	Radius    float64 // seen from the star's centre, radians, above 0, to π/2
	Contrast  float64 // brightness relative to the star without the spot: 0 is black, 1 is no spot, above 1 a facula
}

// spotArguments is how many parameters a spot has.
const spotArguments = 4

// check returns an error for a spot out of range; what names it.
func (s Spot) check(what string) error {
	switch {
	case !(math.Abs(s.Latitude) <= math.Pi/2):
		return fmt.Errorf("transit: latitude of %s is %g, must be within ±π/2 radians", what, s.Latitude)
	case !(math.Abs(s.Longitude) <= 2*math.Pi):
		return fmt.Errorf("transit: longitude of %s is %g, must be within ±2π radians", what, s.Longitude)
	case !(s.Radius > 0 && s.Radius <= math.Pi/2):
		return fmt.Errorf("transit: radius of %s is %g, must be above 0, up to π/2 radians", what, s.Radius)
	case !(s.Contrast >= 0) || math.IsInf(s.Contrast, 1):
		return fmt.Errorf("transit: contrast of %s is %g, must be finite and not negative", what, s.Contrast)
	}
	return nil
}

// stain is a part of a spot that is seen: the integrals of the terms over it,
// divided by π, and their derivatives.
type stain struct {
	value, byX, byY, byR              [terms]float64 // by place and radius of a planet before it
	byLatitude, byLongitude, byRadius [terms]float64
}

// spotCap is a spot as a plane cuts it off the sphere: the points P with P·axis ≥ cos.
type spotCap struct {
	axis, north, west [3]float64 // right-handed: north × west = axis
	sin, cos          float64    // of the radius
	cosLatitude       float64
	half, toward      float64 // of the star's edge, the spot covers toward ± half
}

// newCap prepares a spot.
func newCap(s Spot) spotCap {
	sinB, cosB := math.Sincos(s.Latitude)
	sinL, cosL := math.Sincos(s.Longitude)
	c := spotCap{
		axis:        [3]float64{cosB * sinL, sinB, cosB * cosL},
		north:       [3]float64{-sinB * sinL, cosB, -sinB * cosL},
		west:        [3]float64{-cosL, 0, sinL},
		cosLatitude: cosB,
	}
	c.sin, c.cos = math.Sincos(s.Radius)
	across := math.Hypot(c.axis[0], c.axis[1])
	c.toward = math.Atan2(c.axis[1], c.axis[0])
	if c.cos < across {
		c.half = math.Acos(max(-1, c.cos/across))
	}
	return c
}

// edge returns the point of the spot's edge at an angle from north, and the
// derivative by the angle.
func (c *spotCap) edge(angle float64) (at, by [3]float64) {
	sin, cos := math.Sincos(angle)
	for k := range at {
		at[k] = c.cos*c.axis[k] + c.sin*(cos*c.north[k]+sin*c.west[k])
		by[k] = c.sin * (cos*c.west[k] - sin*c.north[k])
	}
	return at, by
}

// holds reports whether a point of the visible half of the sphere lies in the
// spot.
func (c *spotCap) holds(x, y float64) bool {
	mu := math.Sqrt(max(0, 1-x*x-y*y))
	return x*c.axis[0]+y*c.axis[1]+mu*c.axis[2] >= c.cos
}

// whole returns the integrals over all of the spot that is seen.
func (c *spotCap) whole(p *profile) stain {
	w := stainer{profile: p}
	cuts := append(c.limbCuts(), c.deepest())
	between(cuts, func(from, to float64) {
		if at, _ := c.edge((from + to) / 2); at[2] > 0 {
			w.edge(c, from, to)
		}
	})
	w.area += 2 * c.half
	return w.stain()
}

// covered returns the integrals over what a round planet of radius r at (x, y)
// covers of the spot, and whether that is anything.
func (c *spotCap) covered(p *profile, r, x, y float64) (stain, bool) {
	z, phi := math.Hypot(x, y), math.Atan2(y, x)
	// No point of the spot is farther than sin from cos × axis.
	if r == 0 || z >= 1+r || math.Hypot(x-c.cos*c.axis[0], y-c.cos*c.axis[1]) >= r+c.sin {
		return stain{}, false
	}
	w := stainer{profile: p}
	crossings := c.crossings(r, x, y)
	// The spot's edge behind the planet.
	cuts := append(append(c.limbCuts(), c.deepest()), crossings...)
	between(cuts, func(from, to float64) {
		at, _ := c.edge((from + to) / 2)
		if at[2] > 0 && math.Hypot(at[0]-x, at[1]-y) < r {
			w.edge(c, from, to)
		}
	})
	// The planet's edge before the spot.
	start := math.Pi - beyondEdge(r, z)
	cuts = append(cuts[:0], phi, phi+math.Pi, phi+start, phi-start)
	for _, t := range crossings {
		if at, _ := c.edge(t); at[2] > 0 {
			cuts = append(cuts, math.Atan2(at[1]-y, at[0]-x))
		}
	}
	between(cuts, func(from, to float64) {
		sin, cos := math.Sincos((from + to) / 2)
		px, py := x+r*cos, y+r*sin
		if px*px+py*py < 1 && c.holds(px, py) {
			w.planet(r, z, phi, x, y, from, to)
		}
	})
	// The star's edge within both.
	w.area += overlap(phi, behind(r, z), c.toward, c.half)
	return w.stain(), true
}

// beyondEdge returns half the angle of a planet's edge that lies within the star.
func beyondEdge(r, z float64) float64 {
	outer, inner, beyond := gaps(r, z)
	switch {
	case outer <= 0 || inner <= 0:
		return 0
	case beyond <= 0:
		return math.Pi
	}
	return math.Pi - 2*math.Atan2(math.Sqrt(beyond*(1+z+r)), math.Sqrt(outer*inner))
}

// deepest returns the angle along the spot's edge at which it is nearest to, or
// farthest behind, the star's edge.
func (c *spotCap) deepest() float64 {
	return math.Atan2(-c.west[2], -c.north[2])
}

// limbCuts returns the angles at which the spot's edge passes the star's.
func (c *spotCap) limbCuts() []float64 {
	if c.half == 0 || c.half == math.Pi {
		return nil
	}
	// P_z = level - swing cos(angle - deepest) = 0.
	swing := c.sin * math.Hypot(c.north[2], c.west[2])
	level := c.cos * c.axis[2]
	if !(math.Abs(level) < swing) {
		return nil
	}
	half := math.Acos(level / swing)
	return []float64{c.deepest() + half, c.deepest() - half}
}

// crossings returns the angles along the spot's edge, on either half of the
// sphere, at which it is at distance r from the line of sight through (x, y):
// zeros of a trigonometric polynomial of second degree, up to four. Where the two
// edges only touch, to within 1e-9, there may be none.
func (c *spotCap) crossings(r, x, y float64) []float64 {
	// Place of the edge relative to the line: d + sin (cos t · n + sin t · w).
	dx, dy := c.cos*c.axis[0]-x, c.cos*c.axis[1]-y
	nx, ny, wx, wy := c.sin*c.north[0], c.sin*c.north[1], c.sin*c.west[0], c.sin*c.west[1]
	constant := dx*dx + dy*dy - r*r + (nx*nx+ny*ny+wx*wx+wy*wy)/2
	c1, s1 := 2*(dx*nx+dy*ny), 2*(dx*wx+dy*wy)
	c2, s2 := (nx*nx+ny*ny-wx*wx-wy*wy)/2, nx*wx+ny*wy
	value := func(t float64) (f, slope float64) {
		sin, cos := math.Sincos(t)
		sin2, cos2 := 2*sin*cos, cos*cos-sin*sin
		return constant + c1*cos + s1*sin + c2*cos2 + s2*sin2, s1*cos - c1*sin + 2*(s2*cos2-c2*sin2)
	}
	bend := math.Hypot(c1, s1) + 4*math.Hypot(c2, s2) // most that the second derivative can be
	var out []float64
	var search func(a, b float64)
	search = func(a, b float64) {
		middle, half := (a+b)/2, (b-a)/2
		f, slope := value(middle)
		switch {
		case math.Abs(f) > math.Abs(slope)*half+bend*half*half/2 || half < 1e-9:
			return
		case math.Abs(slope) > bend*half: // monotonic
			low, _ := value(a)
			high, _ := value(b)
			if low < 0 == (high < 0) {
				return
			}
			for range 60 {
				middle = (a + b) / 2
				if f, _ := value(middle); f < 0 == (low < 0) {
					a = middle
				} else {
					b = middle
				}
			}
			out = append(out, (a+b)/2)
		default:
			search(a, middle)
			search(middle, b)
		}
	}
	const parts = 8
	for k := range parts {
		search(2*math.Pi*float64(k)/parts, 2*math.Pi*float64(k+1)/parts)
	}
	return out
}
