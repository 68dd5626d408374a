package unit

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"
)

// MaxLen is the longest unit string that is read, in bytes. A FITS header
// card holds 68.
const MaxLen = 200

// A SyntaxError says what is wrong with a unit string.
type SyntaxError struct {
	Unit     string
	Offset   int    // byte in Unit at which the fault lies
	Reason   string // what is wrong there; may be empty
	Expected string // what was expected
	Nearest  string // the unit name that may have been meant; may be empty
}

// Error gives the whole message on one line.
func (e *SyntaxError) Error() string {
	s := e.Message() + "; " + e.Expected
	if e.Nearest != "" {
		s += "; nearest known name: " + e.Nearest
	}
	return s
}

// Message says what is wrong, without what was expected.
func (e *SyntaxError) Message() string {
	s := "unit " + quote(e.Unit) + " is not a FITS-standard unit string"
	if e.Reason != "" {
		s += ": " + e.Reason
	}
	return s
}

const expected = "expected units such as d, um, m s-1"

// Parse reads a unit string. The error is a [*SyntaxError].
func Parse(s string) (Unit, error) {
	text := strings.TrimSpace(s)
	p := &parser{s: text}
	u, err := p.whole()
	if err != nil {
		err.Unit = text
		return Unit{}, err
	}
	u.text = text
	return u, nil
}

// A parser reads a unit string by recursive descent:
//
//	whole    = "" | [ ten [ mul | div ] ] [ quotient ]
//	quotient = [ product ] { div product }
//	product  = factor { [ mul ] factor }
//	factor   = name [ power ] | "(" quotient ")" | function "(" quotient ")"
//	ten      = "10" ( ( "**" | "^" ) signed | sign digits )
//	power    = ( "**" | "^" ) ( integer | "(" number ")" ) | integer | "(" number ")"
//	number   = integer | decimal | integer "/" digits
//
// with mul one of "*", ".", blank, and div "/".
type parser struct {
	s string
	i int
}

func one() Unit { return Unit{mantissa: 1} }

func (p *parser) whole() (Unit, *SyntaxError) {
	if len(p.s) > MaxLen {
		return Unit{}, p.fail(fmt.Sprintf("it has %d bytes", len(p.s)), fmt.Sprintf("expected at most %d", MaxLen))
	}
	u := one()
	if p.s == "" {
		return u, nil
	}
	if d := p.peek(); d >= '0' && d <= '9' {
		n, err := p.ten()
		if err != nil {
			return Unit{}, err
		}
		u.exponent = n
		p.blanks()
		if p.done() {
			return u, nil
		}
		if !p.take("*") {
			p.take(".")
		}
		p.blanks()
	}
	q, err := p.quotient(0)
	if err != nil {
		return Unit{}, err
	}
	if !p.done() {
		return Unit{}, p.unexpected()
	}
	if q.function != "" && u.exponent != 0 {
		return Unit{}, p.fail("a power of ten stands before a function", expected)
	}
	u = u.times(q)
	u.function = q.function
	if f := u.Scale(); f == 0 || math.IsInf(f, 0) || math.IsNaN(f) {
		return Unit{}, p.fail("its scale is out of the range of numbers", expected)
	}
	return u, nil
}

// ten reads a power of ten.
func (p *parser) ten() (int, *SyntaxError) {
	start := p.i
	digits := p.digits()
	if digits != "10" || p.done() || !strings.ContainsRune("*^+-", rune(p.peek())) {
		p.i = start
		return 0, p.fail("the number "+digits+" is not a unit", "expected scales written as powers of ten, such as 10**3 m")
	}
	if p.take("**") || p.take("^") {
		n, err := p.exponent()
		if err != nil {
			return 0, err
		}
		if n != math.Trunc(n) || math.Abs(n) > 300 {
			p.i = start
			return 0, p.fail("the power of ten is no whole number between -300 and 300", expected)
		}
		return int(n), nil
	}
	n, err := p.integer()
	if err == nil && math.Abs(n) > 300 {
		p.i = start
		err = p.fail("the power of ten is no whole number between -300 and 300", expected)
	}
	return int(n), err
}

func (p *parser) quotient(depth int) (Unit, *SyntaxError) {
	u := one()
	if p.peek() != '/' {
		first, err := p.product(depth)
		if err != nil {
			return Unit{}, err
		}
		u = first
	}
	for {
		p.blanks()
		if !p.take("/") {
			return u, nil
		}
		p.blanks()
		at := p.i
		v, err := p.product(depth)
		if err != nil {
			return Unit{}, err
		}
		if u.function != "" || v.function != "" {
			p.i = at
			return Unit{}, p.fail("a function cannot be multiplied or divided", expected)
		}
		u = u.times(v.raise(-1))
	}
}

func (p *parser) product(depth int) (Unit, *SyntaxError) {
	u, err := p.factor(depth)
	if err != nil {
		return Unit{}, err
	}
	for {
		p.blanks()
		if p.at("**") {
			return Unit{}, p.unexpected()
		}
		times := p.take("*") || p.take(".")
		p.blanks()
		if !times && (p.done() || p.peek() == '/' || p.peek() == ')') {
			return u, nil
		}
		at := p.i
		v, err := p.factor(depth)
		if err != nil {
			return Unit{}, err
		}
		if u.function != "" || v.function != "" {
			p.i = at
			return Unit{}, p.fail("a function cannot be multiplied or divided", expected)
		}
		u = u.times(v)
	}
}

