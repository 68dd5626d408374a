// Package lightcurve holds spectroscopic light curves: fluxes of a star as a
// function of time and wavelength channel.
//
// A [Cube] is a whole time series of extracted spectra, a [Curve] is the time
// series of one channel (or of the white-light sum), a [Channel] is a
// wavelength interval, and a [Series] is one further quantity per integration,
// such as a pointing offset. A sample that must not be used is masked, never
// replaced: its [Flag] says why.
//
// No function writes into what it is given. What a function of cleaning leaves
// as it is, its result shares with its argument, so that masking a cube does not
// take the memory of a second one; whoever wants to write into fluxes or errors
// has a copy made first, see [Cube.Clone].
//
// Units: times are BJD_TDB in days, wavelengths micrometres; fluxes and their
// errors share one unit, instrumental or relative.
package lightcurve

// Flag says why a sample is masked. Zero means that the sample is used;
// reasons add up bit by bit.
type Flag = uint8

// Reasons for masking a sample.
const (
	Missing  Flag = 1 << iota // the flux or its error is NaN or infinite
	Zero                      // the flux is exactly zero: nothing was recorded
	Negative                  // the flux is below zero, or the error is not above zero
	Outlier                   // far from its neighbours in time or wavelength
	Excluded                  // left out on purpose (a time range, a channel)
)

// A Channel is a wavelength interval [Lo, Hi) in micrometres, Lo < Hi. Index
// is its position in the input file, from 0; -1 stands for the white light
// curve.
type Channel struct {
	Index int
	Lo    float64
	Hi    float64
}

// A Series is one auxiliary quantity, one value per integration, for example a
// detector position or an airmass. Name is the column's name in the file, Unit
// a FITS-standard unit string (empty for a pure number).
type Series struct {
	Name  string
	Unit  string
	Value []float64
}

// A Cube is a time series of spectra of n integrations and m channels.
type Cube struct {
	Time     []float64   // mid-integration times, BJD_TDB, days; length n, increasing
	Channels []Channel   // length m, in order of increasing wavelength
	Flux     [][]float64 // m slices of n fluxes
	Err      [][]float64 // m slices of n errors, one standard deviation
	Mask     [][]Flag    // m slices of n flags; 0 marks a usable sample
	Aux      []Series    // further quantities, each of length n
}

// A Curve is one light curve of n integrations.
type Curve struct {
	Channel Channel
	Time    []float64 // BJD_TDB, days; length n, increasing
	Flux    []float64 // length n
	Err     []float64 // length n, one standard deviation
	Mask    []Flag    // length n; 0 marks a usable sample
	Aux     []Series  // each of length n
}
