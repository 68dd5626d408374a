package chain

import (
	"errors"
	"fmt"
	"slices"
)

// MostNumbers bounds the numbers in one set of draws: 400 MB.
const MostNumbers = 50_000_000

// Draws are samples of a posterior from Markov chains of one length, without
// those of the warm-up.
//
// LogDensity, Energy, Divergent and Steps have one element for each draw, chain
// after chain, or are empty.
type Draws struct {
	Names      []string  // of the parameters
	Units      []string  // FITS-standard unit string of each; may be empty
	Chains     int       // how many
	Length     int       // draws of each chain
	Group      int       // chains that R-hat takes together, walkers of an ensemble, a divisor of Chains; 0 for 1
	X          []float64 // parameter p of draw i of chain c is X[(c*Length+i)*len(Names)+p]
	LogDensity []float64 // natural logarithm of the target's density, up to a constant
	Energy     []float64 // the Hamiltonian at the start of the trajectory; of Hamiltonian samplers
	Divergent  []bool    // the trajectory to this draw went where it could not be computed
	Steps      []int     // leapfrog steps of the trajectory to this draw

	Acceptance  []float64 // of each chain: share of moves accepted, or mean acceptance statistic
	StepSize    []float64 // of each chain, of Hamiltonian samplers
	Evaluations int       // of the target, warm-up included
	Undefined   int       // of those after the warm-up, which gave NaN or +Inf and were taken for zero density
}

// Check reports the first thing about the shape of d that does not fit.
func (d Draws) Check() error {
	p := len(d.Names)
	switch {
	case p == 0:
		return errors.New("draws without parameters; expected at least one name")
	case d.Chains < 1 || d.Length < 1:
		return fmt.Errorf("draws of %d chains of length %d; expected at least 1 of each", d.Chains, d.Length)
	case d.Group < 0 || d.Group > 0 && d.Chains%d.Group != 0:
		return fmt.Errorf("draws of %d chains in groups of %d; expected a divisor", d.Chains, d.Group)
	case d.Chains > MostNumbers || d.Length > MostNumbers || p > MostNumbers || d.Chains*d.Length > MostNumbers/p:
		return fmt.Errorf("draws of %d chains of length %d and %d parameters; expected at most %d numbers altogether", d.Chains, d.Length, p, MostNumbers)
	case len(d.X) != d.Chains*d.Length*p:
		return fmt.Errorf("draws have %d numbers; expected %d, for %d chains of length %d and %d parameters", len(d.X), d.Chains*d.Length*p, d.Chains, d.Length, p)
	case len(d.Units) != 0 && len(d.Units) != p:
		return fmt.Errorf("draws have %d units; expected one for each of %d parameters, or none", len(d.Units), p)
	}
	for _, part := range []struct {
		name       string
		have, want int
	}{
		{"log densities", len(d.LogDensity), d.Chains * d.Length}, {"energies", len(d.Energy), d.Chains * d.Length},
		{"divergence marks", len(d.Divergent), d.Chains * d.Length}, {"numbers of steps", len(d.Steps), d.Chains * d.Length},
		{"acceptance rates", len(d.Acceptance), d.Chains}, {"step sizes", len(d.StepSize), d.Chains},
	} {
		if part.have != 0 && part.have != part.want {
			return fmt.Errorf("draws have %d %s; expected %d, or none", part.have, part.name, part.want)
		}
	}
	return nil
}

// Column gives the draws of one parameter, chain after chain. Errors: a shape
// that does not fit; a name that is none of the parameters.
func (d Draws) Column(name string) ([]float64, error) {
	if err := d.Check(); err != nil {
		return nil, err
	}
	p, err := find(d.Names, name)
	if err != nil {
		return nil, err
	}
	return column(d.X, len(d.Names), p), nil
}

func find(names []string, name string) (int, error) {
	p := slices.Index(names, name)
	if p < 0 {
		return 0, fmt.Errorf("no parameter is called %.40q; expected one of %.300q", name, names)
	}
	return p, nil
}

// column is every stride-th number of x from p on.
func column(x []float64, stride, p int) []float64 {
	out := make([]float64, len(x)/stride)
	for i := range out {
		out[i] = x[i*stride+p]
	}
	return out
}

// Join puts the chains of several sets of draws side by side, as if one call had
// made them all. What only some of them have is dropped. Errors: no set; a shape
// that does not fit; other parameters, units, groups or lengths than those of the
// first.
func Join(sets ...Draws) (Draws, error) {
	if len(sets) == 0 {
		return Draws{}, errors.New("nothing to join; expected at least one set of draws")
	}
	numbers := 0
	for i, d := range sets {
		if err := d.Check(); err != nil {
			return Draws{}, fmt.Errorf("set %d: %w", i+1, err)
		}
		if !slices.Equal(d.Names, sets[0].Names) || !slices.Equal(d.Units, sets[0].Units) || d.Length != sets[0].Length || d.Group != sets[0].Group {
			return Draws{}, fmt.Errorf("set %d has other parameters, units, groups or chains of another length than the first; expected the same", i+1)
		}
		if numbers += len(d.X); numbers > MostNumbers {
			return Draws{}, fmt.Errorf("the sets have more than %d numbers altogether", MostNumbers)
		}
	}
	out := Draws{Names: slices.Clone(sets[0].Names), Units: slices.Clone(sets[0].Units), Length: sets[0].Length, Group: sets[0].Group}
	for _, d := range sets {
		out.Chains += d.Chains
		out.X = append(out.X, d.X...)
		out.LogDensity = append(out.LogDensity, d.LogDensity...)
		out.Energy = append(out.Energy, d.Energy...)
		out.Divergent = append(out.Divergent, d.Divergent...)
		out.Steps = append(out.Steps, d.Steps...)
		out.Acceptance = append(out.Acceptance, d.Acceptance...)
		out.StepSize = append(out.StepSize, d.StepSize...)
		out.Evaluations += d.Evaluations
		out.Undefined += d.Undefined
	}
	n := out.Chains * out.Length
	out.LogDensity, out.Energy = whole(out.LogDensity, n), whole(out.Energy, n)
	out.Divergent, out.Steps = whole(out.Divergent, n), whole(out.Steps, n)
	out.Acceptance, out.StepSize = whole(out.Acceptance, out.Chains), whole(out.StepSize, out.Chains)
	return out, nil
}

// whole is x, or nil when it has not n elements.
func whole[T any](x []T, n int) []T {
	if len(x) != n {
		return nil
	}
	return x
}
