package reports

import (
	"cmp"
	"fmt"
	"html/template"
	"math"
	"slices"
	"strings"

	"rimlight/steps/fit"
)

// A posteriorView is a fit's result as papers print it.
type posteriorView struct {
	Number      int
	Free        []parameterView
	Held        []parameterView
	Derived     []parameterView
	Fit         string // chi-square and how the fit ended
	Odd         bool   // it did not converge
	Warnings    []string
	Model       *equationView
	Correlation *correlationView
	Pairs       string // strongest correlations in words, when there are too many for a matrix
}

type parameterView struct{ Name, Symbol, Value, Unit, Prior, About string }

// A correlationView is the lower triangle of a correlation matrix.
type correlationView struct {
	Names []string
	Rows  []correlationRow
}

type correlationRow struct {
	Name  string
	Cells []correlationCell
}

type correlationCell struct{ Text, Class string }

// largestMatrix is the number of parameters up to which the whole correlation
// matrix is shown; shownParameters is how many parameters are shown at all.
const (
	largestMatrix   = 14
	shownParameters = 200
)

func (b *builder) posterior(p fit.Posterior) *posteriorView {
	b.tables++
	v := &posteriorView{Number: b.tables, Odd: p.Status != "" && p.Status != "converged"}
	v.Model = equation(p.Model)
	for i, n := range p.Names {
		if i == shownParameters {
			break
		}
		q, _ := quantity(fit.Posterior{Names: p.Names[i : i+1], Value: tail(p.Value, i), Err: tail(p.Err, i), Units: tail(p.Units, i)}, n)
		v.Free = append(v.Free, parameterView{Name: label(n), Symbol: symbols[n], Value: measured(q.Value, q.Err), Unit: label(q.Unit), Prior: b.priorOf(p.Model, n)})
	}
	for i, h := range p.Held {
		if i == shownParameters {
			break
		}
		v.Held = append(v.Held, parameterView{Name: label(h.Name), Symbol: symbols[h.Name], Value: number(h.A, 10), Unit: label(h.Unit)})
	}
	for i, q := range p.Derived {
		if i == shownParameters {
			break
		}
		v.Derived = append(v.Derived, parameterView{Name: label(q.Name), Symbol: symbols[q.Name], Value: measured(q.Value, q.Err), Unit: label(q.Unit), About: sentence(q.About)})
	}
	v.Fit = fitText(p)
	for i, w := range p.Warnings {
		if i == shownItems {
			v.Warnings = append(v.Warnings, fmt.Sprintf("… and %d more", len(p.Warnings)-i))
			break
		}
		v.Warnings = append(v.Warnings, sentence(w))
	}
	v.correlate(p)
	return v
}

// An equationView is a model as papers print it.
type equationView struct {
	Lines []template.HTML // MathML
	Where []string        // what the symbols mean
}

// equation writes a model out; nil when there is none.
func equation(m fit.Model) *equationView {
	if m.Period == 0 {
		return nil
	}
	v := new(equationView)
	e := m.Equation()
	for _, line := range e.MathML {
		v.Lines = append(v.Lines, template.HTML(line)) // made by the library, of names that are escaped
	}
	for _, clause := range e.Where {
		v.Where = append(v.Where, sentence(clause))
	}
	return v
}

// model shows a declared model: its equation, and the priors of its parameters.
func (b *builder) model(m fit.Model) []block {
	blocks := []block{{Text: "a model without a period"}}
	if e := equation(m); e != nil {
		blocks[0] = block{Equation: e}
	}
	for _, rows := range []struct {
		caption string
		priors  fit.Priors
	}{{"Priors of the white light curve", m.White}, {"Priors of each channel", m.Channel}} {
		if len(rows.priors) > 0 {
			g := priorsGrid(rows.priors)
			g.Caption = rows.caption
			blocks = append(blocks, block{Grid: b.numbered(g)})
		}
	}
	return blocks
}

func tail[T any](s []T, i int) []T {
	if i >= len(s) {
		return nil
	}
	return s[i:]
}

// priorOf finds a parameter's prior in the model, or among the arguments of the
// step at hand.
func (b *builder) priorOf(m fit.Model, parameter string) string {
	for _, p := range slices.Concat(m.White, b.priors) {
		if p.Name == parameter {
			return priorText(p)
		}
	}
	return ""
}

// priorText writes a prior in the notation of recipes.
func priorText(p fit.Prior) string {
	a, c := precise(p.A), precise(p.B)
	switch p.Kind {
	case fit.Fixed:
		return "= " + a
	case fit.TruncatedNormal:
		return fmt.Sprintf("TN(%s, %s, %s, %s)", a, c, precise(p.Lo), precise(p.Hi))
	}
	return fmt.Sprintf("%s(%s, %s)", label(p.Kind), a, c)
}

func priorsText(priors fit.Priors) string {
	var parts []string
	for i, p := range priors {
		if i == shownItems {
			parts = append(parts, "…")
			break
		}
		parts = append(parts, strings.TrimSpace(label(p.Name)+" "+priorText(p)+" "+label(p.Unit)))
	}
	return strings.Join(parts, "; ")
}

func priorsGrid(priors fit.Priors) *gridView {
	g := &gridView{Caption: "Priors", Named: true, Columns: []columnView{{Name: "parameter"}, {Name: "prior"}, {Name: "unit"}}}
	for i, p := range priors {
		if i == shownRows {
			break
		}
		g.Rows = append(g.Rows, rowView{Cells: []string{label(p.Name), priorText(p), label(p.Unit)}})
	}
	return g
}

