package fit

import (
	"fmt"
	"slices"
	"strings"

	"rimlight/steps/systematics"
)

// shownTerms is how many terms of one kind, or names of a list, an equation shows.
const shownTerms = 64

// An Equation is a model as papers print it.
type Equation struct {
	Text   []string // one line for the flux and one for the errors
	MathML []string // the same, a math element for each line
	Where  []string // what the symbols mean, and which parameters are free, a clause each
}

// String is the equation and its explanations in one line.
func (e Equation) String() string {
	return strings.Join(append([]string{strings.Join(e.Text, "; ")}, e.Where...), "; ")
}

// Equation writes the model as an equation. Of more than 64 terms of a kind it
// leaves out the rest, which no fit takes.
func (m Model) Equation() Equation {
	t := symbol{name: "t"}
	var factors []expression
	var e Equation
	where := func(format string, args ...any) { e.Where = append(e.Where, fmt.Sprintf(format, args...)) }
	if !m.Alone {
		law := m.LimbLaw
		if law == "" {
			law = LawQuadratic
		}
		factors = append(factors, call{"transit", []expression{t}})
		about := "transit(t) is that of a dark sphere on a Keplerian orbit before a star with " + short(law) + " limb darkening, 1 out of transit"
		if m.Exposure > 0 {
			about += fmt.Sprintf(", averaged over exposures of %.6g s", m.Exposure)
		}
		if m.Companion > 0 || m.has("companion") {
			about += ", diluted by the light of a companion"
		}
		where("%s", about)
	}
	if m.Alone || len(m.Function) > 0 {
		f := call{"f", []expression{t}}
		for _, name := range m.Function[:min(len(m.Function), shownTerms)] {
			f.args = append(f.args, symbol{name: name})
		}
		factors = append(factors, f)
		where("f is a function of the recipe")
	}
	trend, added := trendTerms(m.Trend)
	factors = append(factors, trend)
	flux := sum(append([]expression{product{"×", factors}}, added...))
	e.add(symbol{name: "flux"}, flux)
	e.Where = append(e.Where, trendWhere(m.Trend)...)
	m.addNoise(&e)
	m.addParameters(where)
	return e
}

// add adds a line.
func (e *Equation) add(left, right expression) {
	e.Text = append(e.Text, left.text()+" = "+right.text())
	e.MathML = append(e.MathML, "<math><mrow>"+left.mathML()+"<mo>=</mo>"+right.mathML()+"</mrow></math>")
}

// trendTerms are the sum that multiplies and the terms that are added.
func trendTerms(t systematics.Trend) (multiplied sum, added []expression) {
	x := symbol{name: "x"}
	multiplied = sum{symbol{"c", "0"}}
	for k := 1; k <= min(t.Polynomial, systematics.MaxPolynomial); k++ {
		var basis expression = x
		if k > 1 {
			basis = power{x, fmt.Sprint(k)}
		}
		multiplied = append(multiplied, product{factors: []expression{symbol{"c", fmt.Sprint(k)}, basis}})
	}
	if t.Settling {
		multiplied = append(multiplied, product{factors: []expression{symbol{name: "s"}, decay{symbol{"t", "0"}, symbol{name: "settlingTime"}}}})
	}
	regressor := func(letter, name string) expression {
		return product{factors: []expression{symbol{letter, name}, call{"z", []expression{symbol{name: name}}}}}
	}
	for _, name := range t.Regressors[:min(len(t.Regressors), shownTerms)] {
		multiplied = append(multiplied, regressor("k", name))
	}
	for _, name := range t.Added[:min(len(t.Added), shownTerms)] {
		added = append(added, regressor("a", name))
	}
	return multiplied, added
}

func trendWhere(t systematics.Trend) []string {
	var where []string
	if t.Polynomial > 0 {
		where = append(where, "x is time scaled to [-1, 1]")
	}
	if t.Settling {
		where = append(where, "t0 is the first time")
	}
	if len(t.Regressors)+len(t.Added) > 0 {
		where = append(where, "z() is standardised to mean 0 and standard deviation 1")
	}
	return where
}

// addNoise adds a line for the errors.
func (m Model) addNoise(e *Equation) {
	var given expression = symbol{"σ", "given"}
	scaled, jittered := m.has("errorScale"), m.has("jitter")
	if scaled {
		given = product{factors: []expression{symbol{name: "errorScale"}, given}}
	}
	variance := sum{power{given, "2"}}
	if jittered {
		variance = append(variance, power{symbol{name: "jitter"}, "2"})
	}
	if scaled || jittered {
		e.add(power{symbol{name: "σ"}, "2"}, variance)
		e.Where = append(e.Where, "σ is the error of a sample, of white noise")
	}
	if m.Inflate {
		e.Where = append(e.Where, "errors are multiplied by the root of the reduced chi-square where that is above 1")
	}
}

// has reports whether a table names a parameter.
func (m Model) has(name string) bool {
	named := func(p Prior) bool { return p.Name == name }
	return slices.ContainsFunc(m.White, named) || slices.ContainsFunc(m.Channel, named)
}

// addParameters says which parameters are free, and what channels share.
func (m Model) addParameters(where func(format string, args ...any)) {
	names := func(rows Priors) string {
		var out []string
		for _, p := range rows {
			if p.Kind == Fixed {
				continue
			}
			if len(out) == shownTerms {
				out = append(out, "…")
				break
			}
			out = append(out, fmt.Sprintf("%.40s", p.Name))
		}
		return strings.Join(out, ", ")
	}
	if free := names(m.White); free != "" {
		where("free are %s and the coefficients", free)
	}
	if own := names(m.Channel); own != "" {
		where("each channel has its own %s and coefficients, and shares the rest", own)
	}
}
