package noise

import (
	"fmt"
	"strings"
)

// Equation prints the covariance of two samples i and j that the model stands for,
// with the names of its parameters, for example
//
//	cov(i, j) = (err_i² + jitter²) δ_ij + red.sigma² (1 + √3 d) exp(-√3 d), d = |Δtime|/red.timescale
//
// A model that [Model.Check] refuses prints as its error.
func (m Model) Equation() string {
	if err := m.Check(); err != nil {
		return err.Error()
	}
	white := "err_i²"
	if m.Scale {
		white = "errorScale² " + white
	}
	if m.Jitter {
		white = "(" + white + " + jitter²)"
	}
	var b strings.Builder
	b.WriteString("cov(i, j) = " + white + " δ_ij")
	var where []string
	count := 0
	for _, t := range m.Terms {
		fmt.Fprintf(&b, " + %s.sigma²", t.Name)
		for _, f := range t.Factors {
			count++
			d := fmt.Sprintf("d%d", count)
			if m.factors() == 1 {
				d = "d"
			}
			b.WriteString(" " + f.shape(t.Name, d))
			where = append(where, d+" = "+f.distance(t.Name))
		}
	}
	for _, w := range where {
		b.WriteString(", " + w)
	}
	return b.String()
}

func (m Model) factors() (n int) {
	for _, t := range m.Terms {
		n += len(t.Factors)
	}
	return n
}

// shape prints the kernel as a function of the distance d.
func (f Factor) shape(term, d string) string {
	switch f.Kind {
	case Exponential:
		return fmt.Sprintf("exp(-%s)", d)
	case Matern32:
		return fmt.Sprintf("(1 + √3 %[1]s) exp(-√3 %[1]s)", d)
	case Matern52:
		return fmt.Sprintf("(1 + √5 %[1]s + 5/3 %[1]s²) exp(-√5 %[1]s)", d)
	case Oscillator:
		quality := term + ".quality" + suffixOf(f.inputs()[0])
		return fmt.Sprintf("exp(-%[1]s/2Q) (cos η%[1]s + sin(η%[1]s)/2Qη) with Q = %[2]s, η² = 1 - 1/4Q²", d, quality)
	}
	return fmt.Sprintf("exp(-%s²/2)", d)
}

// distance prints what the kernel depends on.
func (f Factor) distance(term string) string {
	inputs := f.inputs()
	scale := func(input string) string {
		switch {
		case f.Kind == Oscillator:
			return "2π |Δ" + input + "|/" + term + ".period" + suffixOf(input)
		case input == Time:
			return "|Δtime|/" + term + ".timescale"
		}
		return "|Δ" + input + "|/" + term + ".length." + input
	}
	if len(inputs) == 1 {
		return scale(inputs[0])
	}
	parts := make([]string, len(inputs))
	for k, input := range inputs {
		parts[k] = "(" + scale(input) + ")²"
	}
	return "√[" + strings.Join(parts, " + ") + "]"
}

func suffixOf(input string) string {
	if input == Time {
		return ""
	}
	return "." + input
}
