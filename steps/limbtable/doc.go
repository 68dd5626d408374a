// Package limbtable holds limb darkening by wavelength, as computed from model
// atmospheres, and reads it from files.
//
// A [Table] lists the coefficients of a law for each of its channels, which need
// not be the channels of the light curves: [Table.At] averages over any interval.
//
// [Intensities] are what a model atmosphere gives before that: the intensity by
// wavelength and mu. Through a [Throughput] and over a channel they make a
// [Profile], the intensity by mu in one band; a law is fitted to it as a [Choice]
// says, and [Coefficients] does all of this for all channels.
package limbtable
