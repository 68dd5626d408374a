// Package limbtable holds limb-darkening coefficients by wavelength, as computed
// from model atmospheres, and reads them from files.
//
// A [Table] lists two coefficients for each of its channels, which need not be
// the channels of the light curves: [Table.At] averages over any interval.
package limbtable
