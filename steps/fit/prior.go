package fit

import (
	"fmt"
	"math"
)

// check reports numbers that are no prior of its kind.
func (p Prior) check() error {
	bad := func(want string) error {
		return fmt.Errorf("prior of %.40s is %.40s with A=%g, B=%g, Lo=%g, Hi=%g; expected %s", p.Name, p.Kind, p.A, p.B, p.Lo, p.Hi, want)
	}
	for _, v := range []float64{p.A, p.B, p.Lo, p.Hi} {
		if v-v != 0 {
			return bad("finite numbers")
		}
	}
	switch p.Kind {
	case Uniform:
		if !(p.A < p.B) {
			return bad("U(a, b) with a < b")
		}
	case LogUniform:
		if !(p.A > 0 && p.A < p.B) {
			return bad("logU(a, b) with 0 < a < b")
		}
	case Normal:
		if !(p.B > 0) {
			return bad("N(mean, sd) with sd > 0")
		}
	case TruncatedNormal:
		if !(p.B > 0 && p.Lo < p.Hi) {
			return bad("TN(mean, sd, a, b) with sd > 0 and a < b")
		}
	case Fixed:
	default:
		return fmt.Errorf("prior of %.40s has kind %.40q; expected U, N, TN, logU or =", p.Name, p.Kind)
	}
	return nil
}

// limits returns the interval a prior allows, infinite where there is no limit.
func (p Prior) limits() (lo, hi float64) {
	switch p.Kind {
	case Uniform, LogUniform:
		return p.A, p.B
	case TruncatedNormal:
		return p.Lo, p.Hi
	}
	return math.Inf(-1), math.Inf(1)
}

// normal reports whether a prior has a Gaussian factor.
func (p Prior) normal() bool { return p.Kind == Normal || p.Kind == TruncatedNormal }
