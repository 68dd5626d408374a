package unit

import (
	"math"
	"strconv"
	"strings"

	"rimlight/runner/diag"
)

// A definition is a named unit in terms of the dimensions.
type definition struct {
	name     string
	mantissa float64
	exponent int    // of ten
	of       string // product of dimensions, as "m2 kg s-2"
	prefix   bool   // may carry a prefix
}

// definitions are the units of the standard. Conversions are exact by
// definition but for those marked measured.
var definitions = []definition{
	{"m", 1, 0, "m", true},
	{"g", 1, -3, "kg", true},
	{"s", 1, 0, "s", true},
	{"rad", 1, 0, "rad", true},
	{"sr", 1, 0, "rad2", true},
	{"K", 1, 0, "K", true},
	{"A", 1, 0, "A", true},
	{"mol", 1, 0, "mol", true},
	{"cd", 1, 0, "cd", true},

	{"Hz", 1, 0, "s-1", true},
	{"J", 1, 0, "m2 kg s-2", true},
	{"W", 1, 0, "m2 kg s-3", true},
	{"V", 1, 0, "m2 kg s-3 A-1", true},
	{"N", 1, 0, "m kg s-2", true},
	{"Pa", 1, 0, "m-1 kg s-2", true},
	{"C", 1, 0, "s A", true},
	{"Ohm", 1, 0, "m2 kg s-3 A-2", true},
	{"S", 1, 0, "m-2 kg-1 s3 A2", true},
	{"F", 1, 0, "m-2 kg-1 s4 A2", true},
	{"Wb", 1, 0, "m2 kg s-2 A-1", true},
	{"T", 1, 0, "kg s-2 A-1", true},
	{"H", 1, 0, "m2 kg s-2 A-2", true},
	{"lm", 1, 0, "cd rad2", true},
	{"lx", 1, 0, "m-2 cd rad2", true},

	{"deg", math.Pi / 180, 0, "rad", false},
	{"arcmin", math.Pi / 180 / 60, 0, "rad", false},
	{"arcsec", math.Pi / 180 / 3600, 0, "rad", false},
	{"mas", math.Pi / 180 / 3600, -3, "rad", false},

	{"min", 60, 0, "s", false},
	{"h", 3600, 0, "s", false},
	{"d", 86400, 0, "s", false},
	{"a", 31557600, 0, "s", true}, // Julian year of 365.25 d
	{"yr", 31557600, 0, "s", true},

	{"eV", 1.602176634, -19, "m2 kg s-2", true},
	{"erg", 1, -7, "m2 kg s-2", false},
	{"Ry", 2.1798723611035, -18, "m2 kg s-2", false}, // measured, CODATA 2018, from memory

	{"solMass", 1.988409870698051, 30, "kg", false}, // measured: nominal GM of IAU 2015 resolution B3 over G of CODATA 2018, from memory
	{"solLum", 3.828, 26, "m2 kg s-3", false},       // nominal, IAU 2015 resolution B3
	{"solRad", 6.957, 8, "m", false},                // nominal, IAU 2015 resolution B3
	{"u", 1.6605390666, -27, "kg", false},           // measured, CODATA 2018, from memory

	{"Angstrom", 1, -10, "m", false},
	{"angstrom", 1, -10, "m", false}, // deprecated spelling
	{"AU", 149597870700, 0, "m", false},
	{"lyr", 9460730472580800, 0, "m", false},
	{"pc", 149597870700 * 648000 / math.Pi, 0, "m", true},

	{"count", 1, 0, "ct", false},
	{"ct", 1, 0, "ct", false},
	{"photon", 1, 0, "ph", false},
	{"ph", 1, 0, "ph", false},
	{"electron", 1, 0, "electron", false}, // not in the standard's table
	{"pixel", 1, 0, "pix", false},
	{"pix", 1, 0, "pix", false},
	{"adu", 1, 0, "adu", false},

	{"Jy", 1, -26, "kg s-2", true},
	{"mag", 1, 0, "mag", true},
	{"R", 1 / (4 * math.Pi), 10, "ph m-2 s-1 rad-2", true},
	{"G", 1, -4, "kg s-2 A-1", true},
	{"barn", 1, -28, "m2", true},
	{"D", 1 / 2.99792458, -29, "m s A", false}, // 1e-18 statC cm

	{"bit", 1, 0, "bit", true},
	{"byte", 8, 0, "bit", true},
	{"bin", 1, 0, "bin", false},
	{"chan", 1, 0, "chan", false},
	{"voxel", 1, 0, "voxel", false},
	{"beam", 1, 0, "beam", false},
	{"Sun", 1, 0, "Sun", false}, // relative to the Sun
}

