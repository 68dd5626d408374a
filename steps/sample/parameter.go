package sample

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mathext"
)

// mostParameters bounds the parameters of a target.
const mostParameters = 1000

// A Parameter is a coordinate of a target. Its range lies between Lo and Hi, either
// of which may be infinite; both are 0 for a parameter without limits.
type Parameter struct {
	Name string
	Unit string // FITS-standard unit string, empty for a pure number
	Lo   float64
	Hi   float64
}

// limits is the range as Lo and Hi mean it.
func (p Parameter) limits() (lo, hi float64) {
	if p.Lo == 0 && p.Hi == 0 {
		return math.Inf(-1), math.Inf(1)
	}
	return p.Lo, p.Hi
}

// inside reports whether x lies between the limits.
func (p Parameter) inside(x float64) bool {
	lo, hi := p.limits()
	return x > lo && x < hi
}

func checkParameters(parameters []Parameter) error {
	if len(parameters) == 0 || len(parameters) > mostParameters {
		return fmt.Errorf("%d parameters; expected 1 to %d", len(parameters), mostParameters)
	}
	seen := map[string]bool{}
	for i, p := range parameters {
		switch lo, hi := p.limits(); {
		case p.Name == "":
			return fmt.Errorf("parameter %d has no name", i+1)
		case seen[p.Name]:
			return fmt.Errorf("two parameters are called %.40s", p.Name)
		case !(lo < hi) || !math.IsInf(hi-lo, 1) && !(hi-lo < math.MaxFloat64):
			return fmt.Errorf("parameter %.40s lies between %g and %g; expected an increasing range", p.Name, p.Lo, p.Hi)
		case math.IsInf(hi-lo, 1) && !math.IsInf(lo, -1) && !math.IsInf(hi, 1):
			return fmt.Errorf("parameter %.40s lies between %g and %g, a range too wide to compute with", p.Name, p.Lo, p.Hi)
		}
		seen[p.Name] = true
	}
	return nil
}

func namesAndUnits(parameters []Parameter) (names, units []string) {
	for _, p := range parameters {
		names, units = append(names, p.Name), append(units, p.Unit)
	}
	return names, units
}

// A coordinate is a parameter as a number without limits, u:
//
//	x = lo + (hi - lo) Φ(u)   between two limits, Φ the normal distribution (probit)
//	x = lo + exp u            above one
//	x = hi - exp u            below one
//
// A flat density of x between two limits is a standard normal one of u, which
// suits every sampler.
type coordinate struct {
	lo, hi float64
}

func newCoordinate(p Parameter) coordinate {
	lo, hi := p.limits()
	return coordinate{lo, hi}
}

// value gives x at u, its derivative, the logarithm of that, and the derivative of
// the logarithm.
func (c coordinate) value(u float64) (x, slope, logSlope, bend float64) {
	const logRoot2Pi = 0.91893853320467274178
	openBelow, openAbove := math.IsInf(c.lo, -1), math.IsInf(c.hi, 1)
	switch {
	case openBelow && openAbove:
		return u, 1, 0, 0
	case openAbove:
		e := math.Exp(u)
		return c.lo + e, e, u, 1
	case openBelow:
		e := math.Exp(u)
		return c.hi - e, -e, u, 1
	}
	width := c.hi - c.lo
	share := math.Erfc(math.Abs(u)/math.Sqrt2) / 2 // from the nearer limit
	x = c.lo + width*share
	if u > 0 {
		x = c.hi - width*share
	}
	logSlope = math.Log(width) - u*u/2 - logRoot2Pi
	return x, math.Exp(logSlope), logSlope, -u
}

// of gives u at x, which lies inside the limits.
func (c coordinate) of(x float64) float64 {
	openBelow, openAbove := math.IsInf(c.lo, -1), math.IsInf(c.hi, 1)
	switch {
	case openBelow && openAbove:
		return x
	case openAbove:
		return math.Log(x - c.lo)
	case openBelow:
		return math.Log(c.hi - x)
	}
	if below, above := (x-c.lo)/(c.hi-c.lo), (c.hi-x)/(c.hi-c.lo); below < above {
		return mathext.NormalQuantile(below)
	} else {
		return -mathext.NormalQuantile(above)
	}
}

// checkStart is the error for a point that no chain can start from.
func checkStart(parameters []Parameter, start []float64) error {
	if len(start) != len(parameters) {
		return fmt.Errorf("the start has %d numbers; expected one for each of %d parameters", len(start), len(parameters))
	}
	for k, p := range parameters {
		if x := start[k]; x-x != 0 || !p.inside(x) {
			lo, hi := p.limits()
			return fmt.Errorf("the start has %g for %.40s; expected a number between %g and %g", x, p.Name, lo, hi)
		}
	}
	return nil
}

var errNoTarget = errors.New("the target is nil; expected a function that returns the logarithm of a density")
