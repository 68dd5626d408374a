package noise

import (
	"fmt"
	"slices"
)

// Kinds of kernel. Each is 1 at distance 0; d stands for the distance in units of
// the scale, τ for a difference in time.
const (
	Exponential        = "exponential"        // exp(-d): damped random walk, Ornstein-Uhlenbeck process
	Matern32           = "matern32"           // (1 + √3 d) exp(-√3 d)
	Matern52           = "matern52"           // (1 + √5 d + 5d²/3) exp(-√5 d)
	SquaredExponential = "squaredExponential" // exp(-d²/2)

	// Oscillator is the stochastically driven damped harmonic oscillator, whose
	// power spectrum is proportional to ω₀⁴ / ((ω²-ω₀²)² + ω₀²ω²/Q²) (Foreman-Mackey,
	// Agol, Ambikasaran & Angus 2017, equations 20 to 24), at any quality factor Q:
	//
	//	exp(-ω₀τ/2Q) (cos ητ + ω₀/(2Qη) sin ητ),  η² = ω₀² (1 - 1/4Q²)
	//
	// with hyperbolic functions below Q = 1/2, and its limit there, which is
	// Matern32 of the scale √3/ω₀. Q = 1/√2 is the usual choice for granulation. Its
	// parameters are the undamped period 2π/ω₀ and Q; the paper's S₀ is σ²/(ω₀Q).
	Oscillator = "oscillator"
)

// Time is the name of the input that every series has.
const Time = "time"

const (
	mostTerms  = 8
	mostInputs = 8
)

// A Model is a sum of independent parts of noise. The zero value is white noise
// with the errors as they are given. Residuals have the covariance
//
//	(errorScale² err² + jitter²) δ + Σ terms
type Model struct {
	Scale  bool // errors are multiplied by the parameter errorScale
	Jitter bool // the parameter jitter is added to them in quadrature
	Terms  []Term
}

// A Term is a correlated part: the variance of the parameter NAME.sigma, squared,
// times the product of the factors.
type Term struct {
	Name    string // letters and digits
	Factors []Factor
}

// A Factor is a kernel over one or several inputs, with a scale for each: the
// distance is the root of the summed squares of the differences over scales.
type Factor struct {
	Kind   string
	Inputs []string // names of inputs; none stands for the time
}

// NewTerm returns a term of one factor. Without inputs it depends on time.
func NewTerm(name, kind string, inputs ...string) Term {
	return Term{Name: name}.Times(kind, inputs...)
}

// Times returns the product of the term with a further factor.
func (t Term) Times(kind string, inputs ...string) Term {
	t.Factors = append(slices.Clone(t.Factors), Factor{Kind: kind, Inputs: slices.Clone(inputs)})
	return t
}

// White returns a model of white noise.
func White(scale, jitter bool) Model { return Model{Scale: scale, Jitter: jitter} }

// Plus returns the sum of the model and further terms. An invalid sum is refused
// where it is used, see [Model.Check].
func (m Model) Plus(terms ...Term) Model {
	m.Terms = append(slices.Clone(m.Terms), terms...)
	return m
}

// A Parameter is a positive number that a model depends on. A jitter may be 0.
type Parameter struct {
	Name  string
	Unit  string // FITS-standard unit string; empty for pure numbers and those in the residuals' unit, and for lengths in inputs of which no data are known
	About string
}

// Parameters lists what the model depends on, in the order in which values are
// given: errorScale, jitter, then of each term its NAME.sigma, and of each of its
// inputs NAME.timescale for the time and NAME.length.INPUT for others, or for an
// oscillator NAME.period and NAME.quality (NAME.period.INPUT and so on for other
// inputs than time). Times are in days.
func (m Model) Parameters() ([]Parameter, error) {
	if err := m.Check(); err != nil {
		return nil, err
	}
	return m.parameters(Data{}), nil
}

