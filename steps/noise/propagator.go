package noise

import "math"

// A propagator carries the state of a process of unit variance over an interval.
// The state is the process and its derivative, the latter in units of its own
// standard deviation, so that the stationary covariance is the unit matrix, and
// the kernel is the first element of the transition matrix. A process without
// derivative, the exponential one, has a second component that is always 0.
type propagator struct {
	phi    [4]float64 // transition matrix, rows first
	spread [3]float64 // covariance that the interval adds: 1 - phi phiᵀ, elements 00, 01 and 11
	bend   float64    // of an oscillator, see byDamping
}

// A timescale is what a propagator depends on beside the interval. For an
// oscillator rate is the undamped angular frequency ω₀, and damping 1/2Q. Without
// damping it is the exponential process, and rate its inverse time scale.
type timescale struct {
	rate, damping float64
}

// small is the phase below which what an oscillator adds is summed as a series:
// the closed form cancels to the third order.
const small = 1. / 16

// propagate fills p for an interval of the length τ ≥ 0.
func (s timescale) propagate(p *propagator, τ float64) {
	x := s.rate * τ
	if s.damping == 0 {
		e := math.Exp(-x)
		*p = propagator{phi: [4]float64{e}, spread: [3]float64{-math.Expm1(-2 * x)}}
		return
	}
	ζ := s.damping
	c, sn, bend := damped(x, ζ)
	p.phi = [4]float64{c + ζ*sn, sn, -sn, c - ζ*sn}
	p.bend = bend
	lost := -math.Expm1(-2 * ζ * x)
	p.spread[0] = lost - 2*ζ*sn*(c+ζ*sn)
	p.spread[1] = 2 * ζ * sn * sn
	p.spread[2] = lost + 2*ζ*sn*(c-ζ*sn)
	if x < small && ζ*x < small/4 {
		p.spread[0] = slowSpread(x, ζ)
	}
}

// damped returns exp(-ζx) cos ηx, exp(-ζx) sin(ηx)/η and exp(-ζx) x³ T, where η² =
// 1 - ζ² may be negative, and T is the derivative of sin(√z)/√z at z = η²x².
func damped(x, ζ float64) (c, s, bend float64) {
	y := (1 - ζ) * (1 + ζ)
	z := y * x * x
	if math.Abs(z) < 0.3 {
		// Series of cos √z, sin √z/√z and the latter's derivative, to z⁶/14!.
		e := math.Exp(-ζ * x)
		cosine := 1 - z/2*(1-z/12*(1-z/30*(1-z/56*(1-z/90*(1-z/132*(1-z/182))))))
		sine := 1 - z/6*(1-z/20*(1-z/42*(1-z/72*(1-z/110*(1-z/156*(1-z/210))))))
		slope := -1. / 6 * (1 - z/10*(1-z/28*(1-z/54*(1-z/88*(1-z/130*(1-z/180))))))
		return e * cosine, e * x * sine, e * x * x * x * slope
	}
	if y > 0 {
		η := math.Sqrt(y)
		e := math.Exp(-ζ * x)
		sin, cos := math.Sincos(η * x)
		c, s = e*cos, e*sin/η
	} else {
		κ := math.Sqrt(-y)
		slow, fast := math.Exp(-x/(ζ+κ)), math.Exp(-(ζ+κ)*x)
		c, s = (slow+fast)/2, (slow-fast)/(2*κ)
	}
	if c == 0 && s == 0 {
		return 0, 0, 0 // x may be infinite
	}
	return c, s, (x*c - s) / (2 * y)
}

// slowSpread is the variance that an oscillator gains within a short phase x, 4ζ
// times the integral of the squared response to a kick, as a series.
func slowSpread(x, ζ float64) float64 {
	const order = 8
	var y [order + 1]float64 // of the response, in powers of the phase times x
	y[1] = x
	for k := 0; k+2 <= order; k++ {
		y[k+2] = -x * (2*ζ*float64(k+1)*y[k+1] + x*y[k]) / float64((k+1)*(k+2))
	}
	sum := 0.0
	for power := order + 1; power >= 2; power-- {
		square := 0.0
		for i := max(1, power-order); i <= min(order, power-1); i++ {
			square += y[i] * y[power-i]
		}
		sum += square / float64(power+1)
	}
	return 4 * ζ * x * sum
}

// byRate is the derivative of phi by the logarithm of the rate, x its own by the
// phase; x = rate τ.
func (p *propagator) byRate(s timescale, x float64) [4]float64 {
	if s.damping == 0 {
		return [4]float64{-x * p.phi[0]}
	}
	ζ := 2 * s.damping
	return [4]float64{
		x * p.phi[2], x * p.phi[3],
		-x * (p.phi[0] + ζ*p.phi[2]), -x * (p.phi[1] + ζ*p.phi[3]),
	}
}

// byDamping is the derivative of phi by the logarithm of the damping.
func (p *propagator) byDamping(s timescale, x float64) [4]float64 {
	ζ := s.damping
	sn := p.phi[1]
	c := p.phi[0] - ζ*sn
	byC, byS := ζ*(-x*c+ζ*x*sn), ζ*(-x*sn-2*ζ*p.bend)
	mixed := ζ*sn + ζ*byS // of ζ sn
	return [4]float64{byC + mixed, byS, -byS, byC - mixed}
}