// prefixes are the SI prefixes with their power of ten.
var prefixes = []struct {
	name     string
	exponent int
}{
	{"da", 1}, {"d", -1}, {"c", -2}, {"h", 2}, {"m", -3}, {"k", 3}, {"u", -6}, {"M", 6}, {"n", -9}, {"G", 9},
	{"p", -12}, {"T", 12}, {"f", -15}, {"P", 15}, {"a", -18}, {"E", 18}, {"z", -21}, {"Z", 21}, {"y", -24}, {"Y", 24},
}

// lookup finds a unit name, with or without a prefix. A plain name wins over a
// prefixed one: "Pa" is no peta-year, "cd" no hundredth of a day.
func lookup(name string) (Unit, bool) {
	for _, d := range definitions {
		if d.name == name {
			return d.unit(0), true
		}
	}
	for _, p := range prefixes {
		rest, ok := strings.CutPrefix(name, p.name)
		if !ok {
			continue
		}
		for _, d := range definitions {
			if d.prefix && d.name == rest {
				return d.unit(p.exponent), true
			}
		}
	}
	return Unit{}, false
}

func (d definition) unit(exponent int) Unit {
	u := Unit{mantissa: d.mantissa, exponent: d.exponent + exponent}
	for _, factor := range strings.Fields(d.of) {
		base := strings.TrimRight(factor, "-0123456789")
		power := 1
		if base != factor {
			power, _ = strconv.Atoi(factor[len(base):])
		}
		for i, name := range dims {
			if name == base {
				u.dim[i] += float64(power)
			}
		}
	}
	return u
}

// nearest suggests a name for one that is not known, "" when none is close.
func nearest(name string) string {
	if m, ok := meant[strings.ToLower(name)]; ok {
		return m
	}
	known := []string{"um", "nm", "cm", "mm", "km", "kg", "ms", "mmag", "mJy"}
	for _, d := range definitions {
		known = append(known, d.name)
	}
	return diag.Nearest(name, known)
}

// meant maps what people write to the name that the standard has.
var meant = map[string]string{
	"day": "d", "days": "d", "jd": "d", "bjd": "d", "mjd": "d", "bjd_tdb": "d",
	"hour": "h", "hours": "h", "hr": "h", "hrs": "h",
	"minute": "min", "minutes": "min", "mins": "min",
	"sec": "s", "secs": "s", "second": "s", "seconds": "s",
	"year": "yr", "years": "yr",
	"metre": "m", "metres": "m", "meter": "m", "meters": "m",
	"micron": "um", "microns": "um", "micrometre": "um", "micrometer": "um", "µm": "um", "μm": "um",
	"nanometre": "nm", "nanometer": "nm", "å": "Angstrom", "angstroms": "Angstrom", "aa": "Angstrom",
	"degree": "deg", "degrees": "deg", "°": "deg", "radian": "rad", "radians": "rad",
	"kelvin": "K", "electrons": "electron", "e-": "electron", "counts": "ct", "cts": "ct", "photons": "ph",
	"pixels": "pix", "px": "pix", "dn": "adu", "magnitude": "mag", "magnitudes": "mag",
	"msun": "solMass", "m_sun": "solMass", "rsun": "solRad", "r_sun": "solRad", "lsun": "solLum", "l_sun": "solLum",
}
