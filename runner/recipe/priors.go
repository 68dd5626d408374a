package recipe

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"rimlight/runner/diag"
	"rimlight/steps/fit"
)

// A priorKind is a kind of prior with its arguments.
type priorKind struct {
	kind string
	form string
	args int
}

var priorKinds = []priorKind{
	{fit.Uniform, "U(a, b)", 2},
	{fit.Normal, "N(mean, sd)", 2},
	{fit.TruncatedNormal, "TN(mean, sd, a, b)", 4},
	{fit.LogUniform, "logU(a, b)", 2},
	{fit.Fixed, "= x", 1},
}

const priorForms = "expected U(a, b), N(mean, sd), TN(mean, sd, a, b), logU(a, b) or = x"

// calledAlso maps other names of priors to the notation.
var calledAlso = map[string]string{
	"uniform": "U", "flat": "U", "normal": "N", "gaussian": "N", "gauss": "N", "g": "N",
	"truncatednormal": "TN", "truncnorm": "TN", "loguniform": "logU", "lu": "logU", "jeffreys": "logU", "fixed": "=",
}

// openPriors begins the parameter table of a section, unless it has one.
func (p *parsing) openPriors(header cell) bool {
	index := len(p.r.Sections) - 1
	if first, ok := p.priors[index]; ok {
		p.add(header.start, fmt.Sprintf("the section already has a parameter table, at line %d", first.Line),
			"expected one parameter table in a section, or a heading between the two", "")
		return false
	}
	p.priors[index] = p.text.pos(header.start)
	p.section().Priors = []Prior{}
	p.parameters = map[string]diag.Pos{}
	return true
}

func (p *parsing) prior(r row) {
	name, notation := r.cell("parameter"), r.cell("prior")
	pr := Prior{
		Pos:      p.text.pos(name.start),
		Name:     name.text,
		Unit:     p.unit(r.cell("unit")),
		About:    r.cell("about").text,
		PriorPos: p.text.pos(notation.start),
	}
	switch first, taken := p.parameters[pr.Name]; {
	case pr.Name == "":
		p.add(name.start, "the parameter has no name", "expected the name of a parameter, such as radiusRatio", "")
		return
	case !word(pr.Name, "_.^[]"):
		p.add(name.start, fmt.Sprintf("%s cannot name a parameter", quote(pr.Name)), "expected a letter, then letters and digits, such as radiusRatio", "")
		return
	case taken:
		p.add(name.start, fmt.Sprintf("the parameter %s already has a prior at line %d", pr.Name, first.Line), "expected each parameter once in a section", "")
		return
	}
	p.parameters[pr.Name] = pr.Pos
	if !r.has("prior") || !p.notation(&pr, notation) {
		return
	}
	s := p.section()
	s.Priors = append(s.Priors, pr)
}

// notation reads U(a, b) and its like into pr.
func (p *parsing) notation(pr *Prior, c cell) bool {
	s := c.text
	if s == "" {
		p.add(c.start, fmt.Sprintf("the parameter %s has no prior", pr.Name), priorForms, "")
		return false
	}
	if rest, ok := strings.CutPrefix(s, "="); ok {
		pr.Kind = fit.Fixed
		t, err := p.term(rest, c, 1)
		if err != nil {
			return false
		}
		pr.Terms = []Term{t}
		return true
	}
	name, inside, open := strings.Cut(s, "(")
	name = strings.TrimSpace(name)
	kind, ok := priorKindOf(name)
	if !ok || kind.kind == fit.Fixed {
		if _, err := readTerm(s); err == nil && !open {
			p.add(c.start, fmt.Sprintf("%s is no prior", quote(s)), fmt.Sprintf("expected = %s to hold %s there, or %s", s, pr.Name, strings.TrimPrefix(priorForms, "expected ")), "")
			return false
		}
		near := calledAlso[strings.ToLower(strings.ReplaceAll(strings.ReplaceAll(name, "-", ""), "_", ""))]
		if near == "" {
			near = p.nearest(name, []string{"U", "N", "TN", "logU"})
		}
		p.add(c.start, fmt.Sprintf("there is no prior %s", quote(name)), priorForms, near)
		return false
	}
	args, closed := strings.CutSuffix(inside, ")")
	if !open || !closed || strings.ContainsAny(args, "()") {
		p.add(c.start, fmt.Sprintf("the prior %s is not complete", quote(s)), "expected "+kind.form, "")
		return false
	}
	parts := strings.Split(args, ",")
	if strings.TrimSpace(args) == "" {
		parts = nil
	}
	if len(parts) != kind.args {
		p.add(c.start, fmt.Sprintf("the prior %s has %s", quote(s), count(len(parts), "number")), "expected "+kind.form, "")
		return false
	}
	pr.Kind = kind.kind
	at := strings.IndexByte(s, '(') + 1
	good := true
	for _, part := range parts {
		t, err := p.term(part, c, at)
		at += len(part) + 1
		good = good && err == nil
		pr.Terms = append(pr.Terms, t)
	}
	if !good {
		return false
	}
	if fault, expected := pr.fault(pr.known); fault != "" {
		p.add(c.start, fmt.Sprintf("the prior %s of %s is not right: %s", quote(s), pr.Name, fault), expected, "")
		return false
	}
	return true
}

