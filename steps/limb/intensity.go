package limb

import "math"

// Intensity returns the intensity at mu in [0, 1], relative to the centre of
// the disc. It is NaN for other mu, and for a law that is not valid in name or
// number of coefficients.
func (l Law) Intensity(mu float64) float64 {
	i, _ := l.Gradient(mu)
	return i
}

// Gradient returns the intensity at mu, as [Law.Intensity] does, and its
// derivatives by the coefficients, followed by zeros. At mu = 0 the derivative
// by the exponent of the power-2 law is its limit, 0.
func (l Law) Gradient(mu float64) (intensity float64, grad [Most]float64) {
	if !l.known() || !(mu >= 0 && mu <= 1) {
		nan := math.NaN()
		return nan, [Most]float64{nan, nan, nan, nan}
	}
	if l.Name == Power2 {
		c, alpha := l.Coefficients[0], l.Coefficients[1]
		if mu == 0 {
			return 1 - c, [Most]float64{-1}
		}
		log := math.Log(mu)
		less := math.Expm1(alpha * log) // mu^α - 1
		return 1 + c*less, [Most]float64{less, c * (1 + less) * log}
	}
	terms := l.terms(mu)
	intensity = 1
	for i, u := range l.Coefficients {
		intensity -= u * terms[i]
		grad[i] = -terms[i]
	}
	return intensity, grad
}

// terms returns what the coefficients of a law that is linear in them multiply
// in 1 - I(mu).
func (l Law) terms(mu float64) [Most]float64 {
	edge := 1 - mu
	root := math.Sqrt(mu)
	rootEdge := edge / (1 + root) // 1 - √mu without cancellation
	switch l.Name {
	case Linear:
		return [Most]float64{edge}
	case Quadratic:
		return [Most]float64{edge, edge * edge}
	case SquareRoot:
		return [Most]float64{edge, rootEdge}
	case Logarithmic:
		if mu == 0 {
			return [Most]float64{edge, 0}
		}
		return [Most]float64{edge, mu * math.Log(mu)}
	case ThreeParameter:
		return [Most]float64{edge, rootEdge * (1 + root + mu), edge * (1 + mu)}
	case FourParameter:
		return [Most]float64{rootEdge, edge, rootEdge * (1 + root + mu), edge * (1 + mu)}
	}
	return [Most]float64{}
}

// Norm returns the flux norm: the mean intensity of the disc relative to the
// centre. It is NaN for a law that is not valid in name or number of
// coefficients, and for an exponent of the power-2 law of -2 or less.
func (l Law) Norm() float64 {
	norm, _ := l.NormGradient()
	return norm
}

// NormGradient returns the flux norm, as [Law.Norm] does, and its derivatives
// by the coefficients, followed by zeros.
func (l Law) NormGradient() (norm float64, grad [Most]float64) {
	if !l.known() || l.Name == Power2 && !(l.Coefficients[1] > -2) {
		nan := math.NaN()
		return nan, [Most]float64{nan, nan, nan, nan}
	}
	switch l.Name {
	case Linear:
		grad = [Most]float64{-1. / 3}
	case Quadratic:
		grad = [Most]float64{-1. / 3, -1. / 6}
	case SquareRoot:
		grad = [Most]float64{-1. / 3, -1. / 5}
	case Logarithmic:
		grad = [Most]float64{-1. / 3, 2. / 9}
	case Power2:
		c, alpha := l.Coefficients[0], l.Coefficients[1]
		share := alpha / (2 + alpha)
		return 1 - c*share, [Most]float64{-share, -2 * c / ((2 + alpha) * (2 + alpha))}
	case ThreeParameter:
		grad = [Most]float64{-1. / 3, -3. / 7, -1. / 2}
	case FourParameter:
		grad = [Most]float64{-1. / 5, -1. / 3, -3. / 7, -1. / 2}
	}
	norm = 1
	for i, u := range l.Coefficients {
		norm += u * grad[i]
	}
	return norm, grad
}
