// Package noise describes what is left of a light curve when its model has been
// taken off, and weighs residuals by it.
//
// A [Model] is data: white noise, whose errors may be scaled and to which a
// jitter may be added in quadrature, and a sum of correlated parts, each a
// stationary Gaussian process ([Term]). It names its parameters
// ([Model.Parameters]), by which priors are given to them, and prints itself as
// an equation ([Model.Equation]).
//
// A [Process] is a model at the times of a light curve. It gives the logarithm of
// the likelihood of residuals with its gradient, by the parameters and by the
// residuals themselves, so that the gradient of a mean model follows by the chain
// rule. At given values of the parameters it is a [Covariance], which whitens,
// solves, predicts, draws noise and fits linear models (generalised least
// squares).
//
// Parts that depend on time alone, through the exponential, Matérn-3/2 or damped
// oscillator kernel, cost time in proportion to the number of samples. All others
// take a dense matrix, of at most 2000 samples.
//
// Besides, the package has what the trade uses without a covariance: time
// averaging ([AverageTable], [TimeAveraging]), residual permutation ([Shift]), the
// wavelet likelihood of 1/f noise ([Wavelet]), and the photon noise that a
// channel could reach ([Detector.Expected]).
//
// # What white errors cost
//
// The depth and the level of a trapezoidal transit of 2 h, in the middle of 8 h
// sampled every 2 min, were fitted to 2000 simulated series of white and red noise of
// equal standard deviation, by generalised least squares with the model that made
// the noise; and with white errors, inflated to make the reduced χ² one. So often did
// intervals hold the true depth:
//
//	red noise                        matching model     white errors       their length
//	Matérn-3/2, 20 min               69.0% and 95.1%    24.0% and 44.9%    0.35
//	exponential, 20 min              68.8% and 95.1%    26.4% and 48.5%    0.37
//	oscillator, 1 h, Q = 1/√2        68.6% and 94.8%    28.8% and 53.3%    0.39
//	expected                         68.3% and 95.0%    68.3% and 95.0%    1
//
// The last column is the length of intervals from white errors over that from the
// matching model. The parameters of the noise were known; where they are fitted,
// let them vary together with the depth.
package noise
