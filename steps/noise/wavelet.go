package noise

import (
	"fmt"
	"math"
	"math/bits"
)

// A Wavelet is the likelihood of Carter & Winn (2009): white noise and noise with a
// power spectrum of 1/f, in a wavelet basis, where both are taken to be
// uncorrelated. Residuals are evenly spaced and N = n₀ 2^M in number, n₀ odd. After a
// transform by Daubechies' wavelet of four coefficients (1988), periodic at the
// ends, the N/2 coefficients of the finest scale m = M, then half as many of each
// coarser one down to m = 2, have the variances
//
//	σr² 2^-m + σw²
//
// and the 2n₀ of the remaining smooth part the variance σr² 2^-1 g + σw² with
// g = 1/(2 ln 2) (their equations 32 to 34, for γ = 1; recalled from memory).
// σr is not the standard deviation of the red noise. The cost is proportional to
// N. The variance of the smooth part is an approximation for γ = 1, where the sum
// over coarser scales diverges; Cubillos et al. (2017) list corrections to the
// paper's text. What is computed is in any case a normal density, normalised, so
// that its parameters can be fitted.
type Wavelet struct {
	Red   float64 // σr, at least 0, in the unit of the residuals
	White float64 // σw, above 0 when Red is 0
}

// WaveletGradient is the logarithm of the likelihood and its derivatives.
type WaveletGradient struct {
	LogLikelihood float64
	ByLogRed      float64
	ByLogWhite    float64
	ByResidual    []float64
}

// Daubechies' coefficients, (1+√3, 3+√3, 3-√3, 1-√3)/(4√2).
var smoothing = [4]float64{0.48296291314453416, 0.83651630373780794, 0.22414386804201339, -0.12940952255126037}

// mostOdd bounds n₀.
const mostOdd = 31

// UsableLength returns the largest number of residuals, up to n, that the wavelet
// likelihood takes: n₀ 2^M with n₀ ≤ 31 and M ≥ 2; 0 when n is below 4. Of 64 or more, at
// most a sixteenth is left out.
func UsableLength(n int) int {
	if n < 4 {
		return 0
	}
	unit := 0
	for n>>unit > mostOdd+1 {
		unit++
	}
	return n >> max(unit, 2) << max(unit, 2)
}

// LogLikelihood returns the natural logarithm of the likelihood of residuals.
// Errors are those of [Wavelet.Gradient].
func (w Wavelet) LogLikelihood(residual []float64) (float64, error) {
	g, err := w.Gradient(residual)
	if err != nil {
		return math.NaN(), err
	}
	return g.LogLikelihood, nil
}

// Gradient returns the likelihood with its derivatives. It is an error when a
// number is not finite, no variance remains, or the number of residuals is not
// n₀ 2^M, n₀ ≤ 31, M ≥ 2; see [UsableLength].
func (w Wavelet) Gradient(residual []float64) (WaveletGradient, error) {
	n := len(residual)
	if n > mostSamples || UsableLength(n) != n || n == 0 {
		return WaveletGradient{}, fmt.Errorf("wavelet likelihood: %d residuals; expected a small number times a power of 2, such as %d", n, UsableLength(min(n, mostSamples)))
	}
	if !(w.Red >= 0) || !(w.White >= 0) || !(w.Red*w.Red+w.White*w.White > 0) || math.IsInf(w.Red, 0) || math.IsInf(w.White, 0) {
		return WaveletGradient{}, fmt.Errorf("wavelet likelihood: standard deviations %g of 1/f noise and %g of white noise; expected numbers above 0", w.Red, w.White)
	}
	for i, r := range residual {
		if !finite(r) {
			return WaveletGradient{}, fmt.Errorf("wavelet likelihood: residual %d is %g; expected finite ones", i, r)
		}
	}
	levels := bits.TrailingZeros(uint(n)) // M
	x, work := append([]float64(nil), residual...), make([]float64, n)
	for length := n; length > n>>(levels-1); length /= 2 {
		forward(x[:length], work)
	}

	var out WaveletGradient
	red, white := w.Red*w.Red, w.White*w.White
	chi2, logs := 0.0, 0.0
	weigh := func(part []float64, share float64) {
		v := share*red + white
		sum := 0.0
		for i, c := range part {
			sum += c * c
			part[i] = -c / v
		}
		sum /= v
		count := float64(len(part))
		chi2 += sum
		logs += count * math.Log(v)
		out.ByLogRed += (sum - count) * share * red / v
		out.ByLogWhite += (sum - count) * white / v
	}
	smooth := n >> (levels - 1)
	weigh(x[:smooth], 0.5/(2*math.Ln2))
	for m, length := 2, smooth; m <= levels; m, length = m+1, 2*length {
		weigh(x[length:2*length], math.Ldexp(1, -m))
	}
	out.LogLikelihood = -(chi2 + logs + float64(n)*math.Log(2*math.Pi)) / 2
	if !finite(out.LogLikelihood) || !finite(out.ByLogRed) || !finite(out.ByLogWhite) {
		return WaveletGradient{}, errRange
	}
	for length := 2 * smooth; length <= n; length *= 2 {
		backward(x[:length], work)
	}
	out.ByResidual = x
	for _, g := range x {
		if !finite(g) {
			return WaveletGradient{}, errRange
		}
	}
	return out, nil
}

// forward replaces x by its smooth half and, behind it, its detailed half.
func forward(x, work []float64) {
	n, half := len(x), len(x)/2
	for k := range half {
		var s, d float64
		for j, c := range smoothing {
			v := x[(2*k+j)%n]
			s += c * v
			d += detail(j) * v
		}
		work[k], work[half+k] = s, d
	}
	copy(x, work[:n])
}

// backward undoes forward, being its transpose.
func backward(x, work []float64) {
	n, half := len(x), len(x)/2
	clear(work[:n])
	for k := range half {
		for j, c := range smoothing {
			work[(2*k+j)%n] += c*x[k] + detail(j)*x[half+k]
		}
	}
	copy(x, work[:n])
}

// detail is coefficient j of the filter that mirrors smoothing.
func detail(j int) float64 {
	if j%2 == 0 {
		return smoothing[3-j]
	}
	return -smoothing[3-j]
}
