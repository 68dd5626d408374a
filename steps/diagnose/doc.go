// Package diagnose holds fits and spectra against what they should look like,
// and returns verdicts ([check.Check]).
//
// The residual of a sample is its flux divided by the fitted trend, less the
// transit model, in units of the star's flux ([Residuals]). If errors are right
// and noise is uncorrelated, residuals scatter by the errors, and bins of N of
// them by the errors over √N; the factor by which bins scatter more is beta
// ([TimeAveraging]).
//
// The limits are common practice, no source, unless a function says otherwise:
// they are set so that a sound reduction passes with room to spare, and a failure
// is a reason to look, not a proof of an error.
package diagnose
