package unit

import (
	"errors"
	"math"
	"strings"
	"testing"
)

func TestParse(t *testing.T) {
	for _, c := range []struct {
		in    string
		scale float64
		dim   string
	}{
		{"", 1, "a pure number"},
		{"d", 86400, "s"},
		{"um", 1e-6, "m"},
		{" m  s-1 ", 1, "m s-1"},
		{"m.s", 1, "m s"},
		{"m*s", 1, "m s"},
		{"m**2", 1, "m2"},
		{"m^-2", 1, "m-2"},
		{"m(1.5)", 1, "m(1.5)"},
		{"m**(-3/2)", 1, "m(-1.5)"},
		{"J/m2 s", 1, "kg s-3"},
		{"m/s/kg", 1, "m kg-1 s-1"},
		{"/s", 1, "s-1"},
		{"10**3 m", 1e3, "m"},
		{"10^(-3)m", 1e-3, "m"},
		{"10-3 m", 1e-3, "m"},
		{"10+3", 1e3, "a pure number"},
		{"sqrt(m2 s)", 1, "m s(0.5)"},
		{"sqrt(km)", math.Sqrt(1000), "m(0.5)"},
		{"log(Hz)", 1, "log(s-1)"},
		{"erg/s/cm2/Angstrom", 1e7, "m-1 kg s-3"},
		{"Pa", 1, "m-1 kg s-2"},
		{"cd", 1, "cd"},
		{"min", 60, "s"},
		{"electron", 1, "electron"},
		{"(m s-1)", 1, "m s-1"},
		{"lm", 1, "rad2 cd"},
	} {
		u, err := Parse(c.in)
		if err != nil {
			t.Errorf("%q: %v", c.in, err)
			continue
		}
		if math.Abs(u.Scale()/c.scale-1) > 1e-14 || u.String() != strings.TrimSpace(c.in) {
			t.Errorf("%q: scale %g, want %g", c.in, u.Scale(), c.scale)
		}
		if got := u.Dimension(); !sameFactors(got, c.dim) {
			t.Errorf("%q: dimension %s, want %s", c.in, got, c.dim)
		}
		if number := c.dim == "a pure number"; u.IsNumber() != number {
			t.Errorf("%q: IsNumber is %t", c.in, u.IsNumber())
		}
	}
}

func sameFactors(a, b string) bool {
	set := map[string]bool{}
	for _, f := range strings.Fields(a) {
		set[f] = true
	}
	for _, f := range strings.Fields(b) {
		if !set[f] {
			return false
		}
	}
	return len(strings.Fields(a)) == len(strings.Fields(b))
}

