package unit

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// dims are the independent dimensions that units are made of. A steradian is
// a squared radian; things that are counted are dimensions of their own, so
// that electrons are not mistaken for photons.
var dims = [...]string{
	"m", "kg", "s", "rad", "K", "A", "mol", "cd",
	"ct", "ph", "electron", "adu", "pix", "mag", "bit", "bin", "chan", "voxel", "beam", "Sun",
}

type powers [len(dims)]float64

// A Unit is a parsed unit string. Units come from [Parse]; Parse("") is the
// unit of a pure number.
type Unit struct {
	text     string
	mantissa float64 // the scale without its power of ten
	exponent int     // of that power
	dim      powers
	function string // log, ln or exp of the rest; "" for none
}

// String gives the unit as it was written, without surrounding blanks.
func (u Unit) String() string { return u.text }

// Scale is the size of the unit in the product of SI base units, radians and
// counted things that it stands for: 60 for "min", 1e-6 for "um". For a
// function such as log(Hz) it is that of the unit inside.
func (u Unit) Scale() float64 { return u.mantissa * math.Pow10(u.exponent) }

// IsNumber reports whether the unit is that of a pure number, whatever its
// scale.
func (u Unit) IsNumber() bool { return u.dim == powers{} && u.function == "" }

// Compatible reports whether quantities in u can be given in v.
func (u Unit) Compatible(v Unit) bool {
	if u.function != v.function {
		return false
	}
	for i := range u.dim {
		if math.Abs(u.dim[i]-v.dim[i]) > 1e-9 {
			return false
		}
	}
	// log(kHz) and log(Hz) differ by an offset, not by a factor.
	return u.function == "" || u.Scale() == v.Scale()
}

// Dimension writes what the unit measures in base units, for example
// "m kg s-2"; "a pure number" when nothing is left.
func (u Unit) Dimension() string {
	var parts []string
	for i, p := range u.dim {
		switch {
		case p == 1:
			parts = append(parts, dims[i])
		case p == math.Trunc(p) && p != 0:
			parts = append(parts, dims[i]+strconv.Itoa(int(p)))
		case p != 0:
			parts = append(parts, dims[i]+"("+strconv.FormatFloat(p, 'g', 4, 64)+")")
		}
	}
	s := strings.Join(parts, " ")
	switch {
	case u.function != "":
		return u.function + "(" + s + ")"
	case s == "":
		return "a pure number"
	}
	return s
}

// Factor returns the number that a quantity in the unit from is multiplied
// with to give it in the unit to: Factor("h", "d") is 1/24. It is an error
// when either is not a unit string, or when they measure different things.
func Factor(from, to string) (float64, error) {
	u, err := Parse(from)
	if err != nil {
		return 0, err
	}
	v, err := Parse(to)
	if err != nil {
		return 0, err
	}
	if !u.Compatible(v) {
		return 0, fmt.Errorf("cannot convert %s (%s) to %s (%s)", quote(u.text), u.Dimension(), quote(v.text), v.Dimension())
	}
	// Powers of ten are kept apart, so that um to Angstrom is exactly 1e4.
	f := u.mantissa / v.mantissa * math.Pow10(u.exponent-v.exponent)
	if f == 0 || math.IsInf(f, 0) {
		return 0, fmt.Errorf("the factor from %s to %s is out of the range of numbers", quote(u.text), quote(v.text))
	}
	return f, nil
}

// raise returns u to the power p.
func (u Unit) raise(p float64) Unit {
	ten := float64(u.exponent) * p
	whole := math.Trunc(ten)
	u.mantissa = math.Pow(u.mantissa, p) * math.Pow(10, ten-whole)
	u.exponent = int(whole)
	for i := range u.dim {
		u.dim[i] *= p
	}
	return u
}

// times returns the product of u and v.
func (u Unit) times(v Unit) Unit {
	u.mantissa = u.mantissa * v.mantissa
	u.exponent += v.exponent
	for i := range u.dim {
		u.dim[i] += v.dim[i]
	}
	return u
}

func quote(s string) string {
	const most = 60
	if len(s) > most {
		s = strings.ToValidUTF8(s[:most], "") + "…"
	}
	return strconv.Quote(s)
}
