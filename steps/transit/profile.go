package transit

import (
	"fmt"
	"math"

	"rimlight/steps/limb"
)

// terms is how many functions of μ the laws of package limb are made of: 1, μ and
// μ², whose integrals are closed, and two more, whose integrals are quadratures.
const terms = 5

// shape says which two functions the last two terms are.
type shape int

const (
	none  shape = iota
	roots       // √μ and μ √μ
	logs        // μ ln μ, and nothing
	power       // μ^α and its derivative by α
)

// profile is a limb-darkening law as a sum of terms, I = Σ weights × terms, for
// integration over what is covered.
type profile struct {
	shape   shape
	alpha   float64 // exponent of the power-2 law
	count   int     // coefficients
	weights [terms]float64
	slopes  [limb.Most][terms]float64 // derivatives of I by the coefficients
	inverse float64                   // 1 / mean intensity of the disc
	norm    [limb.Most]float64        // derivatives of the mean intensity by the coefficients
	nodes   *nodes                    // for the last two terms
}

// newProfile prepares a valid law, with quadratures to a tolerance; 0 means
// [DefaultTolerance].
func newProfile(law limb.Law, tolerance float64) (profile, error) {
	if err := law.Validate(); err != nil {
		return profile{}, fmt.Errorf("transit: %w", err)
	}
	p := profile{count: len(law.Coefficients)}
	var err error
	if p.nodes, err = nodesFor(tolerance); err != nil {
		return profile{}, err
	}
	var mean float64
	mean, p.norm = law.NormGradient()
	p.inverse = 1 / mean
	u := law.Coefficients
	switch law.Name {
	case limb.Linear:
		p.slopes = [limb.Most][terms]float64{{-1, 1}}
	case limb.Quadratic:
		p.slopes = [limb.Most][terms]float64{{-1, 1}, {-1, 2, -1}}
	case limb.SquareRoot:
		p.shape = roots
		p.slopes = [limb.Most][terms]float64{{-1, 1}, {-1, 0, 0, 1}}
	case limb.Logarithmic:
		p.shape = logs
		p.slopes = [limb.Most][terms]float64{{-1, 1}, {0, 0, 0, -1}}
	case limb.Power2:
		p.shape, p.alpha = power, u[1]
		p.slopes = [limb.Most][terms]float64{{-1, 0, 0, 1}, {0, 0, 0, 0, u[0]}}
		p.weights = [terms]float64{1 - u[0], 0, 0, u[0]}
		return p, nil
	case limb.ThreeParameter:
		p.shape = roots
		p.slopes = [limb.Most][terms]float64{{-1, 1}, {-1, 0, 0, 0, 1}, {-1, 0, 1}}
	case limb.FourParameter:
		p.shape = roots
		p.slopes = [limb.Most][terms]float64{{-1, 0, 0, 1}, {-1, 1}, {-1, 0, 0, 0, 1}, {-1, 0, 1}}
	}
	p.weights[0] = 1
	if p.shape == none {
		p.nodes = finest() // which only outlines other than circles use
	}
	for i, u := range u {
		for k, slope := range p.slopes[i] {
			p.weights[k] += u * slope
		}
	}
	return p, nil
}

// weigh returns the sum of terms, divided by the mean intensity.
func (p *profile) weigh(d *[terms]float64) float64 {
	sum := p.weights[0]*d[0] + p.weights[1]*d[1] + p.weights[2]*d[2]
	if p.shape != none {
		sum += p.weights[3]*d[3] + p.weights[4]*d[4]
	}
	return sum * p.inverse
}

// byCoefficient returns the derivative of the deficit by coefficient i.
func (p *profile) byCoefficient(i int, d *[terms]float64, deficit float64) float64 {
	s := &p.slopes[i]
	sum := s[0]*d[0] + s[1]*d[1] + s[2]*d[2]
	if p.shape != none {
		sum += s[3]*d[3] + s[4]*d[4]
	}
	return p.inverse * (sum - deficit*p.norm[i])
}

// moments returns ∫ term μ dμ from 0 to 1 for the last two terms: a 2π-th of
// their integrals over the disc.
func (p *profile) moments() (a, b float64) {
	switch p.shape {
	case roots:
		return 2. / 5, 2. / 7
	case logs:
		return -1. / 9, 0
	case power:
		c := 1 / (p.alpha + 2)
		return c, -c * c
	}
	return 0, 0
}

// values returns the last two terms at μ² > 0, and for each, with moment M and
// ρ² = 1-μ², the remainder
//
//	h = (∫ term m dm from μ to 1) / ρ² - M,
//
// which vanishes at the limb and is smooth at the centre of the disc.
func (p *profile) values(mu2 float64) (a, b, ha, hb float64) {
	if mu2 == 0 { // underflow
		return 0, 0, 0, 0
	}
	mu := math.Sqrt(mu2)
	switch p.shape {
	case roots:
		t := math.Sqrt(mu)
		rest := mu2 / ((1 + t) * (1 + mu))
		return t, mu * t, 2. / 5 * rest, 2. / 7 * rest * (1 + t + mu)
	case logs:
		edge := 1 - mu
		log, ratio := -edge, -1.0 // ratio = ln μ / (1-μ)
		if mu < 0.5 {
			log = math.Log(mu)
			ratio = log / edge
		} else if edge != 0 {
			log = math.Log1p(-edge)
			ratio = log / edge
		}
		return mu * log, 0, -mu2 / (9 * (1 + mu)) * (1 + 3*mu*ratio), 0
	case power:
		log := 0.5 * min(0, math.Log(mu2)) // rounding may pass the centre
		less := math.Expm1(p.alpha * log)  // μ^α - 1
		whole, byLog := 0.5*p.alpha, -0.5  // (1-μ^α)/(1-μ²), ln μ/(1-μ²)
		if log != 0 {
			rho2 := -math.Expm1(2 * log)
			whole, byLog = -less/rho2, log/rho2
		}
		c := 1 / (p.alpha + 2)
		a = 1 + less
		ha = c * mu2 * whole
		return a, a * log, ha, -c * (ha + mu2*a*byLog)
	}
	return 0, 0, 0, 0
}
