package fit

import (
	"fmt"
	"html"
	"strings"
	"unicode"
)

// An expression is a part of an equation, which can be written as text and as
// MathML (presentation elements of MathML Core).
type expression interface {
	text() string
	mathML() string
}

// symbol is a letter or name, with an index if sub is not empty.
type symbol struct{ name, sub string }

func (s symbol) text() string {
	if s.sub == "" {
		return short(s.name)
	}
	if len(s.sub) == 1 && s.sub[0] <= '9' {
		return short(s.name) + s.sub
	}
	return short(s.name) + "_" + short(s.sub)
}

// short cuts off names that are too long to read.
func short(name string) string { return fmt.Sprintf("%.40s", name) }

func (s symbol) mathML() string {
	name := "<mi>" + escape(s.name) + "</mi>"
	if s.sub == "" {
		return name
	}
	return "<msub>" + name + "<mi>" + escape(s.sub) + "</mi></msub>"
}

// escape makes a name safe to stand in a document.
func escape(name string) string {
	return html.EscapeString(strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return -1
	}, strings.ToValidUTF8(short(name), "")))
}

// call is a function and its arguments; those after the first are parameters.
type call struct {
	name string
	args []expression
}

func (c call) text() string {
	var parts []string
	for _, a := range c.args {
		parts = append(parts, a.text())
	}
	if len(parts) < 2 {
		return c.name + "(" + strings.Join(parts, "") + ")"
	}
	return c.name + "(" + parts[0] + "; " + strings.Join(parts[1:], ", ") + ")"
}

func (c call) mathML() string {
	out := "<mi>" + escape(c.name) + "</mi><mo>(</mo>"
	for i, a := range c.args {
		switch i {
		case 0:
		case 1:
			out += "<mo>;</mo>"
		default:
			out += "<mo>,</mo>"
		}
		out += a.mathML()
	}
	return "<mrow>" + out + "<mo>)</mo></mrow>"
}

// product multiplies; sign is put between factors.
type product struct {
	sign    string
	factors []expression
}

func (p product) text() string {
	var parts []string
	for _, f := range p.factors {
		if s, ok := f.(sum); ok && len(p.factors) > 1 {
			parts = append(parts, "("+s.text()+")")
		} else {
			parts = append(parts, f.text())
		}
	}
	return strings.Join(parts, " "+strings.TrimLeft(p.sign+" ", " "))
}

func (p product) mathML() string {
	between := `<mspace width="0.17em"></mspace>`
	if p.sign != "" {
		between = "<mo>" + p.sign + "</mo>"
	}
	var parts []string
	for _, f := range p.factors {
		if s, ok := f.(sum); ok && len(p.factors) > 1 {
			parts = append(parts, "<mrow><mo>(</mo>"+s.mathML()+"<mo>)</mo></mrow>")
		} else {
			parts = append(parts, f.mathML())
		}
	}
	return "<mrow>" + strings.Join(parts, between) + "</mrow>"
}

// sum adds.
type sum []expression

func (s sum) text() string {
	var parts []string
	for _, e := range s {
		parts = append(parts, e.text())
	}
	return strings.Join(parts, " + ")
}

func (s sum) mathML() string {
	var parts []string
	for _, e := range s {
		parts = append(parts, e.mathML())
	}
	return "<mrow>" + strings.Join(parts, "<mo>+</mo>") + "</mrow>"
}

// power raises to a number.
type power struct {
	base     expression
	exponent string
}

func (p power) text() string {
	base := p.base.text()
	if strings.Contains(base, " ") {
		base = "(" + base + ")"
	}
	return base + "^" + p.exponent
}

func (p power) mathML() string {
	base := p.base.mathML()
	if _, ok := p.base.(symbol); !ok {
		base = "<mrow><mo>(</mo>" + base + "<mo>)</mo></mrow>"
	}
	return "<msup>" + base + "<mn>" + p.exponent + "</mn></msup>"
}

// decay is the exponential of -(t - start)/time.
type decay struct{ start, time symbol }

func (d decay) text() string { return "exp(-(t - " + d.start.text() + ")/" + d.time.text() + ")" }

func (d decay) mathML() string {
	return "<msup><mi>e</mi><mrow><mo>-</mo><mo>(</mo><mi>t</mi><mo>-</mo>" + d.start.mathML() + "<mo>)</mo><mo>/</mo>" + d.time.mathML() + "</mrow></msup>"
}
