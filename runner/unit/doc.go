// Package unit reads unit strings as the FITS standard writes them and
// converts between units of the same dimension.
//
// A unit string is a product of unit names with exponents: "d", "um",
// "m s-1", "10**-3 adu", "erg/s/cm2". The names, prefixes and notation are
// those of the FITS standard 4.0, section 4.3 and its tables of base, derived
// and additional units, as recalled and as astropy's reader of the "fits"
// format takes them; a test compares the two. A group in parentheses takes no
// exponent, and everything after a slash up to the next one is below the
// fraction bar, so that "J/m2 s" is J m-2 s-1.
//
// Two differences from astropy: the functions log, ln and exp are read, since
// the standard has them, and "electron" is a name, since detectors count
// electrons and the standard lets files name quantities that it does not list.
// The empty string is a pure number. There is no percent and no ppm: the
// standard has neither, and a plain fraction says the same.
package unit
