package orbit

import "math"

// A Window is the part of a revolution in which a planet can be in transit, as
// offsets from inferior conjunction in days: From < 0 < To. Outside it, planet
// and star do not overlap or the planet is behind the star.
type Window struct{ From, To float64 }

// Window bounds the transit of a planet of a radius ratio, generously. The
// separation is at least d |cos(w+f)|, d the distance from the star, which
// bounds the true anomaly and so the time.
func (k *Track) Window(radiusRatio float64) Window {
	e := k.orbit.Eccentricity
	reach := (1 + radiusRatio) / k.orbit.AxisRatio
	half := math.Pi / 2 // of the range of true anomaly about conjunction
	conj := math.Atan2(k.cosW, k.sinW)
	for range 4 { // each round bounds the distance over the range of the one before
		// The planet is closest to the star where the range comes closest to
		// periastron.
		away := max(0, math.Abs(conj)-half)
		nearest := k.minor * k.minor / (1 + e*math.Cos(away))
		if s := reach / nearest; s < 1 {
			half = min(half, math.Asin(s))
		}
	}
	half = min(half*(1+1e-9)+1e-9, math.Pi/2) // rounding
	days := func(f float64) float64 {
		sin, cos := math.Sincos(conj + f)
		m := k.meanAnomaly(sin, cos) - k.conj
		if f > 0 && m < 0 {
			m += 2 * math.Pi
		} else if f < 0 && m > 0 {
			m -= 2 * math.Pi
		}
		return m * k.orbit.Period / (2 * math.Pi)
	}
	return Window{From: days(-half), To: days(half)}
}

// windowSteps is the number of intervals in which the window is searched for
// the smallest separation and the contacts. Within one, the separation is taken
// to be monotonic on either side of its minimum.
const windowSteps = 64

// Contacts returns the offsets from inferior conjunction, in days, of first to
// fourth contact of a planet of a radius ratio, and of the smallest separation
// between them. Second and third contact are NaN when the planet never stands
// wholly within the star's disc (or covers it wholly), and all are NaN when
// there is no transit. They are roots of the separation, exact to rounding
// where the discs do not merely graze. On an orbit so close that the planet
// overlaps with the star when it passes behind its plane, the transit ends
// there.
func (k *Track) Contacts(radiusRatio float64) (contact [4]float64, closest float64) {
	nan := math.NaN()
	contact, closest = [4]float64{nan, nan, nan, nan}, nan
	if !(radiusRatio >= 0) || math.IsInf(radiusRatio, 0) {
		return contact, nan
	}
	w := k.Window(radiusRatio)
	if !(w.To > w.From) {
		return contact, nan
	}
	lowest, ok := k.closest(w)
	if !ok {
		return contact, nan
	}
	outer, inner := 1+radiusRatio, math.Abs(1-radiusRatio)
	z, _ := k.SeparationAt(lowest)
	if !(z < outer) {
		return contact, nan
	}
	contact[0], contact[3] = k.cross(lowest, w.From, outer), k.cross(lowest, w.To, outer)
	if z <= inner {
		contact[1], contact[2] = k.cross(lowest, contact[0], inner), k.cross(lowest, contact[3], inner)
	}
	return contact, lowest
}

// slope is proportional to the rate of change of the squared separation.
func (k *Track) slope(offset float64) float64 {
	z, _, grad := k.SeparationGradientAt(offset, offset)
	return -z * grad[1]
}

// closest finds the smallest separation, going downhill from conjunction.
func (k *Track) closest(w Window) (offset float64, ok bool) {
	from := 0.0
	here := k.slope(from)
	if here == 0 {
		return 0, true
	}
	step := w.To / windowSteps
	if here > 0 {
		step = w.From / windowSteps
	}
	// Growing steps: the minimum is mostly very near conjunction.
	for i := range 3 * windowSteps {
		size := step * min(1, math.Exp2(float64(i-40)))
		to := from + size
		if to < w.From || to > w.To {
			return 0, false
		}
		if next := k.slope(to); next == 0 || (next > 0) != (here > 0) {
			return root(k.slope, from, to), true
		}
		from = to
	}
	return 0, false
}

// cross finds where the separation rises to a level between an offset at which
// it is lower and an end; the end itself if it does not.
func (k *Track) cross(from, end, level float64) float64 {
	excess := func(offset float64) float64 {
		z, _ := k.SeparationAt(offset)
		return (z - level) * (z + level)
	}
	step := (end - from) / windowSteps
	at := from
	for i := range windowSteps {
		to := from + step*float64(i+1)
		if i == windowSteps-1 {
			to = end
		}
		if excess(to) > 0 {
			if excess(at) >= 0 {
				return at
			}
			return root(excess, at, to)
		}
		at = to
	}
	return end
}

// root finds a root of f between a and b, where f has different signs, by
// regula falsi in the Illinois form, with a bisection in every third step so
// that it ends.
func root(f func(float64) float64, a, b float64) float64 {
	fa, fb := f(a), f(b)
	for i := range 200 {
		if fa == 0 {
			return a
		}
		if fb == 0 || math.Abs(b-a) <= 2.3e-16*max(math.Abs(a), math.Abs(b)) {
			return b
		}
		c := b - fb*(b-a)/(fb-fa)
		if i%3 == 2 || !(c > min(a, b) && c < max(a, b)) {
			c = a + (b-a)/2
			if c == a || c == b {
				return b
			}
		}
		fc := f(c)
		if (fc > 0) != (fb > 0) {
			a, fa = b, fb
		} else {
			fa /= 2
		}
		b, fb = c, fc
	}
	return b
}

// Duration is the time from first to fourth and from second to third contact of
// the transit of a planet of a radius ratio, in days; zero where there are no
// such contacts. The contacts are found as roots, so that the durations are
// exact also on eccentric orbits.
func (o Orbit) Duration(radiusRatio float64) (t14, t23 float64) {
	k := o.Track()
	c, _ := k.Contacts(radiusRatio)
	if t := c[3] - c[0]; t > 0 {
		t14 = t
	}
	if t := c[2] - c[1]; t > 0 {
		t23 = t
	}
	return t14, t23
}
