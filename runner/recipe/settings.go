package recipe

import (
	"fmt"
	"strings"
)

func (p *parsing) setting(r row) {
	name, value, also := r.cell("setting"), r.cell("value"), r.cell("also try")
	good := p.name("setting", name)
	s := Setting{
		Pos:      p.text.pos(name.start),
		Name:     name.text,
		Value:    Value{value.text},
		Unit:     p.unit(r.cell("unit")),
		About:    r.cell("about").text,
		ValuePos: p.text.pos(value.start),
	}
	kind := Kind("")
	switch {
	case !r.has("value"):
	case value.text == "":
		p.add(value.start, fmt.Sprintf("the setting %s has no value", s.Name), `expected a value; an empty text is written ""`, "")
	default:
		k, err := s.Value.Kind()
		if err != nil {
			p.add(value.start, fmt.Sprintf("the value of %s is not right: %v", s.Name, err), formOf(s.Value), "")
			break
		}
		kind = k
		if s.Unit != "" && !kind.Numeric() {
			p.add(r.cell("unit").start, fmt.Sprintf("the setting %s is %s and has the unit %s", s.Name, kind.article(), s.Unit), "expected no unit, or a number", "")
		}
	}
	s.AlsoTry = p.alternatives(s.Name, kind, also)
	if good {
		p.r.Settings = append(p.r.Settings, s)
	}
}

// alternatives reads the values to try besides a setting's own, which is of
// the given kind, "" when it is not known.
func (p *parsing) alternatives(name string, kind Kind, c cell) []Value {
	if c.text == "" {
		return nil
	}
	var values []Value
	at := 0
	for _, part := range splitQuoted(c.text, ';') {
		v := Value{bare(part)}
		start := c.offset(at + strings.Index(part, v.Text))
		at += len(part) + 1
		if v.Text == "" {
			p.add(start, fmt.Sprintf("an alternative of %s is missing beside a semicolon", name), "expected alternatives separated by semicolons", "")
			continue
		}
		k, err := v.Kind()
		if err != nil {
			p.add(start, fmt.Sprintf("the alternative %s of %s is not right: %v", quote(v.Text), name, err), formOf(v), "")
			continue
		}
		if kind != "" && !kind.allows(k) {
			p.add(start, fmt.Sprintf("the alternative %s of %s is %s, its value %s", quote(v.Text), name, k.article(), kind.article()),
				"expected alternatives of the kind of the value, separated by semicolons", "")
			continue
		}
		values = append(values, v)
	}
	return values
}
