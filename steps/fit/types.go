package fit

import "rimlight/steps/lightcurve"

// Kinds of prior, in the notation of a recipe's parameter table.
const (
	Uniform         = "U"    // U(A, B): flat between A and B
	Normal          = "N"    // N(A, B): Gaussian of mean A and standard deviation B
	TruncatedNormal = "TN"   // TN(A, B, Lo, Hi): Gaussian of mean A and standard deviation B, cut to [Lo, Hi]
	LogUniform      = "logU" // logU(A, B): flat in the logarithm between A > 0 and B
	Fixed           = "="    // = A: held at A
)

// A Prior is what is known of a parameter before the fit. Numbers are in Unit,
// as the recipe's table gives them.
type Prior struct {
	Name string // the parameter, for example "radiusRatio"
	Kind string // one of the kinds above
	A    float64
	B    float64
	Lo   float64 // lower end of TN; 0 for other kinds
	Hi   float64 // upper end of TN; 0 for other kinds
	Unit string  // FITS-standard unit string, empty for a pure number
}

// Priors is a parameter table, in its order.
type Priors []Prior

// A Posterior summarises a fit: best values, standard deviations and
// covariance of the parameters that were free, and what was held. The coefficients
// of the trend come after the other parameters, those of the noise last.
type Posterior struct {
	Names      []string    // free parameters, then none of the held ones
	Units      []string    // unit of each free parameter
	Value      []float64   // maximum of the posterior
	Err        []float64   // standard deviation of each, the root of the diagonal of Cov
	Cov        [][]float64 // covariance
	Held       []Prior     // parameters held fixed, Kind Fixed
	Derived    []Quantity  // quantities computed from the parameters, with propagated errors
	Chi2       float64
	Dof        int
	Samples    int      // samples fitted
	Iterations int      // of the optimiser
	Status     string   // "converged", or how it ended otherwise
	Warnings   []string // parameters at a bound, degenerate pairs
	Model      Model    // what was fitted
}

// A Quantity is a named number with its standard deviation.
type Quantity struct {
	Name  string
	Value float64
	Err   float64
	Unit  string
	About string
}

// A CurveFit is a light curve beside the model fitted to it. All slices have
// the length of the input curve; masked samples keep their place.
type CurveFit struct {
	Channel lightcurve.Channel
	Time    []float64         // BJD_TDB, days
	Flux    []float64         // as given, divided by Level, less Added
	Err     []float64         // as used in the fit, divided by Level
	Mask    []lightcurve.Flag // 0 marks a sample that was fitted
	Transit []float64         // transit model, 1 out of transit
	Trend   []float64         // systematics model, relative to Level; Flux is about Transit times Trend
	Added   []float64         // what the systematics model adds to the light of the star, relative to Level
	Level   float64           // baseline flux in the curve's own unit
	Mid     float64           // fitted or held mid-transit time, BJD_TDB, days; NaN when a model of the recipe has none
}
