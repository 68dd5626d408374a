package limb

import (
	"fmt"
	"math"
	"strings"

	"rimlight/steps/nearest"
)

// Names of the laws.
const (
	Uniform        = "uniform"
	Linear         = "linear"
	Quadratic      = "quadratic"
	SquareRoot     = "square-root"
	Logarithmic    = "logarithmic"
	Power2         = "power-2"
	ThreeParameter = "three-parameter"
	FourParameter  = "four-parameter"
)

const (
	// Most is the largest number of coefficients of a law.
	Most = 4
	// largest bounds coefficients, so that sums and products of them are finite.
	largest = 1e100
)

// count is the number of coefficients by law, in the order of Names.
var count = [...]int{0, 1, 2, 2, 2, 2, 3, 4}

// Names returns the names of all laws.
func Names() []string {
	return []string{Uniform, Linear, Quadratic, SquareRoot, Logarithmic, Power2, ThreeParameter, FourParameter}
}

// Count returns the number of coefficients of the law of this name, or an error
// for a name that no law has.
func Count(name string) (int, error) {
	for i, known := range Names() {
		if name == known {
			return count[i], nil
		}
	}
	return 0, fmt.Errorf("limb: no limb-darkening law %.40q; expected one of %s%s", name, strings.Join(Names(), ", "), nearest.Hint(name, Names()))
}

// A Law is a limb-darkening law with its coefficients.
type Law struct {
	Name         string    // one of [Names]
	Coefficients []float64 // u1, u2, ..., as many as [Count] says
}

// New returns the law of this name, or the error of [Law.Validate].
func New(name string, coefficients []float64) (Law, error) {
	l := Law{Name: name, Coefficients: coefficients}
	return l, l.Validate()
}

// Validate returns nil for a law of a star that gives light, or an error: for a
// name that no law has, another number of coefficients than that of the law,
// coefficients that are not finite or above 1e100, an exponent u2 of the power-2
// law that is not above 0, or a flux norm that is not above 0. The law need not
// be physical, see [Law.Physical].
func (l Law) Validate() error {
	n, err := Count(l.Name)
	if err != nil {
		return err
	}
	if len(l.Coefficients) != n {
		return fmt.Errorf("limb: %d coefficients for the %s law, expected %d", len(l.Coefficients), l.Name, n)
	}
	for i, u := range l.Coefficients {
		if !(math.Abs(u) <= largest) {
			return fmt.Errorf("limb: coefficient u%d of the %s law is %g, must be finite and within ±%g", i+1, l.Name, u, largest)
		}
	}
	if l.Name == Power2 && !(l.Coefficients[1] > 0) {
		return fmt.Errorf("limb: the exponent u2 of the %s law is %g, must be above 0", l.Name, l.Coefficients[1])
	}
	if norm := l.Norm(); !(norm > 0) {
		return fmt.Errorf("limb: with coefficients %g the %s law gives the star a flux of %g times that of a uniform disc, must be above 0", l.Coefficients, l.Name, norm)
	}
	return nil
}

// known reports whether the law has a name and as many coefficients as that
// asks for, so that they can be used without looking.
func (l Law) known() bool {
	n := len(l.Coefficients)
	switch l.Name {
	case Uniform:
		return n == 0
	case Linear:
		return n == 1
	case Quadratic, SquareRoot, Logarithmic, Power2:
		return n == 2
	case ThreeParameter:
		return n == 3
	case FourParameter:
		return n == 4
	}
	return false
}
