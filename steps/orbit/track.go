package orbit

import "math"

// A Track is an orbit prepared for evaluation at many times: what does not
// depend on the time is computed once. Make one with [Orbit.Track].
type Track struct {
	orbit      Orbit
	cosI, sinI float64 // of the inclination
	cosW, sinW float64 // of the argument of periastron
	minor      float64 // sqrt(1-e^2)
	conj       float64 // mean anomaly at inferior conjunction
	conjE      float64 // its derivative in the eccentricity
	conjW      float64 // its derivative in the argument of periastron
}

// Track prepares the orbit for evaluation at many times. The separations of an
// orbit that [Orbit.Validate] refuses are NaN.
func (o Orbit) Track() Track {
	if o.Validate() != nil {
		o.AxisRatio, o.Eccentricity, o.Periastron, o.Inclination = math.NaN(), 0, 0, math.Pi/2
	}
	k := Track{orbit: o}
	e := o.Eccentricity
	k.sinI, k.cosI = math.Sincos(o.Inclination)
	k.sinW, k.cosW = math.Sincos(o.Periastron)
	k.minor = math.Sqrt((1 - e) * (1 + e))
	// The true anomaly at conjunction is 90 deg - w.
	k.conj = k.meanAnomaly(k.cosW, k.sinW)
	q := 1 + e*k.sinW
	k.conjE = -k.cosW * (1 + q) * k.minor / (q * q)
	k.conjW = -k.minor * k.minor * k.minor / (q * q)
	return k
}

// meanAnomaly is the mean anomaly, within [-pi, pi], at the true anomaly with
// the given sine and cosine.
func (k *Track) meanAnomaly(sinF, cosF float64) float64 {
	e := k.orbit.Eccentricity
	q := 1 + e*cosF
	sinE := k.minor * sinF / q
	return math.Atan2(sinE, (e+cosF)/q) - e*sinE
}

// Separation is that of [Orbit.Separation].
func (k *Track) Separation(t float64) (z float64, front bool) {
	return k.SeparationAt(k.Offset(t))
}

// Offset is the time in days from the nearest inferior conjunction to t.
func (k *Track) Offset(t float64) float64 {
	d := t - k.orbit.MidTransit
	return d - k.orbit.Period*math.RoundToEven(d/k.orbit.Period)
}

// SeparationAt is the separation at an offset from inferior conjunction, in
// days.
func (k *Track) SeparationAt(offset float64) (z float64, front bool) {
	along, across, distance := k.position(offset)
	y := across * k.cosI
	return distance * math.Sqrt(along*along+y*y), across*k.sinI > 0
}

// position gives, at an offset from inferior conjunction, the cosine and sine
// of w+f and the distance from the star in stellar radii.
func (k *Track) position(offset float64) (along, across, distance float64) {
	phase := 2 * math.Pi * offset / k.orbit.Period
	if k.orbit.Eccentricity == 0 {
		sin, cos := math.Sincos(phase)
		return -sin, cos, k.orbit.AxisRatio
	}
	sinF, cosF, d := k.anomaly(phase)
	return k.cosW*cosF - k.sinW*sinF, k.sinW*cosF + k.cosW*sinF, k.orbit.AxisRatio * d
}

// anomaly gives the sine and cosine of the true anomaly and the distance from
// the star in semi-major axes, a phase after conjunction.
func (k *Track) anomaly(phase float64) (sinF, cosF, distance float64) {
	e := k.orbit.Eccentricity
	m := k.conj + phase
	m -= 2 * math.Pi * math.RoundToEven(m/(2*math.Pi))
	_, sinE, cosE := kepler(m, e)
	d := 1 - e*cosE
	return k.minor * sinE / d, (cosE - e) / d, d
}

// SeparationGradient is that of [Orbit.SeparationGradient].
func (k *Track) SeparationGradient(t float64) (z float64, front bool, grad [6]float64) {
	return k.SeparationGradientAt(k.Offset(t), t-k.orbit.MidTransit)
}

// SeparationGradientAt is the separation and its derivatives at an offset from
// an inferior conjunction, in days. Elapsed is the time since MidTransit, which
// is the offset plus a whole number of periods.
func (k *Track) SeparationGradientAt(offset, elapsed float64) (z float64, front bool, grad [6]float64) {
	a, e, period := k.orbit.AxisRatio, k.orbit.Eccentricity, k.orbit.Period
	phase := 2 * math.Pi * offset / period
	var along, across, d float64 // cosine and sine of w+f, distance in semi-major axes
	var thetaM, thetaE, thetaW, dM, dE, dW float64
	if e == 0 {
		sin, cos := math.Sincos(phase)
		along, across, d = -sin, cos, 1
		// The derivatives below, at e = 0; f is the mean anomaly.
		sinF, cosF := along*-k.sinW+across*k.cosW, along*k.cosW+across*k.sinW
		thetaM = 1
		thetaE = 2*sinF + k.conjE
		dE = -cosF
	} else {
		sinF, cosF, distance := k.anomaly(phase)
		d = distance
		along, across = k.cosW*cosF-k.sinW*sinF, k.sinW*cosF+k.cosW*sinF
		// Derivatives of f and d in the mean anomaly, and in e at a given mean
		// anomaly; w shifts the mean anomaly through that at conjunction.
		thetaM = k.minor / (d * d)
		dM = e * sinF / k.minor
		thetaE = sinF*(2+e*cosF)/(k.minor*k.minor) + thetaM*k.conjE
		dE = -cosF + dM*k.conjE
		thetaW = 1 + thetaM*k.conjW
		dW = dM * k.conjW
	}
	y := across * k.cosI
	q := math.Sqrt(along*along + y*y)
	z, front = a*d*q, across*k.sinI > 0
	if q == 0 {
		return z, front, grad
	}
	theta := -a * d * along * across * k.sinI * k.sinI / q // dz/d(w+f)
	rate := (theta*thetaM + a*q*dM) * 2 * math.Pi / period // dz/dt
	grad[0] = -rate * elapsed / period
	grad[1] = -rate
	grad[2] = d * q
	grad[3] = -a * d * across * y * k.sinI / q
	grad[4] = theta*thetaE + a*q*dE
	grad[5] = theta*thetaW + a*q*dW
	return z, front, grad
}
