// Package compress gives posteriors of many light curves that share the orbit of
// their transit, such as the channels of a spectrograph, at a cost per evaluation of
// the likelihood that does not depend on how many integrations there are.
//
// # Model
//
// The deficit f of a light curve is a sum of a few functions of time,
//
//	f(t) = Σ φ_a(r, u) F_a(t),
//
// where r is the radius ratio and u are the limb-darkening coefficients: for a fixed
// orbit each term of the limb-darkening law is interpolated in r by Chebyshev
// polynomials, and the coefficients of those, which are functions of time alone, are
// rotated onto as few of them as matter ([Deficits]). The interpolated curve is used
// throughout, so that what is computed is the exact likelihood of a slightly other
// light curve. By how much it differs is measured when a table is made, in units of
// the noise, and tables that differ too much are split.
//
// Data y with weights w (one over the variance) are described by y = (1-f) B s, B the
// columns of the systematics and s their coefficients, which enter linearly. With
// X - f Y the columns of that model and the residual against a flat one, the matrix
//
//	G = (X - fY)' W (X - fY) = G0 - Σ φ_a G1_a + Σ φ_a φ_b G2_ab
//
// holds all the likelihood needs: its Cholesky factor gives the chi-square at the best
// s, and the determinant that belongs to the integral over s ([Tables]). G0, G1 and
// G2 are sums over the samples, made once for each light curve, or once for all that
// have the same weights. Columns that add to the star rather than multiply it have
// no share in Y.
//
// # Settling time
//
// The e-folding time of an exponential settling enters nonlinearly, and data often
// say little about it. It is integrated over by a Gauss-Legendre rule in its
// logarithm, whose range is narrowed to where the posterior is ([family], nodes.go).
// With a prior on coefficients that is flat, the integral over s would prefer times
// at which the exponential cannot be told from the other columns, only because its
// coefficient may then be anything. Therefore coefficients have the Jeffreys prior
// given the time, flat in the light curves they make rather than in the coefficients.
//
// # Draws
//
// At each node the posterior in r and u is close to normal in coordinates in which the
// prior is a standard normal distribution (probit coordinates of bounded parameters).
// Draws are from t distributions of five degrees of freedom about the modes, shared
// out over the nodes by their probability, and weighted by importance with smoothed
// weights (Vehtari et al. 2024). Where k-hat says that this fails, proposals are
// fitted again to the draws; then an ensemble of walkers samples the same likelihood.
package compress