func TestParseRefuses(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{"day", `unit "day" is not a FITS-standard unit string; expected units such as d, um, m s-1; nearest known name: d`},
		{"kg m^-s", `unit "kg m^-s" is not a FITS-standard unit string: there is no whole number after "kg m^"; expected exponents such as 2, -1, (1/2)`},
		{"%", `unit "%" is not a FITS-standard unit string; expected a plain fraction and an empty unit: 1 % is 0.01, 1 ppm is 1e-6`},
		{"ppm", `unit "ppm" is not a FITS-standard unit string; expected a plain fraction and an empty unit: 1 % is 0.01, 1 ppm is 1e-6`},
		{"µm", `unit "µm" is not a FITS-standard unit string; expected units such as d, um, m s-1; nearest known name: um`},
		{"e-", `unit "e-" is not a FITS-standard unit string; expected units such as d, um, m s-1; nearest known name: electron`},
		{"m solmass", `unit "m solmass" is not a FITS-standard unit string: there is no unit "solmass"; expected units such as d, um, m s-1; nearest known name: solMass`},
		{"1000 m", `unit "1000 m" is not a FITS-standard unit string: the number 1000 is not a unit; expected scales written as powers of ten, such as 10**3 m`},
		{"(m/s)2", `unit "(m/s)2" is not a FITS-standard unit string: a group in parentheses takes no exponent; expected the exponent on each unit, such as m2 s-2`},
		{"m s-", `unit "m s-" is not a FITS-standard unit string: there is no whole number after "m s"; expected exponents such as 2, -1, (1/2)`},
		{"m/", `unit "m/" is not a FITS-standard unit string: it ends in the middle; expected units such as d, um, m s-1`},
		{"(m", `unit "(m" is not a FITS-standard unit string: a parenthesis is not closed; expected units such as d, um, m s-1`},
		{"m)", `unit "m)" is not a FITS-standard unit string: unexpected ')'; expected units such as d, um, m s-1`},
		{"10**400", `unit "10**400" is not a FITS-standard unit string: the power of ten is no whole number between -300 and 300; expected units such as d, um, m s-1`},
		{"Ym100", `unit "Ym100" is not a FITS-standard unit string: its scale is out of the range of numbers; expected units such as d, um, m s-1`},
		{"m(1/0)", `unit "m(1/0)" is not a FITS-standard unit string: the exponent is no fraction; expected exponents such as 2, -1, (1/2)`},
		{"log(m) s", `unit "log(m) s" is not a FITS-standard unit string: a function cannot be multiplied or divided; expected units such as d, um, m s-1`},
	} {
		_, err := Parse(c.in)
		if err == nil {
			t.Errorf("%q is accepted", c.in)
			continue
		}
		if err.Error() != c.want {
			t.Errorf("%q:\n got %s\nwant %s", c.in, err, c.want)
		}
		var syntax *SyntaxError
		if !errors.As(err, &syntax) || syntax.Offset < 0 || syntax.Offset > len(c.in) {
			t.Errorf("%q: offset of %#v", c.in, syntax)
		}
	}
	for _, in := range []string{strings.Repeat("m ", 200), strings.Repeat("(", 50) + "m" + strings.Repeat(")", 50), "m**", "m//s", "Kg", "kpix", "m**2**3", "m 10**3", "sqrt(log(m))", "log(log(m))", "10", "1/s", "m*", "*m", "m ** s"} {
		if _, err := Parse(in); err == nil {
			t.Errorf("%q is accepted", in)
		}
	}
}

func TestFactor(t *testing.T) {
	for _, c := range []struct {
		from, to string
		want     float64
	}{
		{"h", "d", 1.0 / 24},
		{"d", "min", 1440},
		{"s", "d", 1.0 / 86400},
		{"Angstrom", "um", 1e-4},
		{"nm", "um", 1e-3},
		{"um", "Angstrom", 1e4},
		{"m", "um", 1e6},
		{"deg", "rad", math.Pi / 180},
		{"count", "ct", 1},
		{"10**-6", "", 1e-6},
		{"electron/s", "electron min-1", 60},
		{"log(Hz)", "log(Hz)", 1},
	} {
		got, err := Factor(c.from, c.to)
		if err != nil || got != c.want {
			t.Errorf("Factor(%q, %q) = %v, %v; want %v", c.from, c.to, got, err, c.want)
		}
	}
	for _, c := range [][2]string{{"d", "m"}, {"electron", "ct"}, {"rad", ""}, {"log(Hz)", "Hz"}, {"log(Hz)", "log(kHz)"}, {"days", "d"}, {"d", "days"}} {
		if f, err := Factor(c[0], c[1]); err == nil {
			t.Errorf("Factor(%q, %q) = %v, want an error", c[0], c[1], f)
		}
	}
	_, err := Factor("d", "um")
	if want := `cannot convert "d" (s) to "um" (m)`; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"", "m s-1", "10**3 erg/s/cm2", "sqrt(m(1/2))", "log(10**-2 Hz)", "kg m^-s", "µm", "10^(", "m(1.)", "((("} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		u, err := Parse(s)
		var syntax *SyntaxError
		switch {
		case errors.As(err, &syntax):
			if syntax.Offset < 0 || syntax.Offset > len(s) || syntax.Expected == "" {
				t.Errorf("%q: bad error %#v", s, syntax)
			}
		case err != nil:
			t.Errorf("%q: error of type %T", s, err)
		default:
			if sc := u.Scale(); !(sc > 0) || math.IsInf(sc, 0) {
				t.Errorf("%q: scale %v", s, sc)
			}
			if !u.Compatible(u) {
				t.Errorf("%q is not compatible with itself", s)
			}
		}
	})
}