func priorKindOf(kind string) (priorKind, bool) {
	for _, k := range priorKinds {
		if k.kind == kind {
			return k, true
		}
	}
	return priorKind{}, false
}

// term reads one number of a prior, which begins at byte at of the cell's text.
func (p *parsing) term(s string, c cell, at int) (Term, error) {
	start := c.offset(at + len(s) - len(strings.TrimLeft(s, " \t")))
	t, err := readTerm(strings.TrimSpace(s))
	t.Pos = p.text.pos(start)
	if err != nil {
		p.add(start, fmt.Sprintf("%s is not a number of a prior: %v", quote(strings.TrimSpace(s)), err), "expected a number, or a setting plus or minus a number, such as midTransit - 0.02", "")
	}
	return t, err
}

// readTerm reads "0.05", "period" or "midTransit - 0.02".
func readTerm(s string) (Term, error) {
	if s == "" {
		return Term{}, errors.New("it is empty")
	}
	x, err := number(s)
	if err == nil {
		return Term{Offset: x}, nil
	}
	i := strings.IndexAny(s, "+-\u2212 \t")
	name, rest := s, ""
	if i >= 0 {
		name, rest = s[:i], strings.TrimSpace(s[i:])
	}
	if err != errNoNumber || !word(name, "_") {
		return Term{}, err
	}
	if rest == "" {
		return Term{Setting: name}, nil
	}
	if strings.HasPrefix(rest, "\u2212") {
		return Term{}, errors.New("it is written with the minus sign U+2212, where a hyphen is expected")
	}
	sign := 1.0
	switch rest[0] {
	case '+':
	case '-':
		sign = -1
	default:
		return Term{}, errNoNumber
	}
	size := strings.TrimSpace(rest[1:])
	if size == "" || size[0] == '+' || size[0] == '-' {
		return Term{}, errNoNumber
	}
	x, err = number(size)
	return Term{Setting: name, Offset: sign * x}, err
}

// A numberOf gives term i of a prior less a common origin. Terms with equal
// origins can be compared.
type numberOf func(i int) (x float64, origin string)

// known is the numberOf what the notation alone tells.
func (pr *Prior) known(i int) (float64, string) { return pr.Terms[i].Offset, pr.Terms[i].Setting }

// fault says what is wrong with the numbers of a prior, as far as they are
// known, and what was expected.
func (pr *Prior) fault(of numberOf) (fault, expected string) {
	ordered := func(i, j int) bool {
		a, from := of(i)
		b, to := of(j)
		return from != to || a < b
	}
	positive := func(i int) bool {
		x, from := of(i)
		return from != "" || x > 0
	}
	switch pr.Kind {
	case fit.Uniform:
		if !ordered(0, 1) {
			return "its upper end is not above its lower end", "expected U(a, b) with a < b"
		}
	case fit.Normal:
		if !positive(1) {
			return "its standard deviation is not above zero", "expected N(mean, sd) with sd > 0"
		}
	case fit.TruncatedNormal:
		if !positive(1) {
			return "its standard deviation is not above zero", "expected TN(mean, sd, a, b) with sd > 0"
		}
		if !ordered(2, 3) {
			return "its upper end is not above its lower end", "expected TN(mean, sd, a, b) with a < b"
		}
	case fit.LogUniform:
		if !positive(0) {
			return "its lower end is not above zero", "expected logU(a, b) with 0 < a < b"
		}
		if !ordered(0, 1) {
			return "its upper end is not above its lower end", "expected logU(a, b) with 0 < a < b"
		}
	}
	return "", ""
}