func quantityText(q fit.Quantity) string {
	s := strings.TrimSpace(measured(q.Value, q.Err) + " " + label(q.Unit))
	if q.About != "" {
		s += " – " + sentence(q.About)
	}
	return s
}

// fitText says how good the fit is and how it ended.
func fitText(p fit.Posterior) string {
	var parts []string
	if !math.IsNaN(p.Chi2) && p.Dof > 0 {
		parts = append(parts, fmt.Sprintf("χ² = %s for %s degrees of freedom (reduced %s)", fixed(p.Chi2, 1), grouped(p.Dof), fixed(p.Chi2/float64(p.Dof), 3)))
	}
	if p.Samples > 0 {
		parts = append(parts, grouped(p.Samples)+" samples")
	}
	ended := label(p.Status)
	if p.Iterations > 0 {
		ended = strings.TrimSpace(ended + " after " + count(p.Iterations, "iteration"))
	}
	if ended != "" {
		parts = append(parts, ended)
	}
	return strings.Join(parts, "; ")
}

// correlate fills in the correlations of the free parameters.
func (v *posteriorView) correlate(p fit.Posterior) {
	n := len(p.Names)
	if n < 2 || len(p.Cov) != n || slices.ContainsFunc(p.Cov, func(row []float64) bool { return len(row) != n }) {
		return
	}
	r := func(i, j int) float64 { return p.Cov[i][j] / math.Sqrt(p.Cov[i][i]*p.Cov[j][j]) }
	if n > largestMatrix {
		v.Pairs = strongPairs(p.Names, r)
		return
	}
	c := &correlationView{}
	for i := range n {
		if i < n-1 {
			c.Names = append(c.Names, shortName(p.Names[i]))
		}
		if i == 0 {
			continue
		}
		row := correlationRow{Name: shortName(p.Names[i])}
		for j := range n - 1 {
			if j >= i {
				row.Cells = append(row.Cells, correlationCell{})
				continue
			}
			row.Cells = append(row.Cells, correlationCell{fixed(r(i, j), 2), strength(r(i, j))})
		}
		c.Rows = append(c.Rows, row)
	}
	v.Correlation = c
}

func shortName(s string) string { return cmp.Or(symbols[s], label(s)) }

// strength is the style class of a correlation.
func strength(r float64) string {
	switch a := math.Abs(r); {
	case a >= 0.9:
		return "r3"
	case a >= 0.6:
		return "r2"
	case a >= 0.3:
		return "r1"
	}
	return "r0"
}

// strongPairs lists the strongest correlations.
func strongPairs(names []string, r func(i, j int) float64) string {
	type pair struct {
		i, j int
		r    float64
	}
	var pairs []pair
	for i := range min(len(names), shownParameters) {
		for j := range i {
			if v := r(i, j); math.Abs(v) >= 0.6 {
				pairs = append(pairs, pair{i, j, v})
			}
		}
	}
	if len(pairs) == 0 {
		return "no two parameters correlate by more than 0.6"
	}
	slices.SortStableFunc(pairs, func(a, b pair) int { return cmp.Compare(math.Abs(b.r), math.Abs(a.r)) })
	var parts []string
	for i, p := range pairs {
		if i == 8 {
			parts = append(parts, fmt.Sprintf("and %d more above 0.6", len(pairs)-i))
			break
		}
		parts = append(parts, fmt.Sprintf("%s and %s %s", shortName(names[p.j]), shortName(names[p.i]), fixed(p.r, 2)))
	}
	return strings.Join(parts, "; ")
}

// posteriors shows many fits of the same model, one row each.
func (b *builder) posteriors(title string, fits []fit.Posterior) []block {
	b.tables++
	g := &gridView{Number: b.tables, Caption: "Fits of the same model", Named: true, Wide: true, Scroll: len(fits) > scrolledRows,
		Columns: []columnView{{Name: "fit"}}}
	var names []string
	if len(fits) > 0 {
		names = fits[0].Names[:min(len(fits[0].Names), 10)]
	}
	for i, n := range names {
		unit := ""
		if i < len(fits[0].Units) {
			unit = fits[0].Units[i]
		}
		g.Columns = append(g.Columns, columnView{Name: shortName(n), Unit: label(unit), Number: true})
	}
	g.Columns = append(g.Columns, columnView{Name: "reduced χ²", Number: true}, columnView{Name: "ended"})
	for i, p := range fits {
		if i == shownRows {
			g.Note = fmt.Sprintf("The first %d of %d fits are shown.", i, len(fits))
			break
		}
		row := rowView{Cells: []string{fmt.Sprint(i)}}
		for _, n := range names {
			value := ""
			if q, ok := quantity(p, n); ok {
				value = measured(q.Value, q.Err)
			}
			row.Cells = append(row.Cells, value)
		}
		chi2 := ""
		if p.Dof > 0 {
			chi2 = fixed(p.Chi2/float64(p.Dof), 3)
		}
		if len(p.Warnings) > 0 || p.Status != "" && p.Status != "converged" {
			row.Class = "flagged"
		}
		row.Cells = append(row.Cells, chi2, label(p.Status))
		g.Rows = append(g.Rows, row)
	}
	return []block{{Grid: g}}
}
