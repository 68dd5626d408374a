package recipe

import (
	"errors"
	"fmt"
	"strings"

	"rimlight/runner/unit"
)

// roles are the quantities of a light-curve table that every file has; other
// names in a column table are those of auxiliaries.
var roles = []string{"TIME", "FLUX", "FLUX_ERR", "WAVE_LO", "WAVE_HI"}

func (p *parsing) column(r row) {
	role, in, hdu, name, off := r.cell("column"), r.cell("input"), r.cell("hdu"), r.cell("name"), r.cell("offset")
	c := Column{
		Pos:   p.text.pos(role.start),
		Role:  role.text,
		Input: in.text,
		HDU:   hdu.text,
		Name:  name.text,
		Unit:  p.unit(r.cell("unit")),
		About: r.cell("about").text,
	}
	expected := "expected " + strings.Join(roles, ", ") + ", or the name of an auxiliary such as X"
	switch near := roleMeant(c.Role); {
	case c.Role == "":
		p.add(role.start, "the column has no name in the light-curve table", expected, "")
		return
	case near != "" && near != c.Role:
		p.add(role.start, fmt.Sprintf("there is no column %s in a light-curve table", c.Role), expected, near)
		return
	case !word(c.Role, "_-."):
		p.add(role.start, fmt.Sprintf("%s is no name of a column", quote(c.Role)), expected, "")
		return
	}
	if r.has("name") && c.Name == "" {
		p.add(name.start, fmt.Sprintf("it is not said which column of the file holds %s", c.Role), "expected the column's name in the file", "")
	}
	if off.text != "" {
		x, err := number(off.text)
		if err != nil {
			p.add(off.start, fmt.Sprintf("the offset %s is not right: %v", quote(off.text), err), "expected a number such as 2450000", "")
		}
		c.Offset = x
	}
	p.columnUnit(c, r.cell("unit"))
	key := [2]string{c.Input, c.Role}
	if first, ok := p.roles[key]; ok {
		p.add(role.start, fmt.Sprintf("the column %s already has a place at line %d", c.Role, first.Line), "expected each column once for each input", "")
		return
	}
	p.roles[key] = c.Pos
	p.r.Columns = append(p.r.Columns, c)
	p.columnInputs = append(p.columnInputs, in)
}

// roleMeant is the role that a name stands for when case and punctuation do
// not count, "" for none.
func roleMeant(name string) string {
	bare := func(s string) string {
		return strings.NewReplacer("_", "", "-", "", ".", "").Replace(strings.ToUpper(s))
	}
	for _, r := range roles {
		if bare(r) == bare(name) {
			return r
		}
	}
	return ""
}

// columnUnit checks that times are in a unit of time and wavelengths in a unit
// of length.
func (p *parsing) columnUnit(c Column, at cell) {
	if c.Unit == "" {
		return
	}
	want := ""
	switch c.Role {
	case "TIME":
		want = "d"
	case "WAVE_LO", "WAVE_HI":
		want = "um"
	default:
		return
	}
	if _, ok := convert(c.Unit, want); !ok {
		p.add(at.start, fmt.Sprintf("the column %s cannot be in %s", c.Role, c.Unit), "expected a unit that converts to "+want, "")
	}
}

// checkColumns looks up the inputs that columns belong to, once all are known.
func (p *parsing) checkColumns() {
	var known []string
	layout := map[string]string{}
	for _, in := range p.r.Inputs {
		layout[in.Name] = in.Layout
		if hasColumns(in.Layout) {
			known = append(known, in.Name)
		}
	}
	for i, c := range p.r.Columns {
		at := p.columnInputs[i]
		l, ok := layout[c.Input]
		switch {
		case c.Input == "":
		case !ok:
			p.add(at.start, fmt.Sprintf("there is no input %s", quote(c.Input)), "expected the name of a light-curve table, or nothing for all of them", p.nearest(c.Input, known))
		case !hasColumns(l):
			p.add(at.start, fmt.Sprintf("the input %s is a %s: its columns have no choice of place", c.Input, l), "expected the name of a light-curve table, or nothing for all of them", "")
		}
	}
}

// unit checks a unit cell and gives its text.
func (p *parsing) unit(c cell) string {
	var fault *unit.SyntaxError
	if _, err := unit.Parse(c.text); errors.As(err, &fault) {
		p.add(c.start, fault.Message(), fault.Expected, fault.Nearest)
	}
	return c.text
}

// convert gives the factor between two units, of which wrong ones have been
// complained about: ok is then true and the factor 1.
func convert(from, to string) (f float64, ok bool) {
	f, err := unit.Factor(from, to)
	var fault *unit.SyntaxError
	if errors.As(err, &fault) {
		return 1, true
	}
	return f, err == nil
}