// checkPriors looks up the settings that priors name, once all are known, and
// leaves out the priors that name wrong ones.
func (p *parsing) checkPriors() {
	settings := map[string]*Setting{}
	var known []string
	for i := range p.r.Settings {
		s := &p.r.Settings[i]
		settings[s.Name] = s
		known = append(known, s.Name)
	}
	for i := range p.r.Sections {
		s := &p.r.Sections[i]
		s.Priors = slices.DeleteFunc(s.Priors, func(pr Prior) bool {
			faults := len(p.diags)
			for _, t := range pr.Terms {
				if t.Setting != "" {
					p.checkTerm(pr, t, settings, known)
				}
			}
			return len(p.diags) > faults
		})
	}
}

func (p *parsing) checkTerm(pr Prior, t Term, settings map[string]*Setting, known []string) {
	s, ok := settings[t.Setting]
	if !ok {
		what := fmt.Sprintf("there is no setting %s", quote(t.Setting))
		if first, ok := p.names[t.Setting]; ok && first.what != "a setting" {
			what = fmt.Sprintf("%s is %s", t.Setting, first.what)
		}
		p.diags.Add(t.Pos, what, "expected a number or the name of a setting", p.nearest(t.Setting, known))
		return
	}
	if kind, err := s.Value.Kind(); err == nil && kind != Number {
		p.diags.Add(t.Pos, fmt.Sprintf("the setting %s is %s", s.Name, kind.article()), "expected a setting that is a number", "")
		return
	}
	if f, ok := convert(s.Unit, pr.Unit); !ok || f != 1 {
		p.diags.Add(t.Pos, fmt.Sprintf("the setting %s is %s, the prior of %s %s", s.Name, inUnit(s.Unit), pr.Name, inUnit(pr.Unit)),
			"expected the same unit in both tables", "")
	}
}

func inUnit(u string) string {
	if u == "" {
		return "a pure number"
	}
	return "in " + u
}

// resolve is the body of [Resolve].
func resolve(priors []Prior, value func(setting string) (float64, bool)) (fit.Priors, diag.List) {
	var diags diag.List
	out := make(fit.Priors, 0, len(priors))
	for _, pr := range priors {
		x := make([]float64, 4)
		good := len(pr.Terms) > 0
		for i, t := range pr.Terms {
			x[i] = t.Offset
			if t.Setting == "" {
				continue
			}
			v, ok := value(t.Setting)
			x[i] += v
			switch {
			case !ok:
				diags.Add(t.Pos, fmt.Sprintf("the setting %s is no number", t.Setting), "expected the name of a setting that is a number", "")
				good = false
			case math.IsInf(x[i], 0) || math.IsNaN(x[i]):
				diags.Add(t.Pos, fmt.Sprintf("the setting %s takes the prior of %s out of the range of numbers", t.Setting, pr.Name), "expected a finite number", "")
				good = false
			}
		}
		if !good {
			continue
		}
		if fault, expected := pr.fault(func(i int) (float64, string) { return x[i], "" }); fault != "" {
			diags.Add(pr.PriorPos, fmt.Sprintf("the prior of %s is not right with the settings filled in: %s", pr.Name, fault), expected, "")
			continue
		}
		q := fit.Prior{Name: pr.Name, Kind: pr.Kind, A: x[0], Unit: pr.Unit}
		if pr.Kind != fit.Fixed {
			q.B = x[1]
		}
		if pr.Kind == fit.TruncatedNormal {
			q.Lo, q.Hi = x[2], x[3]
		}
		out = append(out, q)
	}
	return out, diags
}
