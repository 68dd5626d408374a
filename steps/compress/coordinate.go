package compress

import (
	"math"

	"gonum.org/v1/gonum/mathext"

	"rimlight/steps/limb"
)

// A Kind is that of a prior.
type Kind int

// Kinds of prior.
const (
	Fixed           Kind = iota // at A
	Uniform                     // between A and B
	LogUniform                  // in the logarithm, between A and B
	Normal                      // of mean A and standard deviation B
	TruncatedNormal             // the same between Lo and Hi
)

// A Prior is what is known of a parameter.
type Prior struct {
	Kind         Kind
	A, B, Lo, Hi float64
}

// limits is the range of the parameter.
func (p *Prior) limits() (lo, hi float64) {
	switch p.Kind {
	case Fixed:
		return p.A, p.A
	case Uniform, LogUniform:
		return p.A, p.B
	case TruncatedNormal:
		return p.Lo, p.Hi
	}
	return math.Inf(-1), math.Inf(1)
}

// farthest is how many standard deviations of a truncated normal prior count.
const farthest = 9

// value gives the parameter at coordinate z, with its derivative. The prior's density
// in z is that of the standard normal distribution times exp(extra), of which slope and
// bend are the first and, negative, the second derivative; extra is 0 but for truncated
// normal priors. Derivatives mean nothing unless slopes are asked for.
func (p *Prior) value(z float64, slopes bool) (x, by, extra, slope, bend float64) {
	switch p.Kind {
	case Normal:
		return p.A + p.B*z, p.B, 0, 0, 0
	case Uniform:
		x, by = between(z, p.A, p.B, slopes)
	case LogUniform:
		x, by = between(z, math.Log(p.A), math.Log(p.B), slopes)
		x = math.Exp(x)
		by *= x
	case TruncatedNormal:
		lo, hi := p.window()
		x, by = between(z, lo, hi, slopes)
		d := (x - p.A) / p.B
		return x, by, -d * d / 2, -d / p.B * by, by * by / (p.B * p.B)
	default:
		return p.A, 0, 0, 0, 0
	}
	return x, by, 0, 0, 0
}

// coordinate is z at a value of the parameter, which is moved inside the range.
func (p *Prior) coordinate(x float64) float64 {
	switch p.Kind {
	case Normal:
		return (x - p.A) / p.B
	case Uniform:
		return probit(x, p.A, p.B)
	case LogUniform:
		return probit(math.Log(math.Max(x, p.A)), math.Log(p.A), math.Log(p.B))
	case TruncatedNormal:
		lo, hi := p.window()
		return probit(x, lo, hi)
	}
	return 0
}

// window is the range of a truncated normal prior that has any density.
func (p *Prior) window() (lo, hi float64) {
	nearest := math.Min(math.Max(p.A, p.Lo), p.Hi)
	return math.Max(p.Lo, nearest-farthest*p.B), math.Min(p.Hi, nearest+farthest*p.B)
}

// logDensity is the logarithm of the density at x, up to a constant.
func (p *Prior) logDensity(x float64) float64 {
	switch p.Kind {
	case LogUniform:
		return -math.Log(x)
	case Normal, TruncatedNormal:
		d := (x - p.A) / p.B
		return -d * d / 2
	}
	return 0
}

// between maps z to lo + (hi-lo) Φ(z), and gives its derivative if slopes are asked for.
func between(z, lo, hi float64, slopes bool) (x, by float64) {
	width := hi - lo
	share := 0.5 * math.Erfc(math.Abs(z)/math.Sqrt2) // from the nearer end
	x = lo + width*share
	if z > 0 {
		x = hi - width*share
	}
	if !slopes {
		return x, 0
	}
	return x, width * math.Exp(-z*z/2) * (1 / (math.Sqrt2 * 1.77245385090551602729816748334))
}

// probit is the inverse of between, for x moved off the ends.
func probit(x, lo, hi float64) float64 {
	const margin = 1e-12
	share := (x - lo) / (hi - lo)
	return mathext.NormalQuantile(math.Min(1-margin, math.Max(margin, share)))
}

// Parameters are those of a light curve that enter nonlinearly, but for the settling
// time.
type Parameters struct {
	Radius Prior
	Limb   [2]Prior // of the law's coefficients, or of q1 and q2
	Square bool     // the latter, see limb.FromSquare
}

// place is a point in the space of free coordinates.
type place struct {
	r     float64
	u     [2]float64
	byZ   [3]float64    // derivatives of the parameters in their coordinates
	mix   [2][2]float64 // derivatives of u in the parameters of limb darkening
	extra float64       // logarithm of the prior's density, less that of a standard normal one
	slope [3]float64
	bend  [3]float64
}

// free lists which of radius ratio (0) and limb-darkening parameters (1, 2) are free.
func (p *Parameters) free() []int {
	var out []int
	for k := range 3 {
		if p.prior(k).Kind != Fixed {
			out = append(out, k)
		}
	}
	return out
}

func (p *Parameters) prior(k int) *Prior {
	if k == 0 {
		return &p.Radius
	}
	return &p.Limb[k-1]
}

// at sets the place for free coordinates z, its derivatives if slopes are asked for.
func (p *Parameters) at(law string, free []int, z []float64, slopes bool, out *place) {
	x := [3]float64{p.Radius.A, p.Limb[0].A, p.Limb[1].A}
	out.extra = 0
	for i, k := range free {
		var extra float64
		x[k], out.byZ[k], extra, out.slope[k], out.bend[k] = p.prior(k).value(z[i], slopes)
		out.extra += extra
	}
	out.r = x[0]
	if !p.Square {
		out.u = [2]float64{x[1], x[2]}
		out.mix = [2][2]float64{{1, 0}, {0, 1}}
		return
	}
	root := math.Sqrt(x[1])
	u1, u2, grad, _ := limb.FromRoot(law, root, x[2])
	half := 0.5 / math.Max(root, 1e-8)
	out.u = [2]float64{u1, u2}
	out.mix = [2][2]float64{{grad[0] * half, grad[1]}, {grad[2] * half, grad[3]}}
}