// parameters lists them with the units of the inputs of d.
func (m Model) parameters(d Data) []Parameter {
	var out []Parameter
	if m.Scale {
		out = append(out, Parameter{"errorScale", "", "factor on the given errors"})
	}
	if m.Jitter {
		out = append(out, Parameter{"jitter", "", "added to the errors in quadrature"})
	}
	for _, t := range m.Terms {
		out = append(out, Parameter{t.Name + ".sigma", "", "standard deviation of the term " + t.Name})
		for _, f := range t.Factors {
			for _, input := range f.inputs() {
				suffix, unit := suffixOf(input), d.unit(input)
				switch {
				case f.Kind == Oscillator:
					out = append(out, Parameter{t.Name + ".period" + suffix, unit, "undamped period of the oscillator"},
						Parameter{t.Name + ".quality" + suffix, "", "quality factor of the oscillator"})
				case input == Time:
					out = append(out, Parameter{t.Name + ".timescale", unit, "time scale of the term " + t.Name})
				default:
					out = append(out, Parameter{t.Name + ".length" + suffix, unit, "scale of the term " + t.Name + " in " + input})
				}
			}
		}
	}
	return out
}

func (f Factor) inputs() []string {
	if len(f.Inputs) == 0 {
		return []string{Time}
	}
	return f.Inputs
}

// Check is the error for a model that means nothing: an unknown kernel, a name
// that is not made of letters and digits or used twice, a term without factors, an
// oscillator over several inputs, one input twice within a term.
func (m Model) Check() error {
	if len(m.Terms) > mostTerms {
		return fmt.Errorf("noise model: %d terms; expected at most %d", len(m.Terms), mostTerms)
	}
	seen := map[string]bool{}
	for i, t := range m.Terms {
		if !isName(t.Name) {
			return fmt.Errorf("noise model: term %d is called %.40q; expected letters and digits", i+1, t.Name)
		}
		if seen[t.Name] {
			return fmt.Errorf("noise model: two terms are called %s", t.Name)
		}
		seen[t.Name] = true
		if err := t.check(); err != nil {
			return fmt.Errorf("noise model, term %s: %w", t.Name, err)
		}
	}
	return nil
}

func (t Term) check() error {
	if len(t.Factors) == 0 || len(t.Factors) > mostInputs {
		return fmt.Errorf("%d factors; expected 1 to %d", len(t.Factors), mostInputs)
	}
	seen := map[string]bool{}
	for _, f := range t.Factors {
		switch f.Kind {
		case Exponential, Matern32, Matern52, SquaredExponential:
		case Oscillator:
			if len(f.Inputs) > 1 {
				return fmt.Errorf("an oscillator over %d inputs; expected one", len(f.Inputs))
			}
		default:
			return fmt.Errorf("unknown kernel %.40q; expected %s, %s, %s, %s or %s", f.Kind, Exponential, Matern32, Matern52, SquaredExponential, Oscillator)
		}
		for _, input := range f.inputs() {
			if !isName(input) {
				return fmt.Errorf("an input is called %.40q; expected letters, digits and underscores", input)
			}
			if seen[input] {
				return fmt.Errorf("the input %s occurs twice", input)
			}
			seen[input] = true
		}
		if len(seen) > mostInputs {
			return fmt.Errorf("more than %d inputs", mostInputs)
		}
	}
	return nil
}

// isName reports whether s can be part of a parameter's name.
func isName(s string) bool {
	if s == "" || len(s) > 40 {
		return false
	}
	for i, c := range []byte(s) {
		letter := c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z'
		if !letter && (i == 0 || c != '_' && (c < '0' || c > '9')) {
			return false
		}
	}
	return true
}

// Fast reports whether the likelihood costs time in proportion to the number of
// samples: every term is one exponential, Matérn-3/2 or oscillator kernel in time.
func (m Model) Fast() bool {
	for _, t := range m.Terms {
		if len(t.Factors) != 1 {
			return false
		}
		f := t.Factors[0]
		if f.Kind != Exponential && f.Kind != Matern32 && f.Kind != Oscillator {
			return false
		}
		if in := f.inputs(); len(in) != 1 || in[0] != Time {
			return false
		}
	}
	return true
}