func (p *parser) factor(depth int) (Unit, *SyntaxError) {
	if depth > 8 {
		return Unit{}, p.fail("its parentheses are nested too deeply", expected)
	}
	if p.take("(") {
		return p.group(depth)
	}
	start := p.i
	for !p.done() && letter(p.peek()) {
		p.i++
	}
	name := p.s[start:p.i]
	if name == "" {
		return Unit{}, p.unexpected()
	}
	if p.peek() == '(' {
		switch name {
		case "sqrt":
			p.i++
			u, err := p.group(depth)
			if err == nil && u.function != "" {
				p.i = start
				err = p.fail("a function cannot stand inside sqrt", expected)
			}
			return u.raise(0.5), err
		case "log", "ln", "exp":
			p.i++
			u, err := p.group(depth)
			if err == nil && u.function != "" {
				p.i = start
				err = p.fail("a function cannot stand inside "+name, expected)
			}
			u.function = name
			return u, err
		}
	}
	u, ok := lookup(name)
	if !ok {
		p.i = start
		err := p.fail("", expected)
		if name != p.s {
			err.Reason = fmt.Sprintf("there is no unit %s", quote(name))
		}
		err.Nearest = nearest(name)
		if m, ok := meant[strings.ToLower(p.s)]; ok {
			err.Reason, err.Nearest = "", m
		}
		if n := strings.ToLower(name); n == "percent" || n == "ppm" || n == "ppt" {
			err.Expected, err.Nearest = fraction, ""
		}
		return Unit{}, err
	}
	if p.done() {
		return u, nil
	}
	if p.take("**") || p.take("^") || p.peek() == '(' || digit(p.peek()) || (p.peek() == '+' || p.peek() == '-') {
		n, err := p.exponent()
		if err != nil {
			return Unit{}, err
		}
		if math.Abs(n) > 100 {
			return Unit{}, p.fail("the exponent is beyond 100", expected)
		}
		return u.raise(n), nil
	}
	return u, nil
}

// group reads the rest of a group, after its opening parenthesis.
func (p *parser) group(depth int) (Unit, *SyntaxError) {
	p.blanks()
	u, err := p.quotient(depth + 1)
	if err != nil {
		return Unit{}, err
	}
	if !p.take(")") {
		return Unit{}, p.fail("a parenthesis is not closed", expected)
	}
	if !p.done() && (digit(p.peek()) || strings.ContainsRune("^+-(", rune(p.peek())) || p.at("**")) {
		return Unit{}, p.fail("a group in parentheses takes no exponent", "expected the exponent on each unit, such as m2 s-2")
	}
	return u, nil
}

// exponent reads an integer, or a number in parentheses.
func (p *parser) exponent() (float64, *SyntaxError) {
	if !p.take("(") {
		return p.integer()
	}
	p.blanks()
	start := p.i
	n, err := p.integer()
	if err != nil {
		return 0, err
	}
	switch {
	case p.take("/"):
		d := p.digits()
		v, _ := strconv.ParseFloat(d, 64)
		if v == 0 || len(d) > 6 {
			return 0, p.fail("the exponent is no fraction", "expected exponents such as 2, -1, (1/2)")
		}
		n /= v
	case p.take("."):
		p.digits()
		v, perr := strconv.ParseFloat(p.s[start:p.i], 64)
		if perr != nil {
			return 0, p.fail("the exponent is no number", "expected exponents such as 2, -1, (1/2)")
		}
		n = v
	}
	p.blanks()
	if !p.take(")") {
		return 0, p.fail("a parenthesis is not closed", "expected exponents such as 2, -1, (1/2)")
	}
	return n, nil
}

// integer reads digits with an optional sign.
func (p *parser) integer() (float64, *SyntaxError) {
	start := p.i
	if !p.take("-") {
		p.take("+")
	}
	d := p.digits()
	if d == "" || len(d) > 6 {
		p.i = start
		return 0, p.fail(fmt.Sprintf("there is no whole number after %s", quote(p.s[:start])), "expected exponents such as 2, -1, (1/2)")
	}
	n, _ := strconv.ParseFloat(p.s[start:p.i], 64)
	return n, nil
}

func (p *parser) digits() string {
	start := p.i
	for !p.done() && digit(p.s[p.i]) {
		p.i++
	}
	return p.s[start:p.i]
}

func (p *parser) done() bool { return p.i >= len(p.s) }

func (p *parser) peek() byte {
	if p.done() {
		return 0
	}
	return p.s[p.i]
}

func (p *parser) at(s string) bool { return strings.HasPrefix(p.s[p.i:], s) }

func (p *parser) take(s string) bool {
	if !p.at(s) {
		return false
	}
	p.i += len(s)
	return true
}

func (p *parser) blanks() {
	for p.peek() == ' ' {
		p.i++
	}
}

const fraction = "expected a plain fraction and an empty unit: 1 % is 0.01, 1 ppm is 1e-6"

func (p *parser) unexpected() *SyntaxError {
	if p.done() {
		return p.fail("it ends in the middle", expected)
	}
	if p.peek() == '%' {
		return p.fail("", fraction)
	}
	err := p.fail("", expected)
	err.Nearest = meant[strings.ToLower(p.s)]
	if err.Nearest == "" {
		r, _ := utf8.DecodeRuneInString(p.s[p.i:])
		err.Reason = fmt.Sprintf("unexpected %q", r)
	}
	return err
}

func (p *parser) fail(reason, expected string) *SyntaxError {
	return &SyntaxError{Offset: p.i, Reason: reason, Expected: expected}
}

func digit(c byte) bool { return c >= '0' && c <= '9' }

func letter(c byte) bool { return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' }
