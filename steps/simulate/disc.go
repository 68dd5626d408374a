package simulate

import "math"

// nodes is the number of rings that each part of the disc is cut into.
const nodes = 48

// A rule is a Gauss-Legendre quadrature on [0, pi]: abscissae and weights.
type rule struct {
	cos, sin, weight []float64 // cosine and sine of the abscissae
}

// newRule computes the n-point rule by Newton's iteration on the Legendre
// polynomial.
func newRule(n int) rule {
	var r rule
	for i := range n {
		x := math.Cos(math.Pi * (float64(i) + 0.75) / (float64(n) + 0.5))
		var dp float64
		for range 100 {
			p0, p1 := 1.0, x
			for k := 2; k <= n; k++ {
				p0, p1 = p1, (float64(2*k-1)*x*p1-float64(k-1)*p0)/float64(k)
			}
			dp = float64(n) * (x*p1 - p0) / (x*x - 1)
			step := p1 / dp
			x -= step
			if math.Abs(step) < 1e-15 {
				break
			}
		}
		phi := math.Pi / 2 * (1 + x)
		r.cos = append(r.cos, math.Cos(phi))
		r.sin = append(r.sin, math.Sin(phi))
		r.weight = append(r.weight, math.Pi/2*2/((1-x*x)*dp*dp))
	}
	return r
}

// blocked is the flux that a dark disc of radius r at the distance z from the
// centre of a star of radius 1 takes away, relative to the flux of the whole
// star, whose intensity is 1 - u1 (1-mu) - u2 (1-mu)^2.
//
// The star is cut into rings; of the ring of radius s the planet covers the
// angle 2 acos((s^2+z^2-r^2)/(2 s z)). The substitution s = a + (b-a)(1-cos
// phi)/2 takes away the square roots at the ends of the range, so that the
// quadrature converges fast: with 48 nodes the error is below 1e-9, but for
// discs that touch the limb from inside to within 1e-4, where it is below 1e-7.
func (q rule) blocked(r, z, u1, u2 float64) float64 {
	if r <= 0 || z >= 1+r {
		return 0
	}
	sum := 0.0
	if r > z { // rings that are covered as a whole
		sum += q.rings(0, math.Min(1, r-z), u1, u2, func(float64) float64 { return math.Pi })
	}
	if lo, hi := math.Abs(z-r), math.Min(1, z+r); hi > lo && z > 0 {
		sum += q.rings(lo, hi, u1, u2, func(s float64) float64 {
			return math.Acos(math.Max(-1, math.Min(1, (s*s+z*z-r*r)/(2*s*z))))
		})
	}
	return sum / (math.Pi * (1 - u1/3 - u2/6))
}

// rings integrates intensity times 2 s times the covered half angle over the
// radii a to b.
func (q rule) rings(a, b, u1, u2 float64, half func(s float64) float64) float64 {
	sum := 0.0
	for i, c := range q.cos {
		s := a + (b-a)*(1-c)/2
		dark := 1 - math.Sqrt(math.Max(0, (1-s)*(1+s)))
		sum += q.weight[i] * (b - a) / 2 * q.sin[i] * 2 * s * (1 - dark*(u1+dark*u2)) * half(s)
	}
	return sum
}

// separation is the distance of planet and star on the sky at time t, in
// stellar radii; infinite when the planet is on the far side. Kepler's equation
// is solved by bisection, slowly and surely.
func (s Scenario) separation(t float64) float64 {
	w, e := s.Periastron*math.Pi/180, s.Eccentricity
	anomaly := func(f float64) float64 { // mean anomaly at true anomaly f
		ecc := 2 * math.Atan2(math.Sqrt(1-e)*math.Sin(f/2), math.Sqrt(1+e)*math.Cos(f/2))
		return ecc - e*math.Sin(ecc)
	}
	mean := anomaly(math.Pi/2-w) + 2*math.Pi*(t-s.MidTransit)/s.Period
	mean = math.Remainder(mean, 2*math.Pi)
	lo, hi := -math.Pi, math.Pi
	for range 60 {
		mid := (lo + hi) / 2
		if mid-e*math.Sin(mid) < mean {
			lo = mid
		} else {
			hi = mid
		}
	}
	ecc := (lo + hi) / 2
	x, y := math.Cos(ecc)-e, math.Sqrt(1-e*e)*math.Sin(ecc) // in the plane of the orbit, from the star
	along, across := x*math.Cos(w)-y*math.Sin(w), x*math.Sin(w)+y*math.Cos(w)
	if across < 0 {
		return math.Inf(1)
	}
	return s.AxisRatio * math.Hypot(along, across*math.Cos(s.Inclination*math.Pi/180))
}
